"""What is known of the dangers of a gas: flammability, autoignition, exposure limits.

Every value carries its source; None means not known, never safe. The library's own
estimates of flammability limits are not used.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, fields
from functools import lru_cache
from importlib import resources
from typing import Any, Final

from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced

NOT_KNOWN: Final[str] = "not known"
OXIDISERS: Final[frozenset[str]] = frozenset(
    {"O2", "O3", "N2O", "NO2", "N2O4", "F2", "Cl2", "ClO2", "ClF3"}
)
"""Formulas (Hill order) with which a flammable gas may burn; common practice, no source."""

_ONTARIO: Final[str] = "Ontario occupational exposure limits, as tabulated in chemicals"
_FIRE_SOURCES: Final[tuple[str, ...]] = ("IEC 60079-20-1 (2010)", "NFPA 497 (2008)")


@dataclass(frozen=True, slots=True)
class Hazards:
    """Dangers of one gas in air, each None where not known.

    ``lower_flammable`` and ``upper_flammable`` are mole fractions in air [-];
    ``autoignition`` is a temperature [K]. The exposure limits, ``time_weighted`` (8 h),
    ``short_term`` (15 min) and ``ceiling``, are mole fractions [-] where the unit is "ppm",
    or mass concentrations [kg/m^3] where it is "mg/m^3".
    """

    lower_flammable: Sourced | None = None
    upper_flammable: Sourced | None = None
    autoignition: Sourced | None = None
    time_weighted: Sourced | None = None
    short_term: Sourced | None = None
    ceiling: Sourced | None = None

    @property
    def anything_known(self) -> bool:
        """Whether any of the six is known."""
        values = (
            self.lower_flammable,
            self.upper_flammable,
            self.autoignition,
            self.time_weighted,
            self.short_term,
            self.ceiling,
        )
        return any(value is not None for value in values)


def hazards_of(gas: Gas) -> Hazards:
    """What the library knows of the dangers of ``gas``; nothing for a label or an ion."""
    if gas.cas is None or gas.charge:
        return Hazards()
    return _hazards(gas.cas)


_FIELDS: Final[tuple[str, ...]] = tuple(field.name for field in fields(Hazards))


@lru_cache(maxsize=512)
def _hazards(cas: str) -> Hazards:
    row = _pinned().get(cas)
    if row is None:
        return library_hazards(cas)
    return Hazards(**{name: _read(row.get(name)) for name in _FIELDS})


@lru_cache(maxsize=1)
def _pinned() -> dict[str, Any]:
    path = resources.files("meanfree.gases").joinpath("hazards.toml")
    return tomllib.loads(path.read_text(encoding="utf-8"))


def _read(entry: list[Any] | None) -> Sourced | None:
    if entry is None:
        return None
    value, unit, source = entry
    return Sourced(float(value), unit, source)


def library_hazards(cas: str) -> Hazards:
    """The same out of the library's tables; the first time takes seconds."""
    from chemicals import safety

    return Hazards(
        lower_flammable=_fire(cas, safety.LFL_methods(CASRN=cas), _lower, "%"),
        upper_flammable=_fire(cas, safety.UFL_methods(CASRN=cas), _upper, "%"),
        autoignition=_fire(cas, safety.T_autoignition_methods(cas), _ignition, "K"),
        time_weighted=_limit(safety.TWA(cas)),
        short_term=_limit(safety.STEL(cas)),
        ceiling=_limit(safety.Ceiling(cas)),
    )


def _lower(cas: str, method: str) -> Any:
    from chemicals import safety

    return safety.LFL(CASRN=cas, method=method)


def _upper(cas: str, method: str) -> Any:
    from chemicals import safety

    return safety.UFL(CASRN=cas, method=method)


def _ignition(cas: str, method: str) -> Any:
    from chemicals import safety

    return safety.T_autoignition(cas, method=method)


def _fire(cas: str, known: list[str], look_up: Any, unit: str) -> Sourced | None:
    """The value of the first source that has it; only measured collections are asked."""
    for source in _FIRE_SOURCES:
        if source in known:
            value = look_up(cas, source)
            if value is not None:
                return Sourced(float(value), unit, source)
    return None


def _limit(found: tuple[float, str] | None) -> Sourced | None:
    if found is None:
        return None
    value, unit = found
    # ppm to a mole fraction and mg/m^3 to kg/m^3 happen to be the same factor.
    return Sourced(1e-6 * float(value), unit, _ONTARIO)
