"""Formulas as presentation MathML of the kind that browsers set themselves (MathML Core).

Every text goes through XML escaping. Names of gases are upright text, so that no browser
changes their letters.
"""

from __future__ import annotations

from html import escape

from meanfree.equations.typeset import tree
from meanfree.equations.typeset.names import exponent_text, number_parts
from meanfree.equations.typeset.tree import Node
from meanfree.equations.typeset.writer import PRODUCT, Writer

_SPACE = '<mspace width="0.17em"/>'
_WIDE = '<mspace width="1em"/>'


def mathml(part: Node) -> str:
    """A formula with its ``<math>`` around it."""
    return (
        '<math xmlns="http://www.w3.org/1998/Math/MathML" display="block">'
        f"{MathML().write(part)}</math>"
    )


class MathML(Writer):
    """Elements without the outermost ``<math>``."""

    def bracket(self, written: str) -> str:
        """(x)"""
        return f"<mrow>{_fence('(')}{written}{_fence(')')}</mrow>"

    def number(self, part: tree.Number) -> str:
        """<mn>"""
        mantissa, power = number_parts(part.value)
        # A minus is no part of an <mn>: it would stand too close.
        sign = "<mo>−</mo>" if mantissa.startswith("−") else ""
        shown = f"<mn>{mantissa.removeprefix('−')}</mn>"
        if power:
            exponent = f"<msup><mn>10</mn>{_signed(power)}</msup>"
            shown = f"{shown}<mo>×</mo>{exponent}"
        return f"<mrow>{sign}{shown}</mrow>" if sign or power else shown

    def symbol(self, part: tree.Symbol) -> str:
        """<msub> or <msubsup>"""
        letter = _letters(part.letter)
        below = self.write(part.below) if isinstance(part.below, Node) else _below(part.below)
        if below and part.mark:
            return f"<msubsup>{letter}{below}<mo>{escape(part.mark)}</mo></msubsup>"
        if part.mark:
            return f"<msup>{letter}<mo>{escape(part.mark)}</mo></msup>"
        return f"<msub>{letter}{below}</msub>" if below else letter

    def label(self, part: tree.Label) -> str:
        """Upright text with subscripts"""
        written: list[str] = []
        for kind, text in part.pieces:
            if kind == "text" or not written:
                written.append(f"<mtext>{escape(text)}</mtext>")
            else:
                tag = "msub" if kind == "sub" else "msup"
                written[-1] = f"<{tag}>{written[-1]}<mtext>{escape(text)}</mtext></{tag}>"
        return written[0] if len(written) == 1 else f"<mrow>{''.join(written)}</mrow>"

    def words(self, part: tree.Words) -> str:
        """<mtext>"""
        return f"<mtext>{escape(part.text)}</mtext>"

    def unit(self, part: tree.Unit) -> str:
        """Upright names with powers"""
        written = []
        for name, power in part.factors:
            text = f"<mtext>{escape(name)}</mtext>"
            raised = f"<msup>{text}{_signed(exponent_text(power))}</msup>"
            written.append(text if power == 1 else raised)
        return f"<mrow>{_SPACE.join(written)}</mrow>"

    def sum(self, part: tree.Sum) -> str:
        """Terms with operators between"""
        written = ""
        for place, (sign, term) in enumerate(part.terms):
            operator = "−" if sign < 0 else "+" if place else ""
            form = "" if place else ' form="prefix"'
            written += f"<mo{form}>{operator}</mo>" if operator else ""
            written += self.inside(term, PRODUCT)
        return f"<mrow>{written}</mrow>"

    def product(self, part: tree.Product) -> str:
        """Factors with a thin space"""
        return f"<mrow>{_SPACE.join(self.factors(part))}</mrow>"

    def fraction(self, part: tree.Fraction) -> str:
        """<mfrac>"""
        return f"<mfrac>{self.write(part.above)}{self.write(part.below)}</mfrac>"

    def power(self, part: tree.Power) -> str:
        """<msup>"""
        return f"<msup>{self.base(part)}{self.write(part.exponent)}</msup>"

    def root(self, part: tree.Root) -> str:
        """<msqrt>"""
        return f"<msqrt>{self.write(part.inside)}</msqrt>"

    def call(self, part: tree.Call) -> str:
        """exp(x)"""
        return f"<mrow><mi>{escape(part.name)}</mi>{self.bracket(self.write(part.inside))}</mrow>"

    def concentration(self, part: tree.Concentration) -> str:
        """[x]"""
        return f"<mrow>{_fence('[')}{self.write(part.gas)}{_fence(']')}</mrow>"

    def derivative(self, part: tree.Derivative) -> str:
        """dx/dt"""
        d = '<mi mathvariant="normal">d</mi>'
        return f"<mfrac><mrow>{d}{self.write(part.of)}</mrow><mrow>{d}<mi>t</mi></mrow></mfrac>"

    def total(self, part: tree.Total) -> str:
        """Sum over an index"""
        big = f"<munder><mo>∑</mo><mi>{escape(part.index)}</mi></munder>"
        return f"<mrow>{big}{self.inside(part.body, PRODUCT)}</mrow>"

    def cases(self, part: tree.Cases) -> str:
        """A brace and a table, each row a value and its condition"""
        rows = []
        for value, condition in part.rows:
            cells = (self.write(value), _WIDE + self.write(condition))
            rows.append("<mtr>" + "".join(f"{_LEFT}{cell}</mtd>" for cell in cells) + "</mtr>")
        return f"<mrow><mo>{{</mo><mtable>{''.join(rows)}</mtable></mrow>"

    def row(self, part: tree.Row) -> str:
        """Parts in a row, a thin space between two that are no operators"""
        written = ""
        before: Node | str = ""
        for p in part.parts:
            if isinstance(p, Node) and isinstance(before, Node):
                written += _SPACE
            written += self.write(p) if isinstance(p, Node) else f"<mo>{escape(p)}</mo>"
            before = p
        return f"<mrow>{written}</mrow>"

    def relation(self, part: tree.Relation) -> str:
        """left = right, further rows under the right side"""
        head = f"{self.write(part.left)}<mo>{escape(part.sign)}</mo>"
        rows = [self.write(row) for row in part.rows]
        if len(rows) == 1:
            return f"<mrow>{head}{rows[0]}</mrow>"
        lines = [f"<mtr>{_LEFT}{head}</mtd>{_LEFT}{rows[0]}</mtd></mtr>"]
        lines += [f"<mtr>{_LEFT}</mtd>{_LEFT}{_WIDE}{row}</mtd></mtr>" for row in rows[1:]]
        return f'<mtable displaystyle="true">{"".join(lines)}</mtable>'


_LEFT = '<mtd style="text-align: left">'


def _letters(text: str) -> str:
    """A symbol of ours: a single letter leans, a Δ before it stands."""
    if len(text) == 2 and text[0] == "Δ":
        return f'<mrow><mi mathvariant="normal">Δ</mi><mi>{escape(text[1])}</mi></mrow>'
    return f"<mi>{escape(text)}</mi>"


def _below(text: str) -> str:
    if not text:
        return ""
    if text in {"i", "j"}:
        return f"<mi>{text}</mi>"
    number = text.removeprefix("−")
    return _signed(text) if number.isdigit() else f"<mtext>{escape(text)}</mtext>"


def _fence(mark: str) -> str:
    """A bracket without the space that browsers give to an operator."""
    form = "prefix" if mark in "([" else "postfix"
    return f'<mo form="{form}" lspace="0em" rspace="0em">{mark}</mo>'


def _signed(text: str) -> str:
    if text.startswith("−"):
        return f'<mrow><mo form="prefix">−</mo><mn>{text[1:]}</mn></mrow>'
    return f"<mn>{escape(text)}</mn>"
