"""States of many conditions with their derivatives by addresses, at times of their own.

The kernel integrates the variational equations together with the state; addresses come from
`meanfree.integrate.moves`.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from meanfree.equations.system import Floats
from meanfree.kernel.engine import Task
from meanfree.kernel.motion import Moment, Motion
from meanfree.kernel.moving import BREAK, MovingVariation
from meanfree.kernel.slots import Name
from meanfree.kernel.tangent_engine import TangentKernel
from meanfree.kernel.watching import Functional

NEVER = 1e300


@dataclass(frozen=True)
class Slopes:
    """States and their derivatives at times [s, shape (count, n_times)].

    ``y`` [shape (count, n_times, states)] as a kernel has them: x, ledger, v, T where they vary;
    ``s`` [shape (count, n_times, n_directions, states)] by the value of each address in the
    unit of the file. NaN where a time is. ``marks`` [shape (count, 4)] as a kernel gives them.
    """

    times: Floats
    y: Floats
    s: Floats
    marks: np.ndarray


class SlopeRunner:
    """Integrates conditions that move along the same directions as ``variation``.

    ``controlled``: the errors of derivatives count in the choice of steps as those of states do. A
    derivative is measured along a direction of such a length that the largest relative change of
    a parameter (or of the amounts over all there is at the start) is one; its tolerance is rtol
    times the larger of itself and its state, and the state's absolute tolerance.
    """

    def __init__(
        self, variation: MovingVariation, precision: tuple[float, float], controlled: bool = True
    ) -> None:
        self.precision, self.n_directions = precision, len(variation.moves)
        self.varied = _names(variation)
        self.kernel = TangentKernel(variation, varied=self.varied, controlled=controlled)
        self.layout = self.kernel.program.layout

    @cached_property
    def motion(self) -> Motion:
        """The equations, for single moments."""
        return Motion(self.layout, self.kernel.tableau)

    def serves(self, part: MovingVariation) -> bool:
        """True where these conditions move along no more than what the kernel was made for."""
        moved = part.directions(self.kernel.plain)
        return _names(part) <= self.varied and all(
            one <= known for one, known in zip(moved, self.layout.directions, strict=True)
        )

    def run(self, part: MovingVariation, times: Floats, end: Floats) -> Slopes:
        """Some conditions, each to its ``end`` [s, shape (count,)].

        ``times`` [s, shape (count, n_times)], in any order, NaN where nothing is asked.
        """
        lengths = part.lengths(self.kernel.plain)
        size, n = self.layout.size, self.layout.states
        order = np.argsort(times, axis=1, kind="stable")
        grid = np.take_along_axis(np.where(np.isnan(times), NEVER, times), order, axis=1)
        task = Task(
            end,
            rtol=self.precision[0],
            atol=self.precision[1],
            functionals=tuple(Functional(((i, 1.0),)) for i in range(size)),
            grid=grid,
        )
        kept = self.kernel.run(part.scaled([1.0 / length for length in lengths]), task)
        values = np.empty_like(kept.values)
        np.put_along_axis(values, order[:, :, None], kept.values, axis=1)
        # The end of a run is kept to the last place, the last time of a grid may fall beside it.
        at_end = times >= end[:, None] * (1 - 1e-12)
        values = np.where(at_end[:, :, None], kept.ends[:, None, :size], values)
        s = values[:, :, n:].reshape(*times.shape, self.n_directions, n)
        if lengths:
            scale = np.stack([np.broadcast_to(one, part.count) for one in lengths], axis=1)
            s = s * scale[:, None, :, None]
        return Slopes(times, values[:, :, :n], s, kept.marks)

    def moment(self, part: MovingVariation, found: Slopes, place: int) -> Moment:
        """What the states at the time ``place`` of each condition do there."""
        y, s = found.y[:, place], found.s[:, place]
        values = np.concatenate([y, s.reshape(len(y), -1)], axis=1)
        return self.motion.at(part, values, found.times[:, place])


def _names(variation: MovingVariation) -> frozenset[Name]:
    """Numbers that differ from those of the System, or move."""
    moved = {name for each in variation.moves for name in each if name[0] != BREAK}
    return frozenset(moved | set(variation.values))


def retained(part: MovingVariation, times: Floats) -> tuple[Floats, Floats]:
    """What samples left by some times [(n,)], and its derivatives [(n_directions, n)].

    ``times`` are one for each condition, or several of one condition.
    """
    left, slope = np.ones(len(times)), np.zeros((len(part.moves), len(times)))
    for place in range(len(part.system.segments)):
        kept = part.get(BREAK, place, "retained")
        past = times > part.get(BREAK, place, "start")
        for k in range(len(part.moves)):
            moved = part.moved(k, BREAK, place, "retained")
            slope[k] = np.where(past, slope[k] * kept + left * moved, slope[k])
        left = np.where(past, left * kept, left)
    return left, slope
