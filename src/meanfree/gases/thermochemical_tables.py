"""Enthalpies, entropies and heat capacities out of the library's tables, choice by choice.

Which table is believed is decided here and nowhere else: enthalpies from ATcT, else JANAF,
else CRC with a caution; never TRC, API, JOBACK or YAWS, which were seen to be wrong.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Final, Literal

import numpy as np
from scipy.constants import R

from meanfree.gases.thermochemistry import Array, HeatCapacity
from meanfree.sourced import Sourced

SOURCES: Final[dict[str, str]] = {
    "atct": "Active Thermochemical Tables (ATcT) 1.112",
    "janaf": "NIST-JANAF Thermochemical Tables, 4th ed. (1998), 1 bar",
    "crc": "CRC Handbook of Chemistry and Physics, standard thermodynamic properties, 1 bar",
    "trc": "Frenkel et al., Thermodynamics of Organic Compounds in the Gas State (TRC, 1994)",
    "webbook": "NIST Chemistry WebBook",
    "monatomic": "monatomic gas, 5/2 R",
    "reference": "reference state of the element, zero by definition",
}

ENTROPY_SOURCES: Final[dict[str, str]] = {
    "janaf": SOURCES["janaf"],
    "crc": SOURCES["crc"],
    "trc": SOURCES["trc"] + ", 1 bar",
    "webbook": SOURCES["webbook"] + " (agrees with CRC, 1 bar)",
}
CRC_CAUTION: Final[str] = (
    "the enthalpy is from the CRC Handbook: such values have been seen to put an"
    " equilibrium constant wrong by a factor of two"
)
REFERENCE_ELEMENTS: Final = frozenset({"7782-39-0"})
"""Gases that are the reference state of an element and missing in ATcT: deuterium."""

Kind = Literal["trc", "shomate", "janaf", "monatomic"]
NOBLE_GASES: Final = frozenset(
    {"7440-59-7", "7440-01-9", "7440-37-1", "7439-90-9", "7440-63-3", "10043-92-2"}
)


@dataclass(frozen=True, slots=True)
class HeatCapacityTable:
    """Cp of one gas as its source gives it.

    ``numbers`` are the eight coefficients of the closed form ("trc"); for "shomate" seven a
    piece (low, high, A to E) and for "janaf" two a point (T, Cp), one after the other. SI.
    """

    kind: Kind
    low: float
    high: float
    numbers: tuple[float, ...] = ()

    @property
    def source(self) -> str:
        """Source and the range it states."""
        form = {"shomate": SOURCES["webbook"] + ", Shomate equation"}.get(self.kind)
        return f"{form or SOURCES[self.kind]}, {self.low:g} to {self.high:g} K"

    def function(self) -> HeatCapacity:
        """Cp [J/mol/K] as a function of temperatures [K], shape (n,)."""
        if self.kind == "trc":
            return lambda t: closed_form(t, self.numbers)
        if self.kind == "shomate":
            return lambda t: shomate(t, np.reshape(self.numbers, (-1, 7)))
        if self.kind == "monatomic":
            return lambda t: np.full_like(t, 2.5 * R)
        from scipy.interpolate import CubicSpline

        points = np.reshape(self.numbers, (-1, 2))
        curve = CubicSpline(np.log(points[:, 0]), points[:, 1])
        return lambda t: np.asarray(curve(np.log(t)), dtype=float)


def closed_form(temperature: Array, coefficients: tuple[float, ...]) -> Array:
    """Cp/R = a0 + (a1/T^2) exp(-a2/T) + a3 y^2 + (a4 - a5/(T - a7)^2) y^8.

    y = (T - a7)/(T + a6) above a7, else 0. ``temperature`` [K], shape (n,); Cp [J/mol/K].
    Source: Frenkel et al. (1994), multiplied out so that T = a7 is no division by zero.
    """
    a0, a1, a2, a3, a4, a5, a6, a7 = coefficients
    above = np.maximum(temperature - a7, 0.0)
    y = above / (temperature + a6)
    tail = a5 * above**6 / (temperature + a6) ** 8
    bend = a1 / temperature**2 * np.exp(-a2 / temperature)
    return np.asarray(R * (a0 + bend + a3 * y**2 + a4 * y**8 - tail))


def shomate(temperature: Array, pieces: Array) -> Array:
    """Cp = A + B T + C T^2 + D T^3 + E/T^2 [J/mol/K], piece by piece.

    ``temperature`` [K], shape (n,); ``pieces`` shape (n_pieces, 7): low, high, A to E.
    Below the first and above the last piece that piece goes on.
    """
    which = np.clip(np.searchsorted(pieces[:, 0], temperature, side="right") - 1, 0, None)
    a, b, c, d, e = pieces[which, 2:].T
    t = temperature
    return np.asarray(a + t * (b + t * (c + t * d)) + e / t**2)


def enthalpy_298(cas: str) -> tuple[Sourced, str] | None:
    """Enthalpy of formation at 298.15 K [J/mol] and a caution ("" where none is due)."""
    from chemicals import reaction

    if cas in REFERENCE_ELEMENTS:
        return Sourced(0.0, "kJ/mol", SOURCES["reference"]), ""
    for key, method in (("atct", "ATCT_G"), ("janaf", "JANAF"), ("crc", "CRC")):
        value = reaction.Hfg(cas, method=method)
        if value is not None and np.isfinite(value):
            caution = CRC_CAUTION if key == "crc" else ""
            return Sourced(float(value), "kJ/mol", SOURCES[key]), caution
    return None


def entropy_298(cas: str) -> tuple[Sourced, str] | None:
    """Entropy at 298.15 K and 1 bar [J/mol/K] and a caution ("" where none is due).

    JANAF first. WebBook is used where CRC, which is at 1 bar and rounded, agrees with it;
    alone it is the last choice, because many of its entries are at 1 atm without saying so
    (median 0.10 J/mol/K below TRC over the compounds that both have; R ln 1.01325 is 0.109).
    """
    from chemicals import reaction

    janaf, crc, webbook = (
        _finite(reaction.S0g(cas, method=method)) for method in ("JANAF", "CRC", "WEBBOOK")
    )
    trc = _trc_entropy(cas)
    if janaf is not None:
        return Sourced(janaf, "J/mol/K", ENTROPY_SOURCES["janaf"]), ""
    if crc is not None:
        caution = ""
        if trc is not None and abs(trc - crc) > 2.0:
            caution = f"the entropy is {crc:.1f} J/mol/K in CRC and {trc:.1f} in TRC"
        if webbook is not None and abs(webbook - crc) <= 0.06:
            return Sourced(webbook, "J/mol/K", ENTROPY_SOURCES["webbook"]), caution
        return Sourced(crc, "J/mol/K", ENTROPY_SOURCES["crc"]), caution
    if trc is not None:
        return Sourced(trc, "J/mol/K", ENTROPY_SOURCES["trc"]), ""
    if webbook is not None:
        caution = "the source of the entropy does not say whether it is at 1 atm or 1 bar"
        return Sourced(webbook, "J/mol/K", SOURCES["webbook"]), caution
    return None


def _finite(value: float | None) -> float | None:
    return None if value is None or not np.isfinite(value) else float(value)


def _trc_row(cas: str) -> Any | None:
    from chemicals import heat_capacity

    table = heat_capacity.TRC_gas_data
    return table.loc[cas] if cas in table.index else None


def _trc_entropy(cas: str) -> float | None:
    """S [J/mol/K] from the closed form with its integration constant J, at 298.15 K."""
    from chemicals import heat_capacity

    row = _trc_row(cas)
    if row is None:
        return None
    numbers = [float(row[name]) for name in ("a0", "a1", "a2", "a3", "a4", "a5", "a6", "a7", "J")]
    if not all(np.isfinite(numbers)) or numbers[7] == 0.0:
        return None  # the library divides by a7
    return float(heat_capacity.TRCCp_integral_over_T(298.15, *numbers))


def heat_capacity_tables(cas: str) -> Iterator[HeatCapacityTable]:
    """The tables that hold Cp of this gas, best first."""
    from chemicals import heat_capacity

    if cas in NOBLE_GASES:
        yield HeatCapacityTable("monatomic", 50.0, 6000.0)
        return
    row = _trc_row(cas)
    if row is not None:
        numbers = tuple(float(row[f"a{n}"]) for n in range(8))
        yield HeatCapacityTable("trc", float(row["Tmin"]), float(row["Tmax"]), numbers)
    found = heat_capacity.WebBook_Shomate_gases.get(cas)
    if found is not None:
        pieces = getattr(found, "models", (found,))
        flat = tuple(float(x) for p in pieces for x in (p.Tmin, p.Tmax, *p.coeffs))
        yield HeatCapacityTable("shomate", float(pieces[0].Tmin), float(pieces[-1].Tmax), flat)
    points = heat_capacity.Cp_dict_JANAF_gas.get(cas)
    if points is not None:
        pairs = [(float(t), float(cp)) for t, cp in zip(*points, strict=True) if t >= 100.0]
        if len(pairs) >= 4:
            flat = tuple(x for pair in pairs for x in pair)
            yield HeatCapacityTable("janaf", pairs[0][0], pairs[-1][0], flat)
