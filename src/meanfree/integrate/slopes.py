"""States of many conditions with their derivatives by addresses, at times of their own.

The kernel integrates the variational equations together with the state; addresses come from
`meanfree.integrate.moves`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.integrate.conditions import Block
from meanfree.integrate.moves import moving
from meanfree.kernel.engine import Task
from meanfree.kernel.motion import Moment, Motion
from meanfree.kernel.moving import BREAK, MovingVariation
from meanfree.kernel.records import Floats as Columns
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
    """The conditions of a block, ready to be integrated with derivatives by some addresses.

    ``controlled``: the errors of derivatives count in the choice of steps as those of states do. A
    derivative is measured along a direction of such a length that the largest relative change of
    a parameter (or of the amounts over all there is at the start) is one; its tolerance is rtol
    times the larger of itself and its state, and the state's absolute tolerance.
    """

    def __init__(
        self,
        block: Block,
        table: Mapping[str, Floats],
        addresses: Sequence[str],
        precision: tuple[float, float],
        controlled: bool = True,
    ) -> None:
        self.block, self.precision, self.addresses = block, precision, tuple(addresses)
        self.variation = moving(block, table, addresses)
        named = {n for each in self.variation.moves for n in each if n[0] != BREAK}
        varied = frozenset(named | set(self.variation.values))
        self.kernel = TangentKernel(self.variation, varied=varied, controlled=controlled)
        self.motion = Motion(self.kernel.program.layout, self.kernel.tableau)
        self.layout = self.kernel.program.layout

    def run(self, start: int, stop: int, times: Floats, end: Floats) -> Slopes:
        """Conditions ``start`` to ``stop``, each to its ``end`` [s, shape (count,)].

        ``times`` [s, shape (count, n_times)], in any order, NaN where nothing is asked.
        """
        part = self.variation.part(start, stop)
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
        s = values[:, :, n:].reshape(*times.shape, len(self.addresses), n)
        scale = np.stack([np.broadcast_to(one, part.count) for one in lengths], axis=1)
        return Slopes(times, values[:, :, :n], s * scale[:, None, :, None], kept.marks)

    def moment(self, start: int, stop: int, found: Slopes, place: int) -> Moment:
        """What the states at the time ``place`` of each condition do there."""
        part: MovingVariation = self.variation.part(start, stop)
        y, s = found.y[:, place], found.s[:, place]
        values: Columns = np.concatenate([y, s.reshape(len(y), -1)], axis=1)
        return self.motion.at(part, values, found.times[:, place])
