"""The sympy form of a System, compiled: the main path for the equations that people read."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import sympy

from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.branches import FOR_NUMBERS
from meanfree.equations.symbolic import symbolic_system
from meanfree.equations.system import Floats, Segment, System


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
        modules = [{**self._gas_functions(), **FOR_NUMBERS}, "math"]
        before = list(form.flows.items())
        self._derivative = sympy.lambdify(
            arguments, list(form.derivative), modules, cse=_after(before)
        )
        places = list(form.jacobian)
        self._rows = np.array([i for i, _ in places], np.intp)
        self._columns = np.array([j for _, j in places], np.intp)
        before = [*before, *form.flow_slopes.values()]
        self._jacobian = sympy.lambdify(
            arguments, list(form.jacobian.values()), modules, cse=_after(before)
        )
        self._constants: dict[float, Floats] = {}

    def _gas_functions(self) -> dict[str, Any]:
        """The properties of gas i at T under the names that the expressions use."""
        of = self.arrays.properties
        return {
            "heat_capacity": lambda i, T: float(of(T).cp[int(i)]),
            "slope_of_heat_capacity": lambda i, T: float(of(T).cp_slope[int(i)]),
            "enthalpy": lambda i, T: float(of(T).h[int(i)]),
            "gibbs_energy": lambda i, T: float(of(T).g[int(i)]),
        }

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


Assignments = list[tuple[Any, Any]]


def _after(named: Assignments) -> Callable[[Sequence[Any]], tuple[Assignments, list[Any]]]:
    """Common subexpressions with some symbols assigned first, never expanded into the rest."""

    def eliminate(expressions: Sequence[Any]) -> tuple[Assignments, list[Any]]:
        first, values = sympy.cse(
            [value for _, value in named], symbols=sympy.numbered_symbols("before")
        )
        assigned = [(name, value) for (name, _), value in zip(named, values, strict=True)]
        rest, reduced = sympy.cse(expressions, symbols=sympy.numbered_symbols("after"))
        return [*first, *assigned, *rest], list(reduced)

    return eliminate
