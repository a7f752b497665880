"""What gases, numbers and units look like, and how text of a case is made harmless.

A name from a case may hold anything. It never reaches an output but through `visible` and the
output's own escaping.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence

from meanfree.equations.typeset.tree import Label, Symbol, Unit
from meanfree.errors import InputError
from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas

_PIECE = re.compile(
    r"(?P<charge>\^\d*[+-]+$|(?<=[)\]])\d+[+-]+$|[+-]+$)|(?P<count>(?<=[A-Za-z)\]])\d+)|(?P<rest>.)"
)
"""As `parse_formula` reads it: in ``NH4+`` the number counts atoms, in ``SO4^2-`` the charge."""

SLOTS: dict[str, tuple[Symbol, str]] = {
    "k": (Symbol("k"), "k"),
    "A": (Symbol("A"), "k"),
    "n": (Symbol("n"), ""),
    "T_ref": (Symbol("T", "ref"), "K"),
    "E": (Symbol("E"), "J mol^-1"),
    "P": (Symbol("P"), ""),
    "s": (Symbol("s"), ""),
    "sigma": (Symbol("σ"), "m^2"),
    "mu": (Symbol("μ"), "kg"),
    "E0": (Symbol("E", "0"), "J mol^-1"),
    "sigma_0": (Symbol("σ", "0"), "m^2"),
    "gs": (Symbol("g"), ""),
    "C6": (Symbol("C", "6"), "J m^6"),
    "q2alpha": (Symbol("B", "ind"), "J m^4"),
    "d2_over_alpha": (Symbol("W", "dip"), "J"),
    "R_jump": (Symbol("d", "jump"), "m"),
    "A_0": (Symbol("A", "0"), "k+"),
    "n_0": (Symbol("n", "0"), ""),
    "T_0": (Symbol("T", "ref,0"), "K"),
    "E_0": (Symbol("E", "0"), "J mol^-1"),
    "A_inf": (Symbol("A", "∞"), "k"),
    "n_inf": (Symbol("n", "∞"), ""),
    "T_inf": (Symbol("T", "ref,∞"), "K"),
    "E_inf": (Symbol("E", "∞"), "J mol^-1"),
    "F_0": (Symbol("f", "0"), ""),
    "gamma": (Symbol("γ"), ""),
    "M_gas": (Symbol("m", "mol"), "kg mol^-1"),
    "S_over_V": (Symbol("a", "S"), "m^-1"),
    "D_0": (Symbol("D", "0"), "m^2 s^-1"),
    "p_0": (Symbol("p", "0"), "Pa"),
    "m": (Symbol("m"), ""),
    "J": (Symbol("J"), "k"),
    "rate": (Symbol("k"), "k"),
    "r": (Symbol("r"), "m"),
    "L": (Symbol("L"), "m"),
}
"""Symbol and unit of a law's numbers; the unit "k" is that of the rate constant itself, "k+" one
order more."""

SERIES: dict[str, tuple[str, str]] = {
    "T": ("T", "K"),
    "k": ("k", "k"),
    "E": ("E", "J mol^-1"),
    "sigma": ("σ", "m^2"),
    "a": ("a", ""),
    "b": ("b", "K"),
}
"""Numbers that come in several: letter and unit of ``T_1``, ``k_2``, …"""


def visible(text: str) -> str:
    """Text with control and direction characters made visible, on one line."""
    return "".join(
        c if unicodedata.category(c)[0] != "C" else f"\\u{ord(c):04x}"
        for c in " ".join(text.split())
    )


def gas_label(gas: Gas) -> Label:
    """A gas by its formula with subscripts where its name is one, else by its name as it stands."""
    before, dash, last = gas.name.rpartition("-")
    isomer = (before + dash, last) if last else ("", gas.name)
    for prefix, name in (("", gas.name), isomer):
        if _is_formula(name, gas):
            prefixed = [("text", visible(prefix))] if prefix else []
            return Label((*prefixed, *_pieces(name, gas)))
    return Label((("text", visible(gas.name)),))


def _is_formula(name: str, gas: Gas) -> bool:
    try:
        return gas.formula is not None and parse_formula(name) == gas.formula
    except InputError:
        return False


def _pieces(name: str, gas: Gas) -> list[tuple[str, str]]:
    assert gas.formula is not None
    pieces: list[tuple[str, str]] = []
    for match in _PIECE.finditer(name):
        text = match.group()
        if match["charge"]:
            pieces.append(("sup", _charge(text, gas.formula.charge)))
        elif match["count"]:
            pieces.append(("sub", text))
        elif pieces and pieces[-1][0] == "text":
            pieces[-1] = ("text", pieces[-1][1] + text)
        else:
            pieces.append(("text", text))
    return pieces


def _charge(text: str, charge: int) -> str:
    size = "" if abs(charge) == 1 else str(abs(charge))
    return size + ("+" if charge > 0 else "−")


def slot(name: str) -> tuple[Symbol, str]:
    """Symbol and unit of a law's number; ``k_3`` is the third of its kind: k with (3) below.

    A number that this page does not know keeps its name and stands in SI.
    """
    if name in SLOTS:
        return SLOTS[name]
    letter, _, rest = name.partition("_")
    if letter in SERIES:
        return Symbol(SERIES[letter][0], f"({rest})"), SERIES[letter][1]
    return Symbol(letter, rest), "SI"


def number_parts(value: float) -> tuple[str, str]:
    """Mantissa and power of ten of a number with six digits; the power empty where it is small."""
    text = f"{value:.6g}"
    if "e" not in text:
        return text.replace("-", "−"), ""
    mantissa, exponent = text.split("e")
    return mantissa.replace("-", "−"), str(int(exponent)).replace("-", "−")


def unit(text: str) -> Unit:
    """``m^3 mol^-1 s^-1`` as a unit."""
    factors = []
    for part in text.split():
        name, _, exponent = part.partition("^")
        factors.append((name, float(exponent or 1)))
    return Unit(tuple(factors))


def rate_constant_unit(order: float) -> Unit:
    """(m^3/mol)^(order-1)/s."""
    more = order - 1
    factors = [("m", 3 * more), ("mol", -more), ("s", -1.0)]
    return ordered_unit(factors)


def ordered_unit(factors: Sequence[tuple[str, float]]) -> Unit:
    """Powers above zero first, powers of zero left out: mol m^-3 s^-1."""
    above = [(name, exponent) for name, exponent in factors if exponent > 0]
    return Unit((*above, *((name, exponent) for name, exponent in factors if exponent < 0)))


def exponent_text(value: float) -> str:
    """A power of a unit, six digits."""
    return f"{value:.6g}".replace("-", "−")
