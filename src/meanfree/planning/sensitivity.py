"""How answers follow inputs: d ln(answer)/d ln(input) for every step, fill and temperature."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.experiment.plan import Solver
from meanfree.integrate.observables import At, HalfLife, Observable, ReactionTime
from meanfree.planning.factors import factor_addresses, factored
from meanfree.planning.readings import Reading, observables, read_many
from meanfree.progress import Progress, silent
from meanfree.sourced import Sourced

STEP = 0.01
"""Change of ln(input), at most: the error of the five-point rule is of its fourth power."""

HOT = 20.0
"""Temperatures are turned by so much less."""

RTOL, ATOL = 1e-10, 1e-22

DIRECT = (At, HalfLife, ReactionTime)
"""What the variational equations answer."""


@dataclass(frozen=True)
class Knob:
    """What is turned: addresses that change together by one factor, and what that is in words.

    ``kind`` is "k" of a step, "fill", "temperature" or "vessel". A temperature on a scale with
    another zero is turned on the kelvin scale.
    """

    name: str
    kind: str
    addresses: tuple[str, ...]


@dataclass(frozen=True)
class Sensitivities:
    """``values[r][knob, column]`` = d ln(reading r)/d ln(knob) [1]; NaN where it is not reached."""

    knobs: tuple[Knob, ...]
    readings: tuple[Reading, ...]
    values: tuple[Floats, ...]
    base: tuple[Floats, ...]


def knobs_of(experiment: Experiment) -> tuple[Knob, ...]:
    """k of every step that has a number to scale it, every fill, the temperature, the volume.

    A collision step is expected to have its steric factor written out (`factored`).
    """
    known = inputs(experiment)
    found = []
    for step in experiment.steps:
        addresses = factor_addresses(experiment, step)
        if addresses:
            found.append(Knob(step.name, "k", addresses))
    for address, at in known.items():
        if at.value <= 0:
            continue
        if address.startswith("fill.gases.") or address == "fill.total":
            found.append(Knob(address, "fill", (address,)))
        elif address in ("temperature.value", "temperature.surroundings"):
            found.append(Knob(address, "temperature", (address,)))
        elif address in ("vessel.volume", "vessel.pressure"):
            found.append(Knob(address, "vessel", (address,)))
    return tuple(found)


def sensitivities(
    experiment: Experiment,
    readings: Sequence[Reading],
    until: float | None = None,
    progress: Progress = silent,
) -> Sensitivities:
    """Logarithmic sensitivities, by the variational equations where the kernel knows the reading.

    ``until`` [s] must be late enough for every reading. The rest is differenced by the five-point
    rule: its error is h^4/30 of the fifth derivative, 1e-9 or so for answers that follow powers;
    that of the runs, 1e-10 over h, is 1e-8. Temperatures, which rates follow by tens, are turned by
    less.
    """
    experiment = factored(experiment)
    if until is not None:
        plan = replace(experiment.plan, until=Sourced(until, "s", dimension="time"), report_at=())
        experiment = replace(experiment, plan=plan)
    knobs = knobs_of(experiment)
    asked = {
        i: observables(reading, experiment, until)
        for i, reading in enumerate(readings)
        if reading.kind != "highest pressure"
    }
    direct = {i: o for i, o in asked.items() if o and all(isinstance(one, DIRECT) for one in o)}
    found = _by_equations(experiment, knobs, direct) if direct and knobs else {}
    rest = [i for i in range(len(readings)) if i not in found]
    if rest:
        wanted = [readings[i] for i in rest]
        differenced = _by_differences(experiment, knobs, wanted, until, progress)
        found |= dict(zip(rest, differenced, strict=True))
    pairs = [found[i] for i in range(len(readings))]
    values, base = (tuple(pair[side] for pair in pairs) for side in (0, 1))
    return Sensitivities(knobs, tuple(readings), values, base)


Answer = tuple[Floats, Floats]
"""Sensitivities [shape (n_knobs, columns)] and the reading itself [(columns,)]."""


def _by_equations(
    experiment: Experiment, knobs: Sequence[Knob], asked: Mapping[int, Sequence[Observable]]
) -> dict[int, Answer]:
    """From derivatives by every address: a knob turns its addresses by one factor.

    Nothing where an address has no room to be turned both ways.
    """
    from meanfree.integrate.many import Runs

    known = inputs(experiment)
    addresses = list(dict.fromkeys(a for knob in knobs for a in knob.addresses))
    flat = list(dict.fromkeys(one for group in asked.values() for one in group))
    runs = Runs(experiment, flat, sensitivities=addresses, rtol=RTOL, atol=ATOL, workers=1)
    try:
        values, _ = runs.arrays({addresses[0]: np.array([known[addresses[0]].value])})
    except InputError:
        return {}
    column = dict(zip(runs.columns, values[:, 0], strict=True))
    found = {}
    for i, group in asked.items():
        names = [name for one in group for name in one.columns]
        base = np.array([column[name] for name in names])
        table = np.zeros((len(knobs), len(names)))
        for place, knob in enumerate(knobs):
            for address in knob.addresses:
                at = known[address]
                span = at.value - at.low if knob.kind == "temperature" else at.value
                table[place] += [span * column[f"d_{name}_by_{address}"] for name in names]
        with np.errstate(invalid="ignore", divide="ignore"):
            found[i] = (table / base, base)
    return found


def _by_differences(
    experiment: Experiment,
    knobs: Sequence[Knob],
    readings: Sequence[Reading],
    until: float | None,
    progress: Progress,
) -> list[Answer]:
    known = inputs(experiment)
    shifts = np.array([-2.0, -1.0, 1.0, 2.0]) * STEP
    rows = 4 * len(knobs) + 1
    varied = list(dict.fromkeys(a for knob in knobs for a in knob.addresses))
    conditions = {address: np.full(rows, known[address].value) for address in varied}
    for place, knob in enumerate(knobs):
        for address in knob.addresses:
            turned = shifts / HOT if knob.kind == "temperature" else shifts
            zero = known[address].low if knob.kind == "temperature" else 0.0
            where = slice(4 * place, 4 * place + 4)
            span = known[address].value - zero
            conditions[address][where] = zero + span * np.exp(turned)
    read = read_many(
        experiment,
        conditions,
        readings,
        until=until,
        solver=Solver(experiment.plan.solver.method, RTOL, ATOL),
        progress=progress,
        note="sensitivities",
    )
    found = []
    for answer in read:
        with np.errstate(invalid="ignore", divide="ignore"):
            logs = np.log(answer[:-1].reshape(len(knobs), 4, -1))
        a, b, c, d = (logs[:, i] for i in range(4))
        steps = np.array([STEP / HOT if k.kind == "temperature" else STEP for k in knobs])
        found.append(((a - 8 * b + 8 * c - d) / (12 * steps[:, None]), answer[-1]))
    return found
