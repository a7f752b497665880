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
from meanfree.equations import thermal
from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.powers import power
from meanfree.equations.system import Floats, Segment, System
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

    ``derivative[i]`` belongs to ``states[i]``; ``rates`` [mol/m^3/s], one a one-way step;
    ``arguments`` are the further symbols that a compiled form takes.
    """

    states: tuple[Any, ...]
    rates: tuple[Any, ...]
    derivative: tuple[Any, ...]
    t: Any
    k: tuple[Any, ...]
    T_start: Any
    slope: Any
    start: Any
    switches: tuple[Any, ...]

    @cached_property
    def jacobian(self) -> dict[tuple[int, int], Any]:
        """d derivative[i]/d states[j] where it is not zero."""
        place = {state: j for j, state in enumerate(self.states)}
        entries = {}
        for i, expression in enumerate(self.derivative):
            for state in expression.free_symbols & place.keys():
                entries[i, place[state]] = sympy.diff(expression, state)
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
        flows = [self.v * rate for rate in rates]
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
            growth = R * self.T / system.held_pressure * sympy.Add(*dx)
            derivative.append(growth + self.v / self.T * dT)
        if system.temperature_varies:
            derivative.append(dT)
        states = [*self.x, *self.ledger]
        states += [self.v] if system.volume_varies else []
        states += [self.T] if system.temperature_varies else []
        return SymbolicSystem(
            tuple(states),
            tuple(rates),
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


class CompiledEquations:
    """Right-hand side and Jacobian of a System, compiled from its sympy form.

    The same methods as `ArrayEquations`, which serves as its source of numbers.
    """

    def __init__(self, system: System) -> None:
        self.system = system
        self.arrays = ArrayEquations(system)
        self.symbolic = symbolic_system(system)
        form = self.symbolic
        arguments = [
            form.t, form.states, form.k, form.switches, form.T_start, form.slope, form.start
        ]  # fmt: skip
        functions = {
            "enthalpy": self._gas_function(thermal.enthalpies),
            "gibbs_energy": self._gas_function(thermal.gibbs_energies),
            "heat_capacity": self._gas_function(lambda t, T: thermal.heat_capacities(t, T)[0]),
            "slope_of_heat_capacity": self._gas_function(
                lambda t, T: thermal.heat_capacities(t, T)[1]
            ),
        }
        modules = [functions, "math"]
        self._derivative = sympy.lambdify(arguments, list(form.derivative), modules, cse=True)
        places = list(form.jacobian)
        self._rows = np.array([i for i, _ in places], np.intp)
        self._columns = np.array([j for _, j in places], np.intp)
        self._jacobian = sympy.lambdify(arguments, list(form.jacobian.values()), modules, cse=True)
        self._constants: dict[float, Floats] = {}

    def _gas_function(self, of_table: Any) -> Any:
        """A property of gas i at T, all gases evaluated once for each temperature."""
        last: list[Any] = [None, None]

        def value(i: int, T: float) -> float:
            if last[0] != T:
                last[:] = [T, of_table(self.system.thermal, T)]
            return float(last[1][int(i)])

        return value

    def _arguments(self, t: float, y: Floats, segment: Segment) -> tuple[Any, ...]:
        T = segment.temperature
        if T not in self._constants:
            concentrations = self.system.initial_x
            M = self.arrays.baths(concentrations)
            self._constants[T] = self.arrays.coefficients(T, 1.0, M).k
        ones = np.ones(self.system.n_steps)
        switches = ones if segment.switches is None else segment.switches
        k = self._constants[T].tolist()
        states = y.tolist()
        return t, states, k, switches.tolist(), T, segment.slope, segment.start

    def derivative(self, t: float, y: Floats, segment: Segment) -> Floats:
        """dy/dt [shape (size,)]."""
        return np.array(self._derivative(*self._arguments(t, y, segment)), float)

    def jacobian(self, t: float, y: Floats, segment: Segment) -> Floats:
        """d(dy/dt)/dy [shape (size, size)]."""
        out = np.zeros((self.system.size, self.system.size))
        out[self._rows, self._columns] = self._jacobian(*self._arguments(t, y, segment))
        return out
