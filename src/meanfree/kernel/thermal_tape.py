"""Cp, H and G of the gases on a tape, from the System's Chebyshev series.

The same formulas as `meanfree.equations.thermal`; beyond its series a Cp is held.
"""

from __future__ import annotations

import math

import numpy as np

from meanfree.equations.system import Thermal
from meanfree.kernel.tape import Op, Tape

NEGLIGIBLE = 1e-14
"""A last term this small against the largest of its series is below rounding."""


class ThermalTape:
    """Properties of the gases at one temperature; each written when first asked for."""

    def __init__(self, tape: Tape, table: Thermal, T: int) -> None:
        self.tape, self.table, self.T = tape, table, T
        self._polynomials: dict[tuple[float, float], list[int]] = {}

    @classmethod
    def on(cls, tape: Tape, table: Thermal, T: int) -> ThermalTape:
        """The properties at T; equal operations are written once, so making many costs nothing."""
        return cls(tape, table, T)

    def _range(self, gas: int) -> tuple[float, float]:
        return float(self.table.low[gas]), float(self.table.high[gas])

    def _inside(self, gas: int) -> int:
        """T held within the range of the series."""
        low, high = self._range(gas)
        t = self.tape
        return t.max(t.min(self.T, t.const(high)), t.const(low))

    def _chebyshev(self, gas: int, terms: int) -> list[int]:
        """T_0, T_1, … at x, which is linear in ln T and between -1 and 1."""
        low, high = self._range(gas)
        t = self.tape
        known = self._polynomials.setdefault((low, high), [])
        if not known:
            width = math.log(high / low)
            logarithm = t.unary(Op.LOG, self._inside(gas))
            x = t.madd(t.const(2 / width), logarithm, t.const(-math.log(low * high) / width))
            x = t.max(t.min(x, t.const(1.0)), t.const(-1.0))
            known.extend([t.const(1.0), x])
        double = t.mul(t.const(2.0), known[1])
        while len(known) < terms:
            known.append(t.sub(t.mul(double, known[-1]), known[-2]))
        return known

    def _series(self, coefficients: np.ndarray, gas: int) -> int:
        size = np.abs(coefficients)
        terms = int(np.max(np.flatnonzero(size > NEGLIGIBLE * size.max()), initial=0)) + 1
        basis = self._chebyshev(gas, max(terms, 2))
        return self.tape.combine(
            (float(c), b) for c, b in zip(coefficients[:terms], basis, strict=False)
        )

    def heat_capacity(self, gas: int) -> int:
        """Cp [J/mol/K]"""
        return self._series(self.table.cp[:, gas], gas)

    def slope_of_heat_capacity(self, gas: int) -> int:
        """dCp/dT [J/mol/K^2], 0 beyond the series."""
        t, (low, high) = self.tape, self._range(gas)
        series = self._series(self.table.cp_slope[:, gas], gas)
        slope = t.div(t.mul(series, t.const(2 / math.log(high / low))), self.T)
        distance = t.unary(Op.ABS, t.sub(self.T, self._inside(gas)))
        return t.select(distance, t.const(0.0), slope)

    def enthalpy(self, gas: int) -> int:
        """H [J/mol]"""
        beyond = self.tape.sub(self.T, self._inside(gas))
        return self.tape.madd(
            beyond, self.heat_capacity(gas), self._series(self.table.h[:, gas], gas)
        )

    def gibbs_energy(self, gas: int) -> int:
        """G = H - T S at 1 bar [J/mol]"""
        t = self.tape
        beyond = t.unary(Op.LOG, t.div(self.T, self._inside(gas)))
        entropy = t.madd(beyond, self.heat_capacity(gas), self._series(self.table.s[:, gas], gas))
        return t.nmadd(self.T, entropy, self.enthalpy(gas))
