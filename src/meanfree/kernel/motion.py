"""What a state and its derivatives do at one moment: dy/dt, d2y/dt2 and ds/dt, by columns.

Needed where something happens: the derivative of an event's time is -g'/(dg/dt).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.kernel.moving import BREAK, MovingVariation
from meanfree.kernel.on_columns import on_columns
from meanfree.kernel.parameters import parameter
from meanfree.kernel.records import Floats
from meanfree.kernel.slots import Layout
from meanfree.kernel.tableau import Tableau
from meanfree.kernel.tangent_phases import TANGENT, TangentWriter
from meanfree.kernel.tangents import Tangents
from meanfree.kernel.tape import Tape


@dataclass(frozen=True)
class Moment:
    """Rates of change: ``y`` and ``y_slope`` (its own rate of change), each of shape
    (count, states); ``s`` [count, n_directions, states] of the derivatives."""

    y: Floats
    y_slope: Floats
    s: Floats


class Motion:
    """The equations of a layout with directions, evaluated by columns."""

    def __init__(self, layout: Layout, tableau: Tableau) -> None:
        self.layout = layout
        writer = TangentWriter(layout, tableau, border=False)
        self.tape = t = Tape()
        state = [t.input(layout.state + i) for i in range(layout.size)]
        rates = writer.rates(t, state)
        rhs = rates[: layout.states]
        found = Tangents(t, rhs).along(dict(zip(state[: layout.states], rhs, strict=True)))
        self.wanted = [*rates, *(found.get(value, t.const(0.0)) for value in rhs)]

    def at(self, variation: MovingVariation, values: Floats, times: Floats) -> Moment:
        """At states with their derivatives [shape (count, size)] and times [s, shape (count,)]."""
        layout, count = self.layout, len(values)
        slots = {layout.state + i: values[:, i] for i in range(layout.size)}
        starts = [
            np.broadcast_to(variation.get(BREAK, place, "start"), count)
            for place in range(1, len(variation.system.segments))
        ]
        where = np.sum([times > start for start in starts], axis=0, initial=0)
        where = np.broadcast_to(np.asarray(where, int), count)
        for name in layout.parameters:
            slots[layout.parameter(*name)] = self._parameter(variation, name, where)
        found = [np.broadcast_to(v, count) for v in on_columns(self.tape, self.wanted, slots)]
        n, table = layout.states, np.array(found).T
        directions = table[:, n : layout.size].reshape(count, -1, n)
        return Moment(table[:, :n], table[:, layout.size :], directions)

    def _parameter(
        self, variation: MovingVariation, name: tuple[str | int, ...], where: np.ndarray
    ) -> Floats:
        """A parameter in the segment of every time."""
        segments = variation.system.segments
        if name[0] == "slope":
            return _picked([variation.get(BREAK, i, "slope") for i in range(len(segments))], where)
        if name[0] == "switch":
            on = [1.0 if s.switches is None else s.switches[int(name[1])] for s in segments]
            return np.asarray(np.array(on)[where])
        if name[0] == TANGENT and name[2:] == ("slope",):
            k = int(name[1])
            return _picked(
                [variation.moved(k, BREAK, i, "slope") for i in range(len(segments))], where
            )
        return parameter(self.layout, variation, name)


def _picked(each: Sequence[Floats], where: np.ndarray) -> Floats:
    """Of one array a segment, the entry of the segment that counts."""
    table = np.array([np.broadcast_to(one, len(where)) for one in each])
    return np.asarray(table[where, np.arange(len(where))])
