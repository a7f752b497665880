"""What may be asked of many runs: a word for each, a column with its unit, and how it is found.

An observable names the states it needs; the kernel keeps those at the times that matter, and the
rest is arithmetic on whole columns.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from meanfree.constants import R
from meanfree.equations.system import Floats, System
from meanfree.kernel.parameters import Variation
from meanfree.kernel.watching import Functional


@dataclass(frozen=True)
class Found:
    """The results of one block of conditions, in the words of the trade.

    ``x`` [mol/m^3, shape (count, n_gases)], ``v`` and ``T`` [(count,)] at a time; ``retained``
    [(count,)] what drawn samples left by then.
    """

    x: Floats
    v: Floats
    T: Floats
    retained: Floats


SAME = 4 * float(np.finfo(float).eps)
"""Numbers that differ by less, relatively, are the same number gone through other arithmetic."""


def named(number: float) -> str:
    """A number as part of a name: in six digits, or in as many more as tell it from others.

    >>> named(600.0), named(1e-7), named(0.1 + 0.2), named(1234567.0), named(100.0000001)
    ('600', '1e-07', '0.3', '1234567', '100.0000001')
    """
    for digits in range(6, 17):
        text = f"{number:.{digits}g}"
        if abs(float(text) - number) <= SAME * abs(number):
            return text
    return repr(float(number))


class Observable(Protocol):
    """Something that every run gives one number of."""

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of its columns, ending in their unit."""
        ...


@dataclass(frozen=True)
class ReactionTime:
    """First time at which a filled gas reaches a conversion."""

    gas: str
    conversion: float

    @property
    def columns(self) -> tuple[str, ...]:
        """``reaction_time_A_0.9_s``"""
        return (f"reaction_time_{self.gas}_{named(self.conversion)}_s",)


@dataclass(frozen=True)
class HalfLife:
    """Duration of the ``ordinal``-th half-life of a filled gas."""

    gas: str
    ordinal: int = 1

    @property
    def columns(self) -> tuple[str, ...]:
        """``half_life_A_1_s``"""
        return (f"half_life_{self.gas}_{self.ordinal}_s",)


@dataclass(frozen=True)
class Peak:
    """When there is most of a gas in the vessel, and how much [mol]."""

    gas: str

    @property
    def columns(self) -> tuple[str, ...]:
        """``peak_time_B_s``, ``peak_amount_B_mol``"""
        return (f"peak_time_{self.gas}_s", f"peak_amount_{self.gas}_mol")


@dataclass(frozen=True)
class HighestPressure:
    """The highest total pressure of a run [Pa], where the temperature stays or the piston holds
    it."""

    @property
    def columns(self) -> tuple[str, ...]:
        """``p_highest_Pa``"""
        return ("p_highest_Pa",)

    def value(self, variation: Variation, most: Floats) -> Floats:
        """From the most there is of all gases over V0 [mol/m^3, shape (count,)]."""
        if variation.system.volume_varies:
            return np.broadcast_to(variation.get("p"), variation.count)
        T = variation.get("T")
        return np.asarray(R * T * most / (1 + variation.get("dead") * T), float)


@dataclass(frozen=True)
class EndTime:
    """Length of the run."""

    @property
    def columns(self) -> tuple[str, ...]:
        """``end_s``"""
        return ("end_s",)


QUANTITIES = {
    "amount": ("n_{}", "mol"),
    "concentration": ("c_{}", "mol_per_m3"),
    "partial pressure": ("p_{}", "Pa"),
    "mole fraction": ("y_{}", ""),
    "conversion": ("X_{}", ""),
    "total pressure": ("p_total", "Pa"),
    "temperature": ("T", "K"),
    "volume": ("V", "m3"),
}
"""What can be asked of a moment: how its column is called and in which unit it comes."""


@dataclass(frozen=True)
class At:
    """A quantity at a time [s], or at the end of the run where ``time`` is None.

    ``quantity`` is one of `QUANTITIES`; ``gas`` where that is of a gas.
    """

    quantity: str
    gas: str = ""
    time: float | None = None

    @property
    def columns(self) -> tuple[str, ...]:
        """``c_A_mol_per_m3`` at the end, ``c_A_at_10_s_mol_per_m3`` at 10 s."""
        name, unit = QUANTITIES[self.quantity]
        when = "" if self.time is None else f"_at_{named(self.time)}_s"
        return (name.format(self.gas) + when + (f"_{unit}" if unit else ""),)

    def value(self, system: System, variation: Variation, found: Found) -> Floats:
        """The quantity in every condition."""
        spread = found.v + variation.get("dead") * found.T
        p = R * found.T * found.x.sum(axis=1) / spread
        if self.quantity == "total pressure":
            return np.asarray(p, float)
        if self.quantity == "temperature":
            return found.T
        if self.quantity == "volume":
            return np.asarray(found.v * variation.get("V"), float)
        i = system.gases.index(self.gas)
        x = found.x[:, i]
        if self.quantity == "amount":
            return np.asarray(x * variation.get("V"), float)
        if self.quantity == "concentration":
            return np.asarray(x / spread, float)
        if self.quantity == "partial pressure":
            return np.asarray(x / spread * R * found.T, float)
        with np.errstate(divide="ignore", invalid="ignore"):
            if self.quantity == "mole fraction":
                return np.asarray(x / found.x.sum(axis=1), float)
            return np.asarray(1.0 - x / (found.retained * variation.get("x", i)), float)


def levels_of(gas: int, fractions: list[float], variation: Variation) -> Functional:
    """What is left of a filled gas, as fractions of its start in the order they are reached.

    Of a gas that is not filled nothing is ever left or gone: its levels are NaN.
    """
    start = variation.get("x", gas)
    start = np.where(start > 0, start, np.nan)
    levels = np.outer(start, sorted(fractions, reverse=True))
    return Functional(((gas, 1.0),), levels=levels, shrinks=True)
