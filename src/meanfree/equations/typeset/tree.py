"""A formula as a tree, built by writing it: ``A * (T / T_ref) ** n``.

Rate laws are written over a namespace of functions; given this one they write themselves down in
the form their author chose. No algebra is done but the trivial: 1 x, x + 0, 0/x, x^0, e^0, -(-x).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any


class Node:
    """Base of all parts of a formula; the operators build larger parts."""

    def __add__(self, other: Any) -> Node:
        return add(self, other)

    def __radd__(self, other: Any) -> Node:
        return add(other, self)

    def __sub__(self, other: Any) -> Node:
        return add(self, negative(node(other)))

    def __rsub__(self, other: Any) -> Node:
        return add(other, negative(self))

    def __neg__(self) -> Node:
        return negative(self)

    def __mul__(self, other: Any) -> Node:
        return multiply(self, other)

    def __rmul__(self, other: Any) -> Node:
        return multiply(other, self)

    def __truediv__(self, other: Any) -> Node:
        return divide(self, other)

    def __rtruediv__(self, other: Any) -> Node:
        return divide(other, self)

    def __pow__(self, other: Any) -> Node:
        return power(self, other)

    def __rpow__(self, other: Any) -> Node:
        return power(other, self)


@dataclass(frozen=True)
class Number(Node):
    """A number, shown with up to six digits."""

    value: float


@dataclass(frozen=True)
class Symbol(Node):
    """A letter (in Unicode), with a subscript and a mark above: ``ΔH°`` of a gas."""

    letter: str
    below: Node | str = ""
    mark: str = ""


@dataclass(frozen=True)
class Label(Node):
    """A gas as pieces of (kind, text), the kind "text", "sub" or "sup"."""

    pieces: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Words(Node):
    """Words in a formula, set upright."""

    text: str


@dataclass(frozen=True)
class Unit(Node):
    """A product of unit names with their powers."""

    factors: tuple[tuple[str, float], ...]


@dataclass(frozen=True)
class Sum(Node):
    """Terms with their signs."""

    terms: tuple[tuple[int, Node], ...]


@dataclass(frozen=True)
class Product(Node):
    """Factors in their order."""

    factors: tuple[Node, ...]


@dataclass(frozen=True)
class Fraction(Node):
    """One thing over another."""

    above: Node
    below: Node


@dataclass(frozen=True)
class Power(Node):
    """A base with an exponent."""

    base: Node
    exponent: Node


@dataclass(frozen=True)
class Root(Node):
    """A square root."""

    inside: Node


@dataclass(frozen=True)
class Call(Node):
    """A named function of one argument."""

    name: str
    inside: Node


@dataclass(frozen=True)
class Concentration(Node):
    """A gas in square brackets."""

    gas: Node


@dataclass(frozen=True)
class Derivative(Node):
    """d/dt of something."""

    of: Node


@dataclass(frozen=True)
class Total(Node):
    """The sum over an index."""

    body: Node
    index: str = "i"


@dataclass(frozen=True)
class Cases(Node):
    """(value, condition) rows; each condition is itself a formula or words."""

    rows: tuple[tuple[Node, Node], ...]


@dataclass(frozen=True)
class Row(Node):
    """Parts one after the other; a text is an operator."""

    parts: tuple[Node | str, ...]


@dataclass(frozen=True)
class Relation(Node):
    """``left sign right``; a right side of several rows goes on in further lines."""

    left: Node
    rows: tuple[Node, ...]
    sign: str = "="


def node(thing: Any) -> Node:
    """A number or a part of a formula as a part of a formula."""
    return thing if isinstance(thing, Node) else Number(float(thing))


def equals(left: Node, right: Node | float) -> Relation:
    """``left = right``"""
    return Relation(left, (node(right),))


def is_number(thing: Node, value: float) -> bool:
    """Whether a part is this number."""
    return isinstance(thing, Number) and thing.value == value


def terms_of(thing: Node) -> tuple[tuple[int, Node], ...]:
    """A sum's terms, or the one term that something else is."""
    if isinstance(thing, Sum):
        return thing.terms
    if isinstance(thing, Number) and thing.value < 0:
        return ((-1, Number(-thing.value)),)
    return ((1, thing),)


def negative(thing: Node) -> Node:
    """-x"""
    if isinstance(thing, Number):
        return Number(-thing.value if thing.value else 0.0)
    flipped = tuple((-sign, term) for sign, term in terms_of(thing))
    return flipped[0][1] if len(flipped) == 1 and flipped[0][0] == 1 else Sum(flipped)


def add(*things: Any) -> Node:
    """The sum of parts, zeros left out."""
    terms = [t for thing in things if not is_number(node(thing), 0) for t in terms_of(node(thing))]
    if not terms:
        return Number(0.0)
    return terms[0][1] if len(terms) == 1 and terms[0][0] == 1 else Sum(tuple(terms))


def multiply(*things: Any) -> Node:
    """The product of parts; signs go in front, numbers too."""
    sign, number = 1, 1.0
    factors: list[Node] = []
    waiting = [node(thing) for thing in reversed(things)]
    while waiting:
        factor = waiting.pop()
        if isinstance(factor, Product):
            waiting.extend(reversed(factor.factors))
        elif isinstance(factor, Number):
            number *= factor.value
        elif isinstance(factor, Sum) and len(factor.terms) == 1:
            sign *= factor.terms[0][0]
            waiting.append(factor.terms[0][1])
        else:
            factors.append(factor)
    if number < 0:
        sign, number = -sign, -number
    if number == 0:
        return Number(0.0)
    if number != 1 or not factors:
        factors.insert(0, Number(number))
    result = factors[0] if len(factors) == 1 else Product(tuple(factors))
    return result if sign > 0 else negative(result)


def divide(above: Any, below: Any) -> Node:
    """One part over another."""
    top, bottom = node(above), node(below)
    if is_number(bottom, 1) or is_number(top, 0):
        return top
    if isinstance(top, Sum) and len(top.terms) == 1 and top.terms[0][0] < 0:
        return negative(Fraction(top.terms[0][1], bottom))
    return Fraction(top, bottom)


def power(base: Any, exponent: Any) -> Node:
    """A part to a power."""
    below, above = node(base), node(exponent)
    if is_number(above, 0):
        return Number(1.0)
    if is_number(above, 1) or is_number(below, 1):
        return below
    if is_number(above, 0.5):
        return Root(below)
    if isinstance(above, Number):
        for parts in (3, 6):
            if abs(above.value * parts - 1) < 1e-12:
                return Power(below, Fraction(Number(1.0), Number(float(parts))))
    return Power(below, above)


class Written:
    """The `Functions` of a rate law that write it down."""

    R: Any = Symbol("R")
    k_B: Any = Symbol("k", "B")
    N_A: Any = Symbol("N", "A")
    pi: Any = Symbol("π")

    @staticmethod
    def exp(x: Any) -> Node:
        """exp(x)"""
        return Number(1.0) if is_number(node(x), 0) else Call("exp", node(x))

    @staticmethod
    def log(x: Any) -> Node:
        """ln x"""
        return Call("ln", node(x))

    @staticmethod
    def log10(x: Any) -> Node:
        """lg x, the decimal logarithm"""
        return Call("lg", node(x))

    @staticmethod
    def sqrt(x: Any) -> Node:
        """The square root."""
        return Root(node(x))

    @staticmethod
    def below(x: Any, limit: Any, then: Any, otherwise: Any) -> Node:
        """Two cases."""
        condition = Relation(node(x), (node(limit),), "<")
        return Cases(((node(then), condition), (node(otherwise), Words("otherwise"))))

    @staticmethod
    def piecewise_linear(x: Any, xs: Sequence[Any], ys: Sequence[Any]) -> Node:
        """A line through the points of a table; the points themselves stand beside the formula."""
        return Call("linear", node(x))
