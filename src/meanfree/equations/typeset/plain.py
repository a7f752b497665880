"""Formulas in one line of Unicode, for the terminal."""

from __future__ import annotations

from meanfree.equations.typeset import tree
from meanfree.equations.typeset.names import exponent_text, number_parts
from meanfree.equations.typeset.writer import POWER, PRODUCT, SUM, Writer

_SUB = dict(zip("0123456789+-−ij", "₀₁₂₃₄₅₆₇₈₉₊₋₋ᵢⱼ", strict=True))
_SUP = dict(zip("0123456789+-−", "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻⁻", strict=True))


class Plain(Writer):
    """Text for a terminal."""

    flat = True

    def bracket(self, written: str) -> str:
        """(x)"""
        return f"({written})"

    def number(self, part: tree.Number) -> str:
        """0.5, 1.2×10⁻⁵"""
        mantissa, power = number_parts(part.value)
        return f"{mantissa}×10{_raised(power)}" if power else mantissa

    def symbol(self, part: tree.Symbol) -> str:
        """k₁, E₀, T_ref, n(NO₂)"""
        letter = part.letter + part.mark
        if isinstance(part.below, tree.Node):
            return f"{letter}({self.write(part.below)})"
        below = "".join(_SUB.get(c, "") for c in part.below)
        if len(below) == len(part.below):
            return letter + below
        return f"{letter}_{part.below}"

    def label(self, part: tree.Label) -> str:
        """N₂O₄"""
        shapes = {"sub": _SUB, "sup": _SUP, "text": {}}
        return "".join("".join(shapes[kind].get(c, c) for c in text) for kind, text in part.pieces)

    def words(self, part: tree.Words) -> str:
        """As they stand."""
        return part.text

    def unit(self, part: tree.Unit) -> str:
        """m³ mol⁻¹ s⁻¹"""
        return " ".join(
            name if power == 1 else name + _raised(exponent_text(power))
            for name, power in part.factors
        )

    def sum(self, part: tree.Sum) -> str:
        """a + b − c"""
        (sign, first), *rest = part.terms
        written = ("−" if sign < 0 else "") + self.inside(first, PRODUCT)
        for sign, term in rest:
            written += (" − " if sign < 0 else " + ") + self.inside(term, PRODUCT)
        return written

    def product(self, part: tree.Product) -> str:
        """a b c"""
        return " ".join(self.factors(part))

    def fraction(self, part: tree.Fraction) -> str:
        """a/(b c)"""
        return f"{self.inside(part.above, PRODUCT)}/{self.inside(part.below, POWER)}"

    def power(self, part: tree.Power) -> str:
        """[A]², (T/T_ref)^n"""
        base = self.base(part)
        exponent = self.write(part.exponent)
        raised = _raised(exponent)
        if not raised.startswith("^"):
            return base + raised
        return f"{base}^{self.inside(part.exponent, POWER + 1)}"

    def root(self, part: tree.Root) -> str:
        """√(x)"""
        return f"√({self.write(part.inside)})"

    def call(self, part: tree.Call) -> str:
        """exp(x)"""
        return f"{part.name}({self.write(part.inside)})"

    def concentration(self, part: tree.Concentration) -> str:
        """[NO₂]"""
        return f"[{self.write(part.gas)}]"

    def derivative(self, part: tree.Derivative) -> str:
        """dn(NO₂)/dt"""
        return f"d{self.write(part.of)}/dt"

    def total(self, part: tree.Total) -> str:
        """Σᵢ x"""
        index = {"i": "ᵢ", "j": "ⱼ"}[part.index]
        return f"Σ{index} {self.inside(part.body, PRODUCT)}"

    def cases(self, part: tree.Cases) -> str:
        """{ a where x < 1; b otherwise }"""
        rows = []
        for value, condition in part.rows:
            joint = " " if isinstance(condition, tree.Words) else " where "
            rows.append(self.write(value) + joint + self.write(condition))
        return "{ " + "; ".join(rows) + " }"

    def row(self, part: tree.Row) -> str:
        """Parts with spaces between."""
        parts = [p if isinstance(p, str) else self.write(p) for p in part.parts]
        return " ".join(parts).replace("( ", "(").replace(" )", ")")

    def relation(self, part: tree.Relation) -> str:
        """left = right"""
        right = " ".join(self.inside(row, SUM) for row in part.rows)
        return f"{self.write(part.left)} {part.sign} {right}"


def _raised(text: str) -> str:
    """Superscript, or ^text where Unicode has none."""
    raised = "".join(_SUP.get(c, "") for c in text)
    return raised if len(raised) == len(text) else f"^{text}"
