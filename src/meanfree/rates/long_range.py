"""The formulas of capture by long-range attraction, over numbers in SI.

Each begins with (gs, mu): the share of encounters that count (half of them for like
partners, times an electronic factor) and the reduced mass [kg].
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

from meanfree.constants import e, eps0
from meanfree.rates.encounter import speed_factor
from meanfree.rates.law import NUMBERS, Formula, Functions

ELECTRIC = e**2 / (4 * math.pi * eps0)
"""e^2/(4 pi eps0) [J m]"""

_DISPERSION = math.sqrt(8 / math.pi) * 1.5 * math.pi * 2 ** (1 / 3) * math.gamma(5 / 3)
"""8.5530: sqrt(8/pi) (3 pi/2) 2^(1/3) Gamma(5/3), from the cross-section (3 pi/2)(2 C6/E)^(1/3)."""


@dataclass(frozen=True)
class DispersionCapture(Formula):
    """Potential -C6/r^6: k = 8.553 gs N_A C6^(1/3) mu^(-1/2) (k_B T)^(1/6).

    Source: Georgievskii and Klippenstein, J. Chem. Phys. 122, 194103 (2005) (from memory).
    """

    word: ClassVar[str] = "capture"

    @property
    def slots(self) -> tuple[str, ...]:
        """``gs, mu, C6``"""
        return ("gs", "mu", "C6")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """8.553 gs N_A C6^(1/3) mu^(-1/2) (k_B T)^(1/6)"""
        gs, mu, C6 = numbers
        third = 1.0 / 3.0
        return _DISPERSION * gs * fn.N_A * C6**third / fn.sqrt(mu) * (fn.k_B * T) ** (0.5 * third)


@dataclass(frozen=True)
class InducedDipoleCapture(Formula):
    """Ion and induced dipole: k = 2 pi gs N_A sqrt(q^2 alpha/mu), the same at every temperature.

    Source: P. Langevin, Ann. Chim. Phys. 5, 245 (1905); G. Gioumousis and D. P. Stevenson,
    J. Chem. Phys. 29, 294 (1958) (both from memory).
    """

    word: ClassVar[str] = "capture"

    @property
    def slots(self) -> tuple[str, ...]:
        """``gs, mu, q2alpha``: q^2 alpha/(4 pi eps0) [J m^4]"""
        return ("gs", "mu", "q2alpha")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """2 pi gs N_A sqrt(q^2 alpha/mu)"""
        gs, mu, pull = numbers
        return 2 * fn.pi * gs * fn.N_A * fn.sqrt(pull / mu)


def capture_ratio(x: Any, fn: Functions = NUMBERS) -> Any:
    """K(x) = 0.4767 x + 0.6200 from x = 2 on, (x + 0.5090)^2/10.526 + 0.9754 below.

    The two branches differ by 3e-5 of K at x = 2. Source: T. Su and W. J. Chesnavich, J. Chem.
    Phys. 76, 5183 (1982) (from memory).

    >>> [round(float(capture_ratio(x)), 4) for x in (0.0, 2.0, 10.0)]
    [1.0, 1.5734, 5.387]
    """
    return fn.below(x, 2.0, (x + 0.5090) ** 2 / 10.526 + 0.9754, 0.4767 * x + 0.6200)


@dataclass(frozen=True)
class PermanentDipoleCapture(Formula):
    """Ion and permanent dipole: the induced dipole's k times K(x), fitted to trajectories."""

    word: ClassVar[str] = "capture"

    @property
    def slots(self) -> tuple[str, ...]:
        """``gs, mu, q2alpha, d2_over_alpha``: the last is mu_D^2/(4 pi eps0 alpha) [J]"""
        return ("gs", "mu", "q2alpha", "d2_over_alpha")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """2 pi gs N_A sqrt(q^2 alpha/mu) K(x), x^2 = mu_D^2/(2 alpha k_B T)"""
        gs, mu, pull, dipole = numbers
        x = fn.sqrt(dipole / (2 * fn.k_B * T))
        return 2 * fn.pi * gs * fn.N_A * fn.sqrt(pull / mu) * capture_ratio(x, fn)


@dataclass(frozen=True)
class ElectronJump(Formula):
    """Harpoon: hard spheres of the distance at which the electron jumps, without a threshold."""

    word: ClassVar[str] = "capture"

    @property
    def slots(self) -> tuple[str, ...]:
        """``gs, mu, R``: R [m]"""
        return ("gs", "mu", "R_jump")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """gs pi R^2 N_A sqrt(8 k_B T/(pi mu))"""
        gs, mu, R = numbers
        return gs * fn.pi * R * R * speed_factor(fn, T, mu)


FORMULAS: dict[str, Formula] = {
    "dispersion": DispersionCapture(),
    "ion and induced dipole": InducedDipoleCapture(),
    "ion and permanent dipole": PermanentDipoleCapture(),
    "electron jump": ElectronJump(),
}
"""The formula of each attraction by the words that name it."""
