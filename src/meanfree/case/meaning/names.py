"""Which names a gas, a label or a step may have."""

from __future__ import annotations

import re

from meanfree.units.gate import quoted
from meanfree.units.reading import described

RESERVED = {
    "M": "M is the bath gas of a step",
    "hv": "hv is light: photon says what a step takes in",
    "total": "total is the sum of all gases",
    "balance": "balance is what makes a fill up to its total",
    "others": "others are the bath gases that partners does not name",
}
LONGEST = 60
_GAS = re.compile(r"[A-Za-z0-9(\[][A-Za-z0-9()\[\],'+\-*_^]*", re.ASCII)
_STEP = re.compile(r"[A-Za-z0-9(][A-Za-z0-9 ()\[\],'+\-*_^]*", re.ASCII)


def gas_name_problem(name: object) -> tuple[str, str] | None:
    """What is wrong with a gas's name (found, expected), None where it is a name."""
    if not isinstance(name, str):
        return described(name), "a name in quotes"
    shown = quoted(name)
    for character in name:
        if not character.isascii():
            return f"{shown}, in which {_called(character)}", "a name in plain ASCII"
    if name in RESERVED:
        return f"{shown}, a reserved name", f"another name: {RESERVED[name]}"
    if len(name) > LONGEST:
        return shown, f"a name of at most {LONGEST} characters"
    if not _GAS.fullmatch(name) or (not any(c.isalpha() for c in name) and name != "e-"):
        return shown, "a name of letters, digits and ()[],'+-*_^ without spaces"
    if re.match(r"[0-9.]+[A-Za-z(]", name):
        return shown, "a name that does not begin with a coefficient"
    return None


def step_name_problem(name: str) -> tuple[str, str] | None:
    """What is wrong with a step's name (found, expected), None where it is one."""
    if len(name) > LONGEST:
        return quoted(name), f"a name of at most {LONGEST} characters"
    if not _STEP.fullmatch(name):
        return quoted(name), "a name of letters, digits, spaces and ()[],'+-*_^ (no dots)"
    return None


def _called(character: str) -> str:
    import unicodedata

    name = unicodedata.name(character, "a control character")
    return f"a character is U+{ord(character):04X} ({name})"
