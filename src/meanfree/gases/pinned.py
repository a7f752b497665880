"""The pinned gases: common names that mean one compound, with the values a case needs.

The table stands in `pinned.toml`, to be read and mended by people. It spares a case the
second that loading the library's tables takes.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources
from typing import Any, Final

from scipy import constants as _codata

from meanfree.errors import InputError
from meanfree.gases.formula import Formula, parse_formula
from meanfree.gases.thermochemical_tables import (
    CRC_CAUTION,
    ENTROPY_SOURCES,
    SOURCES,
    HeatCapacityTable,
)
from meanfree.sourced import Sourced

_LIKE: Final[str] = "no value found; taken equal to that of {}, a molecule of like size"


@dataclass(frozen=True, slots=True)
class PinnedGas:
    """One line of the table. Values are SI with their source, None where nothing is known."""

    name: str
    cas: str
    formula: Formula
    names: tuple[str, ...]
    diameter: Sourced | None
    well_depth: Sourced | None
    enthalpy_298: Sourced | None
    entropy_298: Sourced | None
    cautions: tuple[str, ...]


@lru_cache(maxsize=1)
def pinned_gases() -> tuple[PinnedGas, ...]:
    """Every pinned gas, in the order of the table."""
    table = _read("pinned.toml")
    size_sources: dict[str, str] = table["size_sources"]
    return tuple(_gas(name, row, size_sources) for name, row in table["gases"].items())


def _read(name: str) -> dict[str, Any]:
    text = resources.files("meanfree.gases").joinpath(name).read_text(encoding="utf-8")
    return tomllib.loads(text)


def _gas(name: str, row: dict[str, Any], size_sources: dict[str, str]) -> PinnedGas:
    diameter = well_depth = None
    if "size" in row:
        angstrom, kelvin, key = row["size"]
        source = size_sources.get(key) or _LIKE.format(key.removeprefix("like "))
        diameter = Sourced(angstrom * _codata.angstrom, "angstrom", source)
        well_depth = Sourced(float(kelvin), "K", source)
    enthalpy = row.get("enthalpy")
    entropy = row.get("entropy")
    cautions = tuple(entropy[2:]) if entropy else ()
    if enthalpy and enthalpy[1] == "crc":
        cautions = (CRC_CAUTION, *cautions)
    return PinnedGas(
        name=name,
        cas=row["cas"],
        formula=parse_formula(row["formula"]),
        names=(name, *row.get("names", ())),
        diameter=diameter,
        well_depth=well_depth,
        enthalpy_298=enthalpy and Sourced(float(enthalpy[0]), "kJ/mol", SOURCES[enthalpy[1]]),
        entropy_298=entropy and Sourced(float(entropy[0]), "J/mol/K", ENTROPY_SOURCES[entropy[1]]),
        cautions=cautions,
    )


@lru_cache(maxsize=1)
def _by_name() -> dict[str, PinnedGas]:
    """Formulas under their own case; words also in lower case."""
    found: dict[str, PinnedGas] = {}
    for gas in pinned_gases():
        for name in gas.names:
            found[name] = gas
            if not _reads_as_formula(name):
                found[name.lower()] = gas
    return found


@lru_cache(maxsize=1)
def _by_cas() -> dict[str, PinnedGas]:
    return {gas.cas: gas for gas in pinned_gases()}


def _reads_as_formula(name: str) -> bool:
    try:
        parse_formula(name)
    except InputError:
        return False
    return True


def pinned_named(name: str) -> PinnedGas | None:
    """The gas that this name is pinned to, or None."""
    found = _by_name().get(name)
    if found is None and not _reads_as_formula(name):
        found = _by_name().get(name.lower())
    return found


def pinned_with_cas(cas: str) -> PinnedGas | None:
    """The pinned gas with this CAS number, or None."""
    return _by_cas().get(cas)


def pinned_of_formula(formula: Formula) -> list[PinnedGas]:
    """Every pinned gas of this composition and charge."""
    return [gas for gas in pinned_gases() if gas.formula == formula]


def pinned_names() -> list[str]:
    """Every name that is pinned, for suggestions."""
    return sorted(_by_name())


@lru_cache(maxsize=1)
def _heat_capacities() -> dict[str, Any]:
    return _read("heat_capacities.toml")


def pinned_heat_capacity(cas: str) -> HeatCapacityTable | None:
    """The first choice of heat capacity of a pinned gas, or None."""
    row = _heat_capacities().get(cas)
    if row is None:
        return None
    numbers = tuple(float(x) for x in row.get("numbers", ()))
    return HeatCapacityTable(row["kind"], float(row["low"]), float(row["high"]), numbers)
