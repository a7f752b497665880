"""The gases' heat capacity, enthalpy and Gibbs energy from their Chebyshev series."""

from __future__ import annotations

import numpy as np
from numpy.polynomial import chebyshev

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.system import Floats, Reverses, Thermal


def _scaled(table: Thermal, T: float) -> Floats:
    """x of every series, held within -1 and 1: linear in ln T."""
    x = np.log(T * T / (table.low * table.high)) / np.log(table.high / table.low)
    return np.asarray(np.clip(x, -1.0, 1.0), float)


def _evaluate(series: Floats, x: Floats) -> Floats:
    """Each column of ``series`` at its own x."""
    return np.asarray(chebyshev.chebval(x, series, tensor=False))


def heat_capacities(table: Thermal, T: float) -> tuple[Floats, Floats]:
    """Cp [J/mol/K] and dCp/dT [J/mol/K^2] of every gas, shape (n_gases,)."""
    x = _scaled(table, T)
    derivative = np.asarray(chebyshev.chebder(table.cp), float)
    slope = _evaluate(derivative, x) * 2 / (T * np.log(table.high / table.low))
    return _evaluate(table.cp, x), np.asarray(slope, float)


def enthalpies(table: Thermal, T: float) -> Floats:
    """H [J/mol] of every gas, shape (n_gases,)."""
    return _evaluate(table.h, _scaled(table, T))


def gibbs_energies(table: Thermal, T: float) -> Floats:
    """H - T S [J/mol] at 1 bar of every gas, shape (n_gases,)."""
    x = _scaled(table, T)
    return _evaluate(table.h, x) - T * _evaluate(table.s, x)


def ln_Kc(
    reverses: Reverses, T: float, change: Floats, dG: Floats, dH: Floats
) -> tuple[Floats, Floats]:
    """ln K_c [K_c in (mol/m^3)^change] of each reversible step and its slope d ln K_c/dT [1/K].

    ``change`` [1], ``dG``, ``dH`` [J/mol] are those of the forward steps, shape (n,). d ln K_c/dT =
    (dH - change R T)/R T^2 (van 't Hoff, at constant volume).
    """
    heat = np.where(reverses.given, reverses.enthalpy, dH)
    lnK = np.where(
        reverses.given,
        reverses.lnK_at - reverses.enthalpy / R * (1 / T - 1 / reverses.at),
        -dG / (R * T),
    )
    return lnK + change * np.log(STANDARD_PRESSURE / (R * T)), (heat - change * R * T) / (R * T**2)
