"""The physical constants in use, in SI with mol, under the symbols and names of the trade.

All come from `scipy.constants` (CODATA), so that there is one set and it is not ours.
"""

from __future__ import annotations

from typing import Final

from scipy import constants as _codata

N_A: Final[float] = _codata.N_A
"""Avogadro constant N_A [1/mol], exact since 2019."""

k_B: Final[float] = _codata.k
"""Boltzmann constant k_B [J/K], exact since 2019."""

R: Final[float] = _codata.R
"""Molar gas constant R = N_A k_B [J/mol/K], exact since 2019."""

h: Final[float] = _codata.h
"""Planck constant h [J s], exact since 2019."""

c: Final[float] = _codata.c
"""Speed of light in vacuum c [m/s], exact."""

e: Final[float] = _codata.e
"""Elementary charge e [C], exact since 2019; also one electronvolt in J."""

eps0: Final[float] = _codata.epsilon_0
"""Electric constant epsilon_0 [F/m], measured."""

m_u: Final[float] = _codata.atomic_mass
"""Unified atomic mass unit m_u [kg], measured."""

STANDARD_PRESSURE: Final[float] = _codata.bar
"""Standard-state pressure p° = 1 bar [Pa] (IUPAC, since 1982)."""

ATMOSPHERE: Final[float] = _codata.atm
"""Standard atmosphere [Pa], exact: 101325."""

TORR: Final[float] = _codata.torr
"""Torr [Pa], exact: 1 atm / 760."""

CALORIE: Final[float] = _codata.calorie
"""Thermochemical calorie [J], exact: 4.184."""

ZERO_CELSIUS: Final[float] = _codata.zero_Celsius
"""0 degC on the kelvin scale [K], exact: 273.15."""

ANGSTROM: Final[float] = _codata.angstrom
"""Angstrom [m], exact: 1e-10."""
