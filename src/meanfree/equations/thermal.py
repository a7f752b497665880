"""The gases' heat capacity, enthalpy and Gibbs energy from their Chebyshev series."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.system import Floats, Reverses, Thermal


@dataclass(frozen=True)
class Properties:
    """Properties of every gas at one temperature, each of shape (n_gases,).

    ``cp`` [J/mol/K], ``cp_slope`` [J/mol/K^2], ``h`` [J/mol], ``g`` [J/mol, 1 bar].
    """

    cp: Floats
    cp_slope: Floats
    h: Floats
    g: Floats


def properties(table: Thermal, T: float) -> Properties:
    """Heat capacity, enthalpy and Gibbs energy of every gas at T [K].

    T_k(x) = cos(k arccos x) for all terms at once. Beyond the ends of a series, where a trial step
    may look, Cp stays what it is at the end, and H and S follow from that.
    """
    span = np.log(table.high / table.low)
    inside = np.clip(T, table.low, table.high)
    x = np.clip(np.log(inside * inside / (table.low * table.high)) / span, -1.0, 1.0)
    terms = np.cos(np.arange(len(table.h))[:, None] * np.arccos(x))

    def evaluate(series: Floats) -> Floats:
        return np.asarray(np.einsum("kn,kn->n", series, terms[: len(series)]), float)

    cp = evaluate(table.cp)
    slope = np.where(inside == T, evaluate(table.cp_slope) * 2 / (T * span), 0.0)
    h = evaluate(table.h) + cp * (T - inside)
    s = evaluate(table.s) + cp * np.log(T / inside)
    return Properties(cp, slope, h, h - T * s)


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
