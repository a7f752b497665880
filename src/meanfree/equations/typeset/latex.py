"""Formulas as LaTeX that plain amsmath compiles.

Text of a case is escaped character by character.
"""

from __future__ import annotations

from meanfree.equations.typeset import tree
from meanfree.equations.typeset.names import exponent_text, number_parts
from meanfree.equations.typeset.tree import Node
from meanfree.equations.typeset.writer import PRODUCT, Writer

_ESCAPED = {
    "\\": r"\textbackslash{}",
    "{": r"\{",
    "}": r"\}",
    "$": r"\$",
    "&": r"\&",
    "#": r"\#",
    "_": r"\_",
    "%": r"\%",
    "^": r"\textasciicircum{}",
    "~": r"\textasciitilde{}",
    "<": r"\textless{}",
    ">": r"\textgreater{}",
    "|": r"\textbar{}",
    '"': r"{''}",
    "'": r"{'}",
    "`": r"{\`{}}",
    "-": r"{-}",
    "−": r"\ensuremath{-}",
    "°": r"\ensuremath{{}^{\circ}}",
    "×": r"\ensuremath{\times}",
    "→": r"\ensuremath{\rightarrow}",
    "⇌": r"\ensuremath{\rightleftharpoons}",
    "Δ": r"\ensuremath{\Delta}",
    "σ": r"\ensuremath{\sigma}",
    "∞": r"\ensuremath{\infty}",
    "ν": r"\ensuremath{\nu}",
    "μ": r"\ensuremath{\mu}",
}
_LETTERS = {"σ": r"\sigma", "μ": r"\mu", "π": r"\pi", "γ": r"\gamma", "λ": r"\lambda"}
_MARKS = {"°": r"\circ"}
_OPERATORS = {"→": r"\rightarrow", "⇌": r"\rightleftharpoons", "−": "-", "≤": r"\le", "≥": r"\ge"}
_CALLS = {"exp": r"\exp", "ln": r"\ln", "lg": r"\lg"}


def escape(text: str) -> str:
    """Any text as LaTeX text; what plain fonts lack is named by its code point."""
    return "".join(
        _ESCAPED.get(c, c if c.isascii() and c.isprintable() else f"[U+{ord(c):04X}]") for c in text
    )


class LaTeX(Writer):
    """Mathematics without the surrounding environment."""

    def bracket(self, written: str) -> str:
        r"""\left( x \right)"""
        return rf"\left({written}\right)"

    def number(self, part: tree.Number) -> str:
        """1.2 \times 10^{-5}"""
        mantissa, power = (text.replace("−", "-") for text in number_parts(part.value))
        return rf"{mantissa} \times 10^{{{power}}}" if power else mantissa

    def symbol(self, part: tree.Symbol) -> str:
        """Letter, subscript, mark"""
        written = _letter(part.letter)
        if isinstance(part.below, Node):
            written += f"_{{{self.write(part.below)}}}"
        elif part.below:
            below = part.below.replace("−", "-")
            if below == "∞":
                return rf"{written}_{{\infty}}"
            plain = below.removeprefix("-").isdigit()
            written += f"_{{{below}}}" if plain else rf"_{{\mathrm{{{escape(below)}}}}}"
        return written + (f"^{{{_MARKS[part.mark]}}}" if part.mark else "")

    def label(self, part: tree.Label) -> str:
        r"""\mathrm{N_{2}O_{4}}, or \text{...} for a name"""
        if len(part.pieces) == 1 and not part.pieces[0][1].isalnum():
            return rf"\text{{{escape(part.pieces[0][1])}}}"
        shapes = {"sub": "_{%s}", "sup": "^{%s}", "text": "%s"}
        inner = [
            shapes[kind] % (escape(text) if kind == "text" else text.replace("−", "-"))
            for kind, text in part.pieces
        ]
        return rf"\mathrm{{{''.join(inner)}}}"

    def words(self, part: tree.Words) -> str:
        r"""\text{...}"""
        return rf"\text{{{escape(part.text)}}}"

    def unit(self, part: tree.Unit) -> str:
        r"""\mathrm{m^{3}\,mol^{-1}}"""
        written = [
            escape(name) if power == 1 else f"{escape(name)}^{{{_ascii(power)}}}"
            for name, power in part.factors
        ]
        return r"\mathrm{" + r"\,".join(written) + "}"

    def sum(self, part: tree.Sum) -> str:
        """a + b - c"""
        written = ""
        for place, (sign, term) in enumerate(part.terms):
            operator = "-" if sign < 0 else "+" if place else ""
            written += (f" {operator} " if place else operator) + self.inside(term, PRODUCT)
        return written

    def product(self, part: tree.Product) -> str:
        r"""a \, b"""
        return r" \, ".join(self.factors(part))

    def fraction(self, part: tree.Fraction) -> str:
        r"""\frac{a}{b}"""
        return rf"\frac{{{self.write(part.above)}}}{{{self.write(part.below)}}}"

    def power(self, part: tree.Power) -> str:
        """a^{b}"""
        return f"{self.base(part)}^{{{self.write(part.exponent)}}}"

    def root(self, part: tree.Root) -> str:
        r"""\sqrt{x}"""
        return rf"\sqrt{{{self.write(part.inside)}}}"

    def call(self, part: tree.Call) -> str:
        r"""\exp(x)"""
        name = _CALLS.get(part.name, rf"\operatorname{{{part.name}}}")
        return rf"{name}{self.bracket(self.write(part.inside))}"

    def concentration(self, part: tree.Concentration) -> str:
        """[x]"""
        return rf"[{self.write(part.gas)}]"

    def derivative(self, part: tree.Derivative) -> str:
        r"""\frac{dx}{dt}"""
        return rf"\frac{{\mathrm{{d}}{self.write(part.of)}}}{{\mathrm{{d}}t}}"

    def total(self, part: tree.Total) -> str:
        r"""\sum_i x"""
        return rf"\sum_{{{part.index}}} {self.inside(part.body, PRODUCT)}"

    def cases(self, part: tree.Cases) -> str:
        r"""\begin{cases}"""
        rows = [f"{self.write(value)} & {self.write(when)}" for value, when in part.rows]
        return r"\begin{cases}" + r" \\ ".join(rows) + r"\end{cases}"

    def row(self, part: tree.Row) -> str:
        """Parts in a row"""
        written = ""
        before: Node | str = ""
        for p in part.parts:
            here = _OPERATORS.get(p, p) if isinstance(p, str) else self.write(p)
            thin = isinstance(p, Node) and isinstance(before, Node)
            written += (r" \, " if thin else " ") + here
            before = p
        return written.strip()

    def relation(self, part: tree.Relation) -> str:
        """left = right, further rows aligned"""
        sign = _OPERATORS.get(part.sign, part.sign)
        rows = [self.write(row) for row in part.rows]
        if len(rows) == 1:
            return f"{self.write(part.left)} {sign} {rows[0]}"
        joined = r" \\ & \quad ".join(rows)
        return rf"\begin{{aligned}}{self.write(part.left)} {sign} {{}} & {joined}\end{{aligned}}"


def _letter(text: str) -> str:
    if len(text) > 1 and text[0] == "Δ":
        return rf"\Delta {_letter(text[1:])}"
    if text in _LETTERS:
        return _LETTERS[text]
    return text if len(text) == 1 else rf"\mathit{{{escape(text)}}}"


def _ascii(value: float) -> str:
    return exponent_text(value).replace("−", "-")
