"""What text may be a quantity: one number and one product of unit names, nothing else.

Unit libraries read "1,5 bar" as 15 bar and compute "80 torr + 3 torr"; here the text is taken
apart by a regular expression first, and what does not fit is refused with a reason.
"""

from __future__ import annotations

import math
import re
import unicodedata
from typing import NamedTuple

LONGEST = 100  # characters; no honest quantity is longer

_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_FACTOR = re.compile(
    r"(?P<name>[A-Za-zµÅ]+(?:_[A-Za-z]+)*|%|‰)"
    r"(?:(?:\^|\*\*)?(?P<bare>[+-]?[0-9]+(?:\.[0-9]+)?)|(?:\^|\*\*)\((?P<braced>[+-]?[0-9]+"
    r"(?:\.[0-9]+)?)\))?"
)
_GAUGE = re.compile(
    r"\b(?:psi|m?bar|[kMh]?Pa|atm|m?torr|(?:mm|in)hg)\s*[(\[]?\s*g(?:au?ge)?\s*[)\]]?$", re.I
)
_PERCENT = re.compile(r"\b(?:mol|mole|vol)\s*%")
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_SAME = str.maketrans({"μ": "µ", "\u212b": "Å", "·": "*", "×": "*", "⋅": "*", "\u00a0": " "})
_LETTERS = "µÅ‰"

Factors = tuple[tuple[str, float], ...]


class QuantityError(ValueError):
    """A text is not the quantity it should be; ``found`` and ``expected`` say why."""

    def __init__(self, found: str, expected: str) -> None:
        self.found = found
        self.expected = expected
        super().__init__(f"found {found}; expected {expected}")


class RefusedError(Exception):
    """Why the gate refuses a text; the reader of a quantity adds what would be right."""

    def __init__(self, reason: str, advice: str = "") -> None:
        self.reason = reason
        self.advice = advice
        super().__init__(reason)


class Parts(NamedTuple):
    """A quantity taken apart: its number and its unit names with their exponents."""

    number: float
    factors: Factors


def quoted(text: object) -> str:
    """A text for a message: in quotes, shortened, with control characters made visible."""
    shown = str(text)
    if len(shown) > 60:
        shown = shown[:45] + "… (" + str(len(shown)) + " characters)"
    shown = "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in shown)
    return f'"{shown}"'


def take_apart(text: str) -> Parts:
    """Number and unit names of ``text``. Raises `RefusedError` for anything else."""
    if len(text) > LONGEST:
        raise RefusedError("which is too long for a quantity")
    plain = _plain(text.strip())
    match = _NUMBER.match(plain)
    if match is None:
        raise RefusedError(*_no_number(plain))
    unit = plain[match.end() :].strip()
    if unit[:1] == ",":
        raise RefusedError("with a comma in the number", "a decimal point and no commas")
    if unit[:1] == "." or unit[:1] == "_":
        raise RefusedError("in which the number cannot be read")
    return Parts(_finite(match.group()), factors(unit))


def factors(unit: str) -> Factors:
    """Unit names and exponents of a unit text such as ``cm^3/molecule/s``; empty for none.

    Raises `RefusedError` where the text is anything but a product of units.
    """
    if _GAUGE.search(unit):
        raise RefusedError("a gauge pressure", "an absolute pressure: add the pressure of the room")
    plain = _PERCENT.sub("%", _plain(unit)).strip()
    bracket = re.fullmatch(r"(?P<above>[^()]*)/\s*\((?P<below>[^()/]*)\)", plain)
    if bracket is None:
        return _product(plain, unit)
    below = _product(bracket["below"], unit)
    return (*_product(bracket["above"], unit), *((name, -power) for name, power in below))


def _product(plain: str, unit: str) -> Factors:
    """Unit names joined by ``*``, ``/`` or a space; each ``/`` divides by the name after it."""
    rest = plain.strip()
    found: list[tuple[str, float]] = []
    if rest == "1" or re.match(r"1\s*/", rest):
        rest = rest[1:].lstrip()
    elif rest[:1] in ("/", "*"):
        raise RefusedError(f"in which {quoted(unit)} is no product of units")
    while rest:
        operator = re.match(r"[/*]?", rest)
        assert operator is not None
        rest = rest[operator.end() :].lstrip()
        factor = _FACTOR.match(rest)
        if factor is None:
            raise RefusedError(f"in which {quoted(unit)} is no product of units")
        power = float(factor["bare"] or factor["braced"] or 1)
        if not 0 < abs(power) <= 20:
            raise RefusedError(f"in which {quoted(factor.group())} has no sensible power")
        found.append((factor["name"], -power if operator.group() == "/" else power))
        rest = rest[factor.end() :].lstrip()
    return tuple(found)


def unit_text(parts: Factors) -> str:
    """Unit names and exponents as one text: ``cm^3/molecule/s``."""
    above = [(name, power) for name, power in parts if power > 0]
    below = [(name, -power) for name, power in parts if power < 0]
    if not above and not below:
        return ""
    numerator = "*".join(_powered(name, power) for name, power in above) or "1"
    return "/".join([numerator, *(_powered(name, power) for name, power in below)])


def _powered(name: str, power: float) -> str:
    return name if power == 1 else f"{name}^{power:g}"


def _plain(text: str) -> str:
    """Superscripts as powers, one micro sign; look-alike letters are refused by name."""
    powered = re.sub("[⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺]+", lambda m: "^" + m.group().translate(_SUPERSCRIPTS), text)
    plain = powered.translate(_SAME).replace("℃", "°C")
    plain = plain.replace("°C", "degC").replace("°F", "degF")
    for character in plain:
        if not (character.isascii() and character.isprintable()) and character not in _LETTERS:
            name = unicodedata.name(character, "a control character")
            raise RefusedError(f"in which a character is U+{ord(character):04X} ({name})")
    return plain


def _finite(number: str) -> float:
    value = float(number)
    if not math.isfinite(value):
        raise RefusedError("a number too large to hold", "a finite number")
    if value == 0 and re.search("[1-9]", re.split("[eE]", number)[0]):
        raise RefusedError("a number too small to hold", "a number that is not lost in rounding")
    return value


def _no_number(text: str) -> tuple[str, str]:
    if not text:
        return "which is empty", ""
    if re.match(r"[+-]?(nan|inf)", text, re.I):
        return "which is not finite", "a finite number"
    return "which does not begin with a number", ""
