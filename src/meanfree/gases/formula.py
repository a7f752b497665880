"""Chemical formulas: what a gas is made of, and its charge.

A formula is text that a person typed, so the parser refuses rather than repairs: an
unknown element, a look-alike letter of another alphabet or a lost bracket is an error.
"""

from __future__ import annotations

import unicodedata
from dataclasses import dataclass
from functools import lru_cache
from typing import NoReturn

from scipy import constants as _codata

from meanfree.errors import InputError
from meanfree.gases.atomic_weights import ATOMIC_NUMBERS, ATOMIC_WEIGHTS, SOURCE
from meanfree.sourced import Sourced

_LONGEST = 120
_LARGEST_COUNT = 9999
_CLOSING = {"(": ")", "[": "]"}
_EXPECTED = "a formula such as CH4, (CH3)2CO, H3O+ or SO4^2-"


@dataclass(frozen=True, slots=True)
class Formula:
    """Atoms of each element and the charge of one molecule.

    ``elements`` is sorted by symbol, each with a positive count; ``charge`` counts
    elementary charges. The electron has no elements and charge -1.
    """

    elements: tuple[tuple[str, int], ...]
    charge: int = 0

    def count(self, element: str) -> int:
        """Atoms of ``element`` in one molecule, 0 where there is none."""
        return dict(self.elements).get(element, 0)

    @property
    def atoms(self) -> int:
        """Atoms in one molecule."""
        return sum(count for _, count in self.elements)

    @property
    def hill(self) -> str:
        """The formula in Hill order: C, H, then the rest; all alphabetical without C.

        >>> parse_formula("(CH3)2CO").hill
        'C3H6O'
        >>> parse_formula("HOCl").hill
        'ClHO'
        """
        if not self.elements:
            return "e-" if self.charge == -1 else ""
        counts = dict(self.elements)
        first = [e for e in ("C", "H") if e in counts] if "C" in counts else []
        order = first + [e for e in sorted(counts) if e not in first]
        body = "".join(e + (str(counts[e]) if counts[e] > 1 else "") for e in order)
        if not self.charge:
            return body
        sign = "+" if self.charge > 0 else "-"
        size = abs(self.charge)
        return body + (sign if size == 1 else f"^{size}{sign}")

    @property
    def molar_mass(self) -> Sourced:
        """Molar mass [kg/mol]; the electrons that an ion lacks or has are counted.

        >>> round(parse_formula("H2O").molar_mass.value, 7)
        0.0180153
        """
        electron = _codata.m_e * _codata.N_A
        grams = sum(ATOMIC_WEIGHTS[element] * count for element, count in self.elements)
        source = SOURCE
        if self.charge:
            source = f"{SOURCE}, with the mass of the electrons (CODATA)"
        if not self.elements:
            source = "mass of the electron (CODATA)"
        return Sourced(1e-3 * grams - self.charge * electron, "g/mol", source)

    def __str__(self) -> str:
        return self.hill


def _refuse(key: str, text: str, why: str, expected: str = _EXPECTED) -> NoReturn:
    shown = text if len(text) <= 40 else text[:37] + "..."
    raise InputError.at(key, f'"{shown}" ({why})', expected)


def refuse_look_alikes(text: str, key: str, expected: str = _EXPECTED) -> None:
    """Refuse any character outside ASCII, by its name, and control characters.

    Raises `InputError`. A Cyrillic H or a subscript 2 looks right on screen and would
    otherwise be reported as an unknown element that looks exactly like a known one.
    """
    for place, character in enumerate(text, start=1):
        if not character.isascii() or not character.isprintable():
            name = unicodedata.name(character, f"U+{ord(character):04X}")
            shown = "".join(c if c.isprintable() else "?" for c in text)
            _refuse(key, shown, f"character {place} is {name}", f"{expected}, in plain ASCII")


def parse_formula(text: str, *, key: str = "formula") -> Formula:
    """Read a formula.

    Groups stand in ``()`` or ``[]``. A charge is ``+`` or ``-`` (repeated for more than
    one), ``^2-``, or a number and sign after a closing bracket: ``[Ca]2+``. A number
    directly after an element counts atoms, so ``O2+`` is the ion of dioxygen. The
    electron is ``e-``; ``D`` is deuterium.

    ``key`` is the address named in an error. Raises `InputError`.

    >>> parse_formula("(CH3)2CO").elements
    (('C', 3), ('H', 6), ('O', 1))
    >>> parse_formula("O2+")
    Formula(elements=(('O', 2),), charge=1)
    >>> parse_formula("SO4^2-").charge
    -2
    """
    if not text:
        _refuse(key, text, "empty")
    refuse_look_alikes(text, key)
    if len(text) > _LONGEST:
        _refuse(key, text, f"{len(text)} characters", f"at most {_LONGEST} characters")
    return _parse(text, key)


@lru_cache(maxsize=4096)
def _parse(text: str, key: str) -> Formula:
    if text == "e-":
        return Formula((), -1)
    body, charge = _split_charge(text, key)
    counts = _count_atoms(body, text, key)
    electrons = sum(ATOMIC_NUMBERS[element] * count for element, count in counts.items())
    if charge > electrons:  # else the mass of the ion could fall below zero
        _refuse(key, text, f"charge {charge}, but {electrons} electron(s) to lose")
    return Formula(tuple(sorted(counts.items())), charge)


def _split_charge(text: str, key: str) -> tuple[str, int]:
    """The text without its charge, and the charge."""
    body = text.rstrip("+-")
    signs = text[len(body) :]
    if "^" in body:
        body, _, size = body.partition("^")
        if len(signs) != 1 or not size.isdigit() or size.startswith("0"):
            _refuse(key, text, "unreadable charge")
        return body, _bounded(size, text, key) * (1 if signs == "+" else -1)
    if not signs:
        return body, 0
    if len(set(signs)) > 1:
        _refuse(key, text, "both signs in the charge")
    sign = 1 if signs[0] == "+" else -1
    core = body.rstrip("0123456789")
    if len(signs) == 1 and core.endswith("]") and core.startswith("[") and core != body:
        return core, sign * _bounded(body[len(core) :], text, key)
    return body, sign * len(signs)


def _bounded(digits: str, text: str, key: str) -> int:
    if digits.startswith("0") or len(digits) > 4 or int(digits) > _LARGEST_COUNT:
        _refuse(key, text, f"count {digits[:12]}", f"a count from 1 to {_LARGEST_COUNT}")
    return int(digits)


def _count_atoms(body: str, text: str, key: str) -> dict[str, int]:
    """Atoms of each element in ``body``; groups are held on a stack."""
    stack: list[tuple[str, dict[str, int]]] = [("", {})]
    place = 0
    while place < len(body):
        character = body[place]
        if character in _CLOSING:
            stack.append((_CLOSING[character], {}))
            place += 1
            continue
        if character in ")]":
            closing, group = stack.pop()
            if closing != character or not group:
                _refuse(key, text, f'"{character}" closes nothing')
            place += 1
        else:
            symbol = _element_at(body, place, text, key)
            group = {symbol: 1}
            place += len(symbol)
        end = place
        while end < len(body) and body[end].isdigit():
            end += 1
        factor = _bounded(body[place:end], text, key) if end > place else 1
        place = end
        for element, count in group.items():
            total = stack[-1][1].get(element, 0) + factor * count
            stack[-1][1][element] = total
    if len(stack) != 1:
        _refuse(key, text, f'"{stack[-1][0]}" is missing')
    counts = stack[0][1]
    if not counts or max(counts.values()) > _LARGEST_COUNT:
        _refuse(key, text, "no atoms" if not counts else "too many atoms")
    return counts


def _element_at(body: str, place: int, text: str, key: str) -> str:
    for width in (2, 1):
        symbol = body[place : place + width]
        if len(symbol) == width and symbol in ATOMIC_WEIGHTS:
            return symbol
    end = place + 1
    while end < len(body) and body[end].islower():
        end += 1
    _refuse(key, text, f'no element "{body[place:end]}"')
