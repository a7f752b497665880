"""Vapour pressures: whether a gas would condense at the temperature it is filled or run at.

None means not known. Nothing is extrapolated outside the range of a correlation; only that vapour
pressures rise with temperature is used there.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources
from math import exp, log
from typing import Any, Final, Literal

from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced

Kind = Literal["perry", "mcgarry", "vdi", "poling", "landolt", "solid"]

SOURCES: Final[dict[str, str]] = {
    "solid": "Landolt-Boernstein IV/20 (Antoine equation, solid)",
    "perry": "Perry's Chemical Engineers' Handbook, 8th ed. (2007), Table 2-8",
    "mcgarry": "McGarry, Ind. Eng. Chem. Process Des. Dev. 22, 313 (1983)",
    "vdi": "VDI Heat Atlas, 2nd ed. (2010)",
    "poling": "Poling, Prausnitz and O'Connell, 5th ed. (2001), App. A (Antoine equation)",
    "landolt": "Landolt-Boernstein IV/20 (Antoine equation)",
}


@dataclass(frozen=True, slots=True)
class VapourPressureTable:
    """One correlation for the vapour pressure, with its range [K] and SI coefficients."""

    kind: Kind
    low: float
    high: float
    numbers: tuple[float, ...]

    def pressure(self, temperature: float) -> float:
        """Vapour pressure [Pa] at ``temperature`` [K], by the form that the source uses.

        "perry": ln p = c1 + c2/T + c3 ln T + c4 T^c5; "mcgarry" and "vdi": Wagner's
        ln(p/pc) = (a x + b x^1.5 + c x^m + d x^n) Tc/T with x = 1 - T/Tc and m, n = 3, 6 or
        2.5, 5; the others: Antoine's log p = a - b/(T + c), to base 10 or e.
        """
        t = temperature
        if self.kind == "perry":
            c1, c2, c3, c4, c5 = self.numbers
            return exp(c1 + c2 / t + c3 * log(t) + c4 * t**c5)
        if self.kind in ("mcgarry", "vdi"):
            a, b, c, d, critical_pressure, critical = self.numbers
            x = 1.0 - t / critical
            m, n = (3.0, 6.0) if self.kind == "mcgarry" else (2.5, 5.0)
            return critical_pressure * exp(
                (a * x + b * x**1.5 + c * x**m + d * x**n) * critical / t
            )
        a, b, c = self.numbers
        return float((10.0 if self.kind == "poling" else exp(1.0)) ** (a - b / (t + c)))


@dataclass(frozen=True, slots=True)
class Vapour:
    """Critical temperature [K] (None if not known) and the correlations, best first."""

    critical_temperature: Sourced | None
    tables: tuple[VapourPressureTable, ...]


def vapour_pressure(gas: Gas, temperature: float) -> Sourced | None:
    """Vapour pressure of ``gas`` [Pa] at ``temperature`` [K] over its liquid or solid.

    None where it is not known there; see `condenses` for the critical temperature.
    """
    if gas.cas is None or gas.charge:
        return None
    for table in vapour_of(gas.cas).tables:
        if table.low <= temperature <= table.high:
            return Sourced(table.pressure(temperature), "kPa", SOURCES[table.kind])
    return None


def saturation(gas: Gas, temperature: float, partial_pressure: float) -> Sourced | None:
    """The pressure [Pa] that settles whether ``gas`` at ``partial_pressure`` [Pa] would condense.

    The vapour pressure where it is known at ``temperature`` [K]; else, since it rises with
    temperature, that at the nearest higher temperature, where the gas has more than that, or at
    the nearest lower one, where it has no more. None where neither settles it.
    """
    exact = vapour_pressure(gas, temperature)
    if exact is not None or gas.cas is None or gas.charge:
        return exact
    tables = vapour_of(gas.cas).tables
    above = [(t.pressure(t.low), t.low, t.kind) for t in tables if t.low > temperature]
    below = [(t.pressure(t.high), t.high, t.kind) for t in tables if t.high < temperature]
    if above and partial_pressure > min(above)[0]:
        value, T, kind = min(above)
        word = "less"
    elif below and partial_pressure <= max(below)[0]:
        value, T, kind = max(below)
        word = "more"
    else:
        return None
    return Sourced(value, "kPa", f"{SOURCES[kind]}, at {T:.5g} K: {word} at {temperature:.5g} K")


def condenses(gas: Gas, temperature: float, partial_pressure: float) -> bool | None:
    """Whether ``gas`` at ``partial_pressure`` [Pa] and ``temperature`` [K] would condense.

    Never above the critical temperature; None where nothing that is known settles it.
    """
    if gas.cas is None or gas.charge:
        return None
    critical = vapour_of(gas.cas).critical_temperature
    if critical is not None and temperature > critical.value:
        return False
    settles = saturation(gas, temperature, partial_pressure)
    return None if settles is None else partial_pressure > settles.value


@lru_cache(maxsize=512)
def vapour_of(cas: str) -> Vapour:
    """Critical temperature and correlations of a compound, pinned or out of the library."""
    row = _pinned().get(cas)
    if row is None:
        return library_vapour(cas)
    tables = tuple(
        VapourPressureTable(kind, float(low), float(high), tuple(float(x) for x in numbers))
        for kind, low, high, *numbers in row["tables"]
    )
    critical = row.get("critical")
    return Vapour(critical and Sourced(float(critical[0]), "K", critical[1]), tables)


@lru_cache(maxsize=1)
def _pinned() -> dict[str, Any]:
    path = resources.files("meanfree.gases").joinpath("vapour_pressures.toml")
    return tomllib.loads(path.read_text(encoding="utf-8"))


def library_vapour(cas: str) -> Vapour:
    """The same out of the library's tables alone."""
    from chemicals import critical

    found = None
    known = critical.Tc_methods(cas)
    for source in ("HEOS", "IUPAC", "MATTHEWS", "CRC", "WEBBOOK", "PD", "PSRK"):
        value = critical.Tc(cas, method=source) if source in known else None
        if value:
            found = Sourced(float(value), "K", f"critical temperature, {source} in chemicals")
            break
    return Vapour(found, tuple(_library_tables(cas)))


def _library_tables(cas: str) -> Iterator[VapourPressureTable]:
    from chemicals import vapor_pressure as library

    perry = library.Psat_data_Perrys2_8  # first: asking for it loads all of them
    layouts: tuple[tuple[Kind, Any, str], ...] = (
        ("solid", library.Psub_data_Landolt_Antoine, "A B C"),
        ("perry", perry, "C1 C2 C3 C4 C5"),
        ("mcgarry", library.Psat_data_WagnerMcGarry, "A B C D Pc Tc"),
        ("vdi", library.Psat_data_VDI_PPDS_3, "A B C D Pc Tc"),
        ("poling", library.Psat_data_AntoinePoling, "A B C"),
        ("landolt", library.Psat_data_Landolt_Antoine, "A B C"),
    )
    for kind, table, columns in layouts:
        if cas in table.index:
            row = table.loc[cas]
            low = float(row["Tm" if kind == "vdi" else "Tmin"])
            high = float(row["Tmax" if "Tmax" in row.index else "Tc"])
            numbers = tuple(float(row[name]) for name in columns.split())
            if low < high:
                yield VapourPressureTable(kind, low, high, numbers)
