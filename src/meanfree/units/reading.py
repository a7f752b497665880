"""Text into SI and back: the four functions through which every quantity passes."""

from __future__ import annotations

import math
from collections.abc import Iterable
from functools import cache
from typing import NamedTuple

from meanfree import constants
from meanfree.sourced import Sourced
from meanfree.units import registry
from meanfree.units.dimensions import Dimension, any_phrase, named, word_for
from meanfree.units.gate import (
    Factors,
    QuantityError,
    RefusedError,
    factors,
    quoted,
    take_apart,
    unit_text,
)

_FRACTIONS = {
    "%": 1e-2,
    "‰": 1e-3,
    "ppm": 1e-6,
    "ppb": 1e-9,
    "ppt": 1e-12,
    "ppmv": 1e-6,
    "ppbv": 1e-9,
    "pptv": 1e-12,
}
_MOLECULES = ("molecule", "molecules", "molec", "particle", "particles", "atom", "atoms")
_ENERGY_OF_ONE = ("eV", "meV", "hartree", "Hartree")


class _Scale(NamedTuple):
    """value_SI = value * factor + offset, or factor / value for a wavelength."""

    factor: float
    offset: float
    unit: str
    inverse: bool = False


def to_si(value: float, unit: str, dimension: str) -> float:
    """``value`` of that unit in SI; ``unit`` is "" for pure numbers.

    Raises `QuantityError` if the unit does not measure that dimension.
    """
    scale = _scale_of_text(unit, dimension)
    return scale.factor / value if scale.inverse else value * scale.factor + scale.offset


def from_si(value: float, unit: str, dimension: str) -> float:
    """An SI ``value`` in that unit. Raises as `to_si`."""
    scale = _scale_of_text(unit, dimension)
    return scale.factor / value if scale.inverse else (value - scale.offset) / scale.factor


def read(text: object, dimension: str, source: str = "") -> Sourced:
    """The quantity that ``text`` writes, in SI.

    Its ``unit`` is the one written, in one spelling; "cm^3/s" as a rate constant becomes
    "cm^3/molecule/s", which is what it means.

    Raises
    ------
    QuantityError
        The text is no quantity of that dimension, or no possible value of it.
    """
    return _read(text, (dimension,), source)


def read_any(text: object, dimensions: Iterable[str], source: str = "") -> Sourced:
    """The quantity that ``text`` writes, of the first dimension that its unit measures."""
    return _read(text, tuple(dimensions), source)


def read_number(value: object, dimension: str = "pure", source: str = "") -> Sourced:
    """A number without a unit as it stands in a case file: "pure", or a "fraction".

    A number in quotes is read as well; a "fraction" may be written "27 %" or "5 ppm".
    """
    wanted = named(dimension)
    if isinstance(value, str):
        return read(value, dimension, source)
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise QuantityError(described(value), wanted.phrase.replace('"', ""))
    try:
        number = float(value)
    except OverflowError:
        raise QuantityError("a number too large to hold", wanted.phrase.replace('"', "")) from None
    _possible(number, wanted, described(value))
    return Sourced(number, "", source, dimension)


def described(value: object) -> str:
    """A value of a case file that is no text, for a message."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int) and abs(value) >= 10**15:
        return "a very large number"
    if isinstance(value, int | float):
        return f"{value:g}"
    if isinstance(value, str):
        return quoted(value)
    return (
        "a table" if isinstance(value, dict) else "a list" if isinstance(value, list) else "a date"
    )


def _read(text: object, words: tuple[str, ...], source: str) -> Sourced:
    dimensions = [named(word) for word in words]
    expected = any_phrase(words)
    if not isinstance(text, str):
        numeric = isinstance(text, int | float) and not isinstance(text, bool)
        found = f"{described(text)}, a bare number" if numeric else described(text)
        raise QuantityError(found, f"{expected}, in quotes and with its unit")
    try:
        parts = take_apart(text)
        for dimension in dimensions:
            scale = _scale(parts.factors, dimension.word)
            if scale is not None:
                break
        else:
            raise RefusedError(_what_it_is(parts.factors))
    except RefusedError as refused:
        advice = f" ({refused.advice})" if refused.advice else ""
        raise QuantityError(f"{quoted(text)}, {refused.reason}", expected + advice) from None
    if scale.inverse and parts.number == 0:
        raise QuantityError(quoted(text), expected)
    value = (
        scale.factor / parts.number if scale.inverse else parts.number * scale.factor + scale.offset
    )
    _possible(value, dimension, quoted(text))
    return Sourced(value, scale.unit, source, dimension.word)


def _possible(value: float, dimension: Dimension, found: str) -> None:
    """Refuse what cannot be: not finite, below absolute zero, negative sizes, absurd ones."""
    if not math.isfinite(value):
        raise QuantityError(f"{found}, which is not finite", f"{dimension.phrase}, a finite number")
    low_enough = value > dimension.lowest if dimension.above else value >= dimension.lowest
    if low_enough and value <= dimension.highest:
        return
    bound, value_si = "of at most", dimension.highest
    if not low_enough:
        bound, value_si = "above" if dimension.above else "of at least", dimension.lowest
    name = f"{dimension.article} {dimension.known or dimension.word}"
    raise QuantityError(found, f"{name} {bound} {value_si:g} {dimension.si}".strip())


@cache
def _scale_of_text(unit: str, word: str) -> _Scale:
    dimension = named(word)
    try:
        scale = _scale(factors(unit), word)
    except RefusedError as refused:
        raise QuantityError(
            f"the unit {quoted(unit)}, {refused.reason}", dimension.phrase
        ) from None
    if scale is None:
        raise QuantityError(f"the unit {quoted(unit)}", dimension.phrase)
    return scale


@cache
def _scale(parts: Factors, word: str) -> _Scale | None:
    """How a unit measures a dimension, None where it does not."""
    dimension = named(word)
    if not dimension.powers:
        return _scale_of_number(parts, dimension)
    if not parts or any(name in _FRACTIONS for name, _ in parts):
        return None
    size = registry.size(parts)
    text = unit_text(parts)
    if dimension.word == "temperature difference" and size.powers == dimension.powers:
        return _Scale(size.factor, 0.0, text)
    if size.powers == dimension.powers:
        return _Scale(size.factor, size.offset, text)
    if dimension.molecules:
        return _per_molecule(parts, size, dimension)
    for route in dimension.routes:
        scale = _ROUTES[route](parts, size)
        if scale is not None:
            return scale
    return None


def _scale_of_number(parts: Factors, dimension: Dimension) -> _Scale | None:
    if not parts:
        return _Scale(1.0, 0.0, "")
    name, power = parts[0]
    if dimension.word == "fraction" and len(parts) == 1 and power == 1 and name in _FRACTIONS:
        return _Scale(_FRACTIONS[name], 0.0, name)
    return None


def _per_molecule(parts: Factors, size: registry.Size, dimension: Dimension) -> _Scale | None:
    """A unit that leaves the amount out counts molecules: cm^3/s is cm^3/molecule/s."""
    counted = dimension.powers["substance"]
    if {**size.powers, "substance": counted} != dimension.powers or "substance" in size.powers:
        return None
    text = unit_text((("molecule", counted), *parts))
    return _Scale(size.factor * constants.N_A**-counted, 0.0, text)


def _number_density(parts: Factors, size: registry.Size) -> _Scale | None:
    molecules = any(name in _MOLECULES for name, _ in parts)
    if size.powers == {"substance": 1.0, "length": -3.0} and molecules:
        return _Scale(size.factor * constants.N_A, 0.0, unit_text(parts))
    return None


def _energy(parts: Factors, size: registry.Size) -> _Scale | None:
    """Energies by other measures: K (E/k_B), cm^-1 (E/hc), eV and hartree of one molecule."""
    if parts == (("K", 1.0),):
        return _Scale(constants.R, 0.0, "K")
    if size.powers == {"length": -1.0}:
        text = "cm^-1" if parts == (("cm", -1.0),) else unit_text(parts)
        return _Scale(size.factor * constants.h * constants.c * constants.N_A, 0.0, text)
    if len(parts) == 1 and parts[0][0] in _ENERGY_OF_ONE and parts[0][1] == 1:
        return _Scale(size.factor * constants.N_A, 0.0, unit_text(parts))
    return None


def _wavelength(parts: Factors, size: registry.Size) -> _Scale | None:
    if size.powers != {"length": 1.0}:
        return None
    molar = constants.N_A * constants.h * constants.c
    return _Scale(molar / size.factor, 0.0, unit_text(parts), inverse=True)


_ROUTES = {"number density": _number_density, "energy": _energy, "wavelength": _wavelength}


def _what_it_is(parts: Factors) -> str:
    if not parts:
        return "which has no unit"
    if any(name in _FRACTIONS for name, _ in parts):
        return "a fraction"
    return word_for(registry.size(parts).powers) or f"whose unit is {unit_text(parts)}"
