"""Conditions with the derivatives of their numbers in some directions.

What a direction does to the numbers of a System comes in; what that does to the parameters of a
lane follows here by the chain rule: lasting rate constants through their laws, on a tape.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.polynomial import chebyshev

from meanfree.constants import R
from meanfree.equations.system import Floats, Thermal
from meanfree.kernel.duals import Dual, TapeFunctions
from meanfree.kernel.on_columns import on_columns
from meanfree.kernel.parameters import Variation, parameter
from meanfree.kernel.slots import Layout, Name
from meanfree.kernel.tangent_phases import TANGENT
from meanfree.kernel.tangents import Tangents
from meanfree.kernel.tape import Tape

BREAK = "break"
"""("break", segment, "start" | "retained" | "temperature" | "slope"): numbers of a segment."""

Moves = Mapping[Name, Floats]


@dataclass(frozen=True)
class MovingVariation(Variation):
    """A Variation whose numbers move along directions.

    ``moves[k]`` maps the names of a Variation, and those of breaks, to derivatives in direction k
    [shape (count,) or (1,)]; a name that is not there stays.
    """

    moves: tuple[Moves, ...] = ()

    def get(self, *name: str | int) -> Floats:
        """As for a Variation; also the derivatives that phases know by their names."""
        if name[0] == TANGENT:
            return self.slope(int(name[1]), name[2:])
        return super().get(*name)

    def part(self, start: int, stop: int) -> MovingVariation:
        """Conditions ``start`` to ``stop``."""
        rows = slice(start, stop)
        plain = super().part(start, stop)
        moves = tuple(
            {name: value if len(value) == 1 else value[rows] for name, value in each.items()}
            for each in self.moves
        )
        return MovingVariation(self.system, plain.count, plain.values, moves)

    def scaled(self, factors: list[Floats]) -> MovingVariation:
        """With every direction taken ``factors`` [one a direction, (count,) or (1,)] as long."""
        moves = tuple(
            {name: value * factor for name, value in each.items()}
            for each, factor in zip(self.moves, factors, strict=True)
        )
        return MovingVariation(self.system, self.count, self.values, moves)

    def moved(self, k: int, *name: str | int) -> Floats:
        """The derivative of one number [shape (count,) or (1,)]."""
        return self.moves[k].get(name, np.zeros(1))

    def slope(self, k: int, name: Name) -> Floats:
        """The derivative of a parameter of a layout in direction k [shape (count,) or (1,)]."""
        if name[0] == "k":
            return self._of_constant(k, int(name[1]))
        if name[0] == "R_over_p":
            return np.asarray(-R / self.get("p") ** 2 * self.moved(k, "p"))
        if name[0] == "scale":
            return sum((self.moved(k, "x", i) for i in range(self.system.n_gases)), np.zeros(1))
        if name[0] == "slope":
            return self.moved(k, BREAK, 0, "slope")
        return self.moved(k, *name)

    def start(self, layout: Layout) -> list[Floats]:
        """Derivatives of the state at time zero, in the directions of a layout one by one."""
        found = []
        for k in range(len(layout.directions)):
            block = [np.zeros(1)] * layout.states
            block[: self.system.n_gases] = [
                self.moved(k, "x", i) for i in range(self.system.n_gases)
            ]
            if layout.has_T:
                block[layout.T_index] = self.moved(k, "T")
            found += block
        return found

    def directions(self, layout: Layout) -> tuple[frozenset[Name], ...]:
        """The parameters of a layout that move in each direction, in some condition at least."""
        return tuple(
            frozenset(n for n in layout.parameters if np.any(self.slope(k, n) != 0))
            for k in range(len(self.moves))
        )

    def lengths(self, layout: Layout) -> list[Floats]:
        """By how much each direction moves the equations: its largest relative change.

        Of a parameter, of the amounts over all there is at the start, of a temperature.
        """
        found = []
        for k, each in enumerate(self.moves):
            largest = np.zeros(1)
            for name in layout.parameters:
                value = np.abs(parameter(layout, self, name))
                size = np.where(value > 0, value, 1.0)
                largest = np.maximum(largest, np.abs(self.slope(k, name)) / size)
            for name, slope in each.items():
                if name[0] == "x":
                    largest = np.maximum(largest, np.abs(slope) / self.total)
                elif name[0] == "T" or name[2:] == ("temperature",):
                    largest = np.maximum(largest, np.abs(slope) / self.get("T"))
            found.append(np.where(largest > 0, largest, 1.0))
        return found

    # Rate constants that last

    def _of_constant(self, k: int, j: int) -> Floats:
        """dk/dp of a one-way step."""
        system = self.system
        for row, step in enumerate(system.reverses.step):
            if int(step) == j:
                forward = int(system.reverses.forward[row])
                inverse = np.exp(-self._ln_Kc(row))
                slope = self._of_constant(k, forward) * inverse
                return np.asarray(slope - self.constants(j) * self._of_ln_Kc(k, row))
        for b, block in enumerate(system.blocks):
            where = np.flatnonzero(block.steps == j)
            if len(where):
                return self._of_law(k, b, int(where[0]))
        raise KeyError(j)

    def _of_law(self, k: int, b: int, position: int) -> Floats:
        block = self.system.blocks[b]
        names: list[Name] = [("T",)]
        names += [("number", b, slot, position) for slot in range(len(block.law.slots))]
        moving = [name for name in names if np.any(self.moved(k, *name) != 0)]
        if not moving:
            return np.zeros(1)
        tape = Tape()
        places = [tape.input(i) for i in range(len(names))]
        law: Any = block.law.coefficient
        one = Dual(tape, tape.const(1.0))
        T, *numbers = (Dual(tape, place) for place in places)
        value = law(TapeFunctions(tape), T, one, one, numbers).value
        seeds = {places[names.index(n)]: tape.input(len(names) + i) for i, n in enumerate(moving)}
        slope = Tangents(tape, [value]).along(seeds).get(value)
        if slope is None:
            return np.zeros(1)
        columns = [self.get(*name) for name in names] + [self.moved(k, *name) for name in moving]
        return on_columns(tape, [slope], dict(enumerate(columns)))[0]

    def _of_ln_Kc(self, k: int, row: int) -> Floats:
        """d ln K_c/dp: through the temperature, d ln K/dT = dH/RT^2, and through what is given."""
        reverses, T, dT = self.system.reverses, self.get("T"), self.moved(k, "T")
        net = self.system.net.row(int(reverses.forward[row]))
        change = sum(number for _, number in net)
        slope = self.moved(k, "lnK_at", row)
        if reverses.given[row]:
            heat, at = self.get("enthalpy", row), self.get("at", row)
            slope = slope - self.moved(k, "enthalpy", row) / R * (1 / T - 1 / at)
            slope = slope - heat / R * self.moved(k, "at", row) / at**2
        else:
            assert self.system.thermal is not None
            thermal = self.system.thermal
            heat = sum((n * _enthalpy(thermal, gas, T) for gas, n in net), np.zeros(1))
        return np.asarray(slope + (heat / (R * T * T) - change / T) * dT)


def _enthalpy(table: Thermal, gas: int, T: Floats) -> Floats:
    """H of one gas at temperatures [J/mol]; see `meanfree.equations.thermal`."""
    low, high = table.low[gas], table.high[gas]
    inside = np.clip(T, low, high)
    x = np.clip(np.log(inside * inside / (low * high)) / np.log(high / low), -1.0, 1.0)
    cp, h = (chebyshev.chebval(x, series[:, gas]) for series in (table.cp, table.h))
    return np.asarray(h + cp * (T - inside))
