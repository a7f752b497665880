"""The equations as sympy expressions: what users see, and what is compiled for scipy.

Rate coefficients that are constant in a run are symbols ``k_j``; others are the law's own
template. Properties of gases enter as functions of T whose derivatives are known.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import sympy

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.powers import power
from meanfree.equations.system import System
from meanfree.equations.templates import Symbols


class slope_of_heat_capacity(sympy.Function):  # type: ignore[misc]  # noqa: N801
    """dCp/dT of gas i at T."""


class heat_capacity(sympy.Function):  # type: ignore[misc]  # noqa: N801
    """Cp of gas i at T."""

    def fdiff(self, argindex: int = 2) -> Any:
        """d Cp/dT."""
        return slope_of_heat_capacity(*self.args)


class enthalpy(sympy.Function):  # type: ignore[misc]  # noqa: N801
    """H of gas i at T."""

    def fdiff(self, argindex: int = 2) -> Any:
        """dH/dT = Cp."""
        return heat_capacity(*self.args)


class gibbs_energy(sympy.Function):  # type: ignore[misc]  # noqa: N801
    """H - TS of gas i at T, 1 bar."""

    def fdiff(self, argindex: int = 2) -> Any:
        """dG/dT = -S = (G - H)/T."""
        i, T = self.args
        return (gibbs_energy(i, T) - enthalpy(i, T)) / T


@dataclass(frozen=True)
class SymbolicSystem:
    """dy/dt as expressions in the states, t, the segment's symbols and the coefficients ``k``.

    ``rates`` [mol/m^3/s], one a one-way step. ``flows`` are v times the net rate of each written
    step (forward minus reverse), as symbols with what they stand for; ``derivative[i]`` belongs
    to ``states[i]`` and is written in the flows. Near equilibrium forward and reverse nearly
    cancel: taking their difference once keeps its rounding out of what is conserved.
    """

    states: tuple[Any, ...]
    rates: tuple[Any, ...]
    flows: dict[Any, Any]
    derivative: tuple[Any, ...]
    t: Any
    k: tuple[Any, ...]
    T_start: Any
    slope: Any
    start: Any
    switches: tuple[Any, ...]

    @cached_property
    def flow_slopes(self) -> dict[tuple[Any, Any], tuple[Any, Any]]:
        """(flow, state) to a symbol for d flow/d state and what it stands for, where not zero."""
        found = {}
        for j, (flow, expression) in enumerate(self.flows.items()):
            for i, state in enumerate(self.states):
                if state in expression.free_symbols:
                    symbol = sympy.Symbol(f"slope_{j}_{i}", real=True)
                    found[flow, state] = (symbol, sympy.diff(expression, state))
        return found

    @cached_property
    def jacobian(self) -> dict[tuple[int, int], Any]:
        """d derivative[i]/d states[j] where it is not zero, in the symbols of `flow_slopes`."""
        entries: dict[tuple[int, int], Any] = {}
        for i, expression in enumerate(self.derivative):
            for state in expression.free_symbols & set(self.states):
                entries[i, self.states.index(state)] = sympy.diff(expression, state)
            by_flow = {
                flow: sympy.diff(expression, flow)
                for flow in expression.free_symbols & self.flows.keys()
            }
            for (flow, state), (symbol, _) in self.flow_slopes.items():
                if flow in by_flow:
                    key = i, self.states.index(state)
                    entries[key] = entries.get(key, sympy.Integer(0)) + by_flow[flow] * symbol
        return {key: entries[key] for key in sorted(entries)}


def symbolic_system(system: System) -> SymbolicSystem:
    """The sympy form of a System."""
    return _Writer(system).write()


class _Writer:
    """Writes the expressions of one System, a part a method."""

    def __init__(self, system: System) -> None:
        self.system = system
        self.x = [sympy.Symbol(f"x_{i}", real=True) for i in range(system.n_gases)]
        self.ledger = [sympy.Symbol(f"xi_{i}", real=True) for i in range(system.n_ledger)]
        self.v = sympy.Symbol("v", positive=True) if system.volume_varies else sympy.Integer(1)
        self.t, self.start = sympy.symbols("t t_start", real=True)
        self.T_start = sympy.Symbol("T_start", positive=True)
        self.slope = sympy.Symbol("slope", real=True)
        self.k = [sympy.Symbol(f"k_{j}", real=True) for j in range(system.n_steps)]
        self.switches = [sympy.Symbol(f"switch_{j}", real=True) for j in range(system.n_steps)]
        if system.temperature_varies:
            self.T: Any = sympy.Symbol("T", positive=True)
        elif system.mode == "program":
            self.T = self.T_start + self.slope * (self.t - self.start)
        else:
            self.T = self.T_start
        self.w = self.v + system.dead * self.T if system.dead else self.v
        self.c = [x / self.w for x in self.x]
        rigid = not system.volume_varies
        self.p = R * self.T * sympy.Add(*self.c) if rigid else sympy.Float(system.held_pressure)
        self.change = [sum(n for _, n in system.net.row(j)) for j in range(system.n_steps)]

    def write(self) -> SymbolicSystem:
        system = self.system
        rates = self._rates()
        back = dict(zip(system.reverses.forward, system.reverses.step, strict=True))
        net = {
            j: rate - rates[back[j]] if j in back else rate
            for j, rate in enumerate(rates)
            if j not in system.reverses.step
        }
        symbols = {j: sympy.Symbol(f"flow_{j}", real=True) for j in net}
        flows = [symbols.get(j, sympy.Integer(0)) for j in range(system.n_steps)]
        dx: list[Any] = [sympy.Integer(0)] * system.n_gases
        for j, flow in enumerate(flows):
            for gas, number in system.net.row(j):
                dx[gas] += _number(number) * flow
        derivative = [*dx, *(flows[j] for j in system.open_steps)]
        dT: Any = self.slope if system.mode == "program" else sympy.Integer(0)
        if system.temperature_varies:
            exchanged = system.exchange * (system.surroundings - self.T)
            if system.exchanges_heat:
                derivative.append(exchanged)
            dT = self._heating(flows, exchanged)
        if system.volume_varies:
            made = [_number(change) * flow for change, flow in zip(self.change, flows, strict=True)]
            growth = R * self.T / system.held_pressure * sympy.Add(*made)
            derivative.append(growth + self.v / self.T * dT)
        if system.temperature_varies:
            derivative.append(dT)
        states = [*self.x, *self.ledger]
        states += [self.v] if system.volume_varies else []
        states += [self.T] if system.temperature_varies else []
        return SymbolicSystem(
            tuple(states),
            tuple(rates),
            {symbols[j]: self.v * net[j] for j in net},
            tuple(derivative),
            self.t,
            tuple(self.k),
            self.T_start,
            self.slope,
            self.start,
            tuple(self.switches),
        )

    def _rates(self) -> list[Any]:
        system = self.system
        coefficients, baths = self._coefficients()
        rates = []
        for j in range(system.n_steps):
            rate = coefficients[j] * self.switches[j]
            if system.bath[j] >= 0 and not system.bath_inside[j]:
                rate *= baths[j]
            for gas, order in system.orders.row(j) + system.guards.row(j):
                rate *= power(self.c[gas], order, system.total_concentration)
            rates.append(rate)
        return rates

    def _coefficients(self) -> tuple[list[Any], list[Any]]:
        """Coefficient and M of every one-way step."""
        system = self.system
        baths = [self._bath(int(row)) for row in system.bath]
        coefficients: list[Any] = list(self.k)
        constant = constant_steps(system)
        for block in system.blocks:
            for position, j in enumerate(block.steps):
                if not constant[j]:
                    numbers = [float(number) for number in block.numbers[:, position]]
                    coefficients[j] = block.law.coefficient(
                        Symbols(), self.T, self.p, baths[j], numbers
                    )
        reverses = system.reverses
        for row, (j, forward) in enumerate(zip(reverses.step, reverses.forward, strict=True)):
            if not constant[j]:
                coefficients[j] = coefficients[forward] * sympy.exp(-self._ln_Kc(row))
        return coefficients, baths

    def _bath(self, row: int) -> Any:
        if row < 0:
            return sympy.Integer(1)
        corrections = [value * self.c[gas] for gas, value in self.system.baths.row(row)]
        return float(self.system.others[row]) * sympy.Add(*self.c) + sympy.Add(*corrections)

    def _ln_Kc(self, row: int) -> Any:
        reverses, T = self.system.reverses, self.T
        forward = int(reverses.forward[row])
        standard = self.change[forward] * sympy.log(STANDARD_PRESSURE / (R * T))
        if reverses.given[row]:
            heat, at = float(reverses.enthalpy[row]) / R, float(reverses.at[row])
            return float(reverses.lnK_at[row]) - heat * (1 / T - 1 / at) + standard
        gibbs = [n * gibbs_energy(i, T) for i, n in self.system.net.row(forward)]
        return -sympy.Add(*gibbs) / (R * T) + standard

    def _heating(self, flows: list[Any], exchanged: Any) -> Any:
        """dT/dt from the energy balance of the vessel."""
        system, T = self.system, self.T
        released: Any = sympy.Integer(0)
        for j, flow in enumerate(flows):
            if flow == 0:
                continue
            if j in system.open_steps:
                dH: Any = sympy.Integer(0)
            elif np.isnan(system.heat_given[j]):
                dH = sympy.Add(*(n * enthalpy(i, T) for i, n in system.net.row(j)))
            else:
                dH = sympy.Float(-system.heat_given[j])
            energy = dH - float(system.photon[j])
            if not system.volume_varies:
                energy -= self.change[j] * R * T
            released -= flow * energy
        less = 0.0 if system.volume_varies else R
        each = [x * (heat_capacity(i, T) - less) for i, x in enumerate(self.x)]
        return (released + exchanged) / (sympy.Add(*each) + system.wall)


def constant_steps(system: System) -> list[bool]:
    """Which one-way steps keep their coefficient while a segment lasts."""
    from meanfree.equations.templates import depends_on

    constant = [system.mode == "isothermal"] * system.n_steps
    if not constant or not constant[0]:
        return constant
    for block in system.blocks:
        if depends_on(block.law) - {"T"}:
            for j in block.steps:
                constant[j] = False
    for j, forward in zip(system.reverses.step, system.reverses.forward, strict=True):
        constant[j] = constant[forward]
    return constant


def _number(value: float) -> Any:
    return sympy.Integer(int(value)) if value == int(value) else sympy.Float(value)
