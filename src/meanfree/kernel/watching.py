"""What a run is watched for: functionals of the state, their dense output, and an alarm.

One phase, made for each request: it leaves the dense output of every functional in slots and
raises the alarm in lanes where a level was reached or a maximum passed within the step.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.kernel.phases import Program
from meanfree.kernel.records import Floats, Request
from meanfree.kernel.stillness import observe
from meanfree.kernel.tape import Phase, Tape

INSIDE = (0.25, 0.5, 0.75)
"""Where a step is looked at besides its end, so that a crossing and its return are seen."""

NEXT = 1e300
"""A level that is never reached."""


@dataclass(frozen=True)
class Functional:
    """Sum of weights times states, and what is asked of it.

    ``levels`` [rows, n_levels], in the order in which they are reached; ``falls`` where that is
    from above; ``shrinks`` where a drawn sample shrinks the levels with it; ``peak`` asks for the
    maximum instead of levels.
    """

    weights: tuple[tuple[int, float], ...]
    levels: Floats | None = None
    falls: bool = True
    shrinks: bool = False
    peak: bool = False


def slots_per_functional(program: Program) -> int:
    """Value before and after, dense coefficients, and the level that comes next."""
    return 3 + int(program.tableau.dense.shape[1])


def request_for(
    functionals: Sequence[Functional], states: Sequence[Floats], count: int, grid: Floats,
    bearing: Sequence[int], n_gases: int,
) -> Request:  # fmt: skip
    """The request as plain arrays for ``count`` conditions.

    ``states`` are those at time zero, each of shape (count,) or (1,); ``grid`` [rows, n_times] in
    s; ``bearing`` are the gases that must come to rest.
    """
    with_levels = [f.levels for f in functionals if f.levels is not None]
    n_levels = max((table.shape[1] for table in with_levels), default=0)
    rows = max((len(table) for table in with_levels), default=1)
    levels = np.full((rows, len(functionals), n_levels), np.nan)
    initial = np.zeros((count, len(functionals)))
    for i, f in enumerate(functionals):
        if f.levels is not None:
            levels[:, i, : f.levels.shape[1]] = f.levels
        for row, weight in f.weights:
            initial[:, i] += weight * states[row]
    flags = [(-1 if f.falls else 1, int(f.shrinks), int(f.peak)) for f in functionals]
    return Request(
        np.array(flags, np.int64).reshape(len(functionals), 3),
        initial,
        levels,
        np.ascontiguousarray(grid, float),
        np.isin(np.arange(n_gases), bearing).astype(np.int64),
    )


@dataclass(frozen=True)
class Rest:
    """How runs of open length are watched: the gas that counts (-1: none), what must rest, and

    the first slots of the most there was of each state and of the states remembered.
    """

    watched: int
    bearing: tuple[int, ...]
    most: int
    still: int


def watching_phase(
    program: Program, functionals: Sequence[Functional], rest: Rest | None = None
) -> Phase:
    """The phase that follows every step; its slots begin at the program's end."""
    t, layout, outputs = Tape(), program.layout, dict[int, int]()
    alarm = t.const(-1.0)
    width, order = slots_per_functional(program), program.tableau.dense.shape[1]
    for place, f in enumerate(functionals):
        slot = program.end + 1 + width * place

        def total(first: int, weights: tuple[tuple[int, float], ...] = f.weights) -> int:
            return t.combine((w, t.input(first + i)) for i, w in weights)

        before, after = total(layout.state), total(layout.new)
        stages = [total(layout.stage(q)) for q in range(program.tableau.stages)]
        inner = [
            t.combine((float(c), u) for c, u in zip(column, stages, strict=True) if c)
            for column in program.tableau.dense.T
        ]
        for offset, value in enumerate((before, after, *inner)):
            outputs[slot + offset] = value
        if f.levels is not None:
            sign = t.const(-1.0 if f.falls else 1.0)
            highest = t.mul(sign, after)
            for theta in INSIDE:
                highest = t.max(t.mul(sign, _dense(t, before, after, inner, theta)), highest)
            missing = t.sub(t.input(slot + 2 + order), highest)
            alarm = t.max(t.select(missing, t.const(-1.0), t.const(1.0)), alarm)
        if f.peak:
            rise = t.add(t.sub(after, before), inner[0])
            fall = t.sub(t.sum(inner), t.sub(after, before))
            turns = t.min(rise, fall)
            # A maximum may also lie just where two steps meet.
            known = t.input(slot + 2 + order)
            missed = t.min(t.neg(rise), t.sub(before, known))
            passed = t.max(turns, missed)
            alarm = t.max(t.select(passed, t.const(1.0), t.const(-1.0)), alarm)
    # A refused step is no reason to look.
    accepted = t.input(layout.scalar("accepted"))
    outputs[program.end] = alarm = t.select(accepted, alarm, t.const(-1.0))
    if rest is not None:
        ends = observe(layout, t, rest.most, rest.still, rest.watched, rest.bearing, outputs)
        alarm = t.max(ends, alarm)
    attention = layout.scalar("attention")
    outputs[attention] = t.max(alarm, t.input(attention))
    return Phase("watch", t, outputs)


def _dense(t: Tape, before: int, after: int, inner: list[int], theta: float) -> int:
    """(1 - theta) y0 + theta (y1 + (1 - theta)(k1 + theta (k2 + …)))"""
    total = t.const(0.0)
    for k in reversed(inner):
        total = t.madd(t.const(theta), total, k)
    total = t.madd(t.const(1 - theta), total, after)
    return t.madd(t.const(theta), total, t.mul(t.const(1 - theta), before))
