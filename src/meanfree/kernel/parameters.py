"""The block of numbers that lanes take in: one row a condition, one column a parameter.

A `Variation` says in what conditions differ from a System; whatever it does not name is the
System's. Rate constants that stay what they are during a run are evaluated here, for all
conditions at once.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.polynomial import chebyshev

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.system import Floats, System, Thermal
from meanfree.kernel.slots import Layout, Name
from meanfree.rates.law import NUMBERS

OF_ITS_OWN = 1e-12
"""Absolute tolerance over the fill of any filled gas, where that is less than over the total."""


@dataclass(frozen=True)
class Variation:
    """``count`` conditions of a System.

    A segment is ("break", segment, "start" | "retained" | "temperature" | "slope"); of the first
    one the slope only.
    ``values`` maps names to arrays of shape (count,): ("number", block, slot, position),
    ("lnK_at", row), ("at", row), ("enthalpy", row), ("x", gas), ("T",) the temperature at time
    zero, ("p",) the held pressure, ("dead",), ("wall",), ("exchange",), ("surroundings",), ("V",)
    the volume at time zero, ("heat", step), ("photon", step).
    """

    system: System
    count: int
    values: Mapping[Name, Floats] = field(default_factory=dict)

    def get(self, *name: str | int) -> Floats:
        """The value of each condition [shape (count,)], or one value for all [shape (1,)]."""
        if name in self.values:
            return self.values[name]
        return np.array([self._of_system(name)], float)

    def _of_system(self, name: Name) -> float:
        system, kind = self.system, name[0]
        if kind == "number":
            return float(system.blocks[int(name[1])].numbers[int(name[2]), int(name[3])])
        if kind in ("lnK_at", "at", "enthalpy"):
            return float(getattr(system.reverses, str(kind))[int(name[1])])
        if kind == "x":
            return float(system.initial_x[int(name[1])])
        if kind in ("heat", "photon"):
            stated = system.heat_given if kind == "heat" else system.photon
            return float(stated[int(name[1])])
        if kind == "break":
            return float(getattr(system.segments[int(name[1])], str(name[2])))
        return {
            "T": system.initial_temperature,
            "p": system.held_pressure,
            "dead": system.dead,
            "wall": system.wall,
            "exchange": system.exchange,
            "surroundings": system.surroundings,
            "V": system.initial_volume,
        }[str(kind)]

    @cached_property
    def total(self) -> Floats:
        """Initial amount of all gases over V0 [mol/m^3, (count,) or (1,)]; 1 where it is empty."""
        total = np.zeros(1)
        for i in range(self.system.n_gases):
            total = total + self.get("x", i)
        return np.where(total > 0, total, 1.0)

    def part(self, start: int, stop: int) -> Variation:
        """Conditions ``start`` to ``stop``."""
        rows = slice(start, stop)
        kept = {
            name: value if len(value) == 1 else value[rows] for name, value in self.values.items()
        }
        return Variation(self.system, min(stop, self.count) - start, kept)

    def start(self, layout: Layout) -> list[Floats]:
        """What follows the state at time zero: nothing where no derivatives are carried along."""
        return []

    # Rate constants that last

    def constants(self, j: int) -> Floats:
        """k of a one-way step at the temperature at time zero [shape (count,) or (1,)]."""
        system = self.system
        for row, step in enumerate(system.reverses.step):
            if int(step) == j:
                forward = int(system.reverses.forward[row])
                return np.asarray(self.constants(forward) * np.exp(-self._ln_Kc(row)), float)
        for b, block in enumerate(system.blocks):
            where = np.flatnonzero(block.steps == j)
            if len(where):
                position = int(where[0])
                numbers = [
                    self.get("number", b, slot, position) for slot in range(len(block.law.slots))
                ]
                T = self.get("T")
                ones = np.ones_like(T)
                k = block.law.coefficient(NUMBERS, T, ones, ones, numbers)
                return np.atleast_1d(np.asarray(k, float))
        raise KeyError(j)

    def _ln_Kc(self, row: int) -> Floats:
        """ln K_c at the temperature at time zero."""
        system, reverses, T = self.system, self.system.reverses, self.get("T")
        net = system.net.row(int(reverses.forward[row]))
        change = sum(number for _, number in net)
        if reverses.given[row]:
            heat, at = self.get("enthalpy", row), self.get("at", row)
            lnK = self.get("lnK_at", row) - heat / R * (1 / T - 1 / at)
        else:
            assert system.thermal is not None
            dG = sum(number * gibbs_energy(system.thermal, gas, T) for gas, number in net)
            lnK = -dG / (R * T)
        return np.asarray(lnK + change * np.log(STANDARD_PRESSURE / (R * T)), float)


def gibbs_energy(table: Thermal, gas: int, T: Floats) -> Floats:
    """H - T S of one gas at temperatures [J/mol]; see `meanfree.equations.thermal`."""
    low, high = table.low[gas], table.high[gas]
    inside = np.clip(T, low, high)
    x = np.clip(np.log(inside * inside / (low * high)) / np.log(high / low), -1.0, 1.0)
    cp, h, s = (chebyshev.chebval(x, series[:, gas]) for series in (table.cp, table.h, table.s))
    return np.asarray(h + cp * (T - inside) - T * (s + cp * np.log(T / inside)), float)


def parameter(layout: Layout, variation: Variation, name: Name) -> Floats:
    """A parameter of a layout for all conditions [SI, shape (count,)] or one value for all [(1,)].

    Slopes of a programmed temperature and switches of steps are those of the first segment.
    """
    first = variation.system.segments[0]
    if name[0] == "k":
        return variation.constants(int(name[1]))
    if name[0] == "R_over_p":
        return R / variation.get("p")
    if name[0] == "scale":
        return variation.total
    if name[0] == "slope":
        return variation.get("break", 0, "slope")
    if name[0] == "switch":
        switches = first.switches
        return np.array([1.0 if switches is None else switches[int(name[1])]])
    return variation.get(*name)


def _least_filled(variation: Variation) -> Floats:
    """The smallest amount of a filled gas over V0 [mol/m^3, shape (count,) or (1,)]."""
    least = np.full(1, np.inf)
    for i in range(variation.system.n_gases):
        x = variation.get("x", i)
        least = np.minimum(least, np.where(x > 0, x, np.inf))
    return least


def columns(layout: Layout, variation: Variation, atol: float, end: Floats) -> list[Floats]:
    """Everything a lane takes in: state, parameters, three absolute tolerances, end [s].

    The state is followed by its derivatives where there are directions. Each is of shape (count,),
    or (1,) where all conditions share it.
    """
    system, total = layout.system, variation.total
    zero, one = np.zeros(1), np.ones(1)
    state = [variation.get("x", i) for i in range(system.n_gases)]
    state += [zero] * (layout.states - system.n_gases)
    if system.volume_varies:
        state[system.volume_index] = one
    if layout.has_T:
        state[layout.T_index] = variation.get("T")
    state += variation.start(layout)
    parameters = [parameter(layout, variation, name) for name in layout.parameters]
    absolute = np.minimum(atol * total, OF_ITS_OWN * _least_filled(variation))
    tolerances = [absolute, 1e-12 * total, 1e-9 * total * 8.3 * 300]
    return [*state, *parameters, *tolerances, end]
