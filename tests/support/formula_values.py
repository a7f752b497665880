"""Written formulas as the numbers that they stand for."""

from __future__ import annotations

import math

from meanfree.equations.typeset import EquationSheet
from meanfree.equations.typeset.tree import (
    Call,
    Fraction,
    Node,
    Number,
    Power,
    Product,
    Root,
    Sum,
)

Known = dict[Node, float | Node]


def texts(sheet: EquationSheet) -> list[str]:
    return [entry.text for group in sheet.groups for entry in group.entries]


def value(part: Node, known: Known) -> float:
    """The number that a written formula stands for."""
    if part in known:
        found = known[part]
        return value(found, known) if isinstance(found, Node) else found
    match part:
        case Number():
            return part.value
        case Sum():
            return sum(sign * value(term, known) for sign, term in part.terms)
        case Product():
            return math.prod(value(factor, known) for factor in part.factors)
        case Fraction():
            return value(part.above, known) / value(part.below, known)
        case Power():
            return float(value(part.base, known) ** value(part.exponent, known))
        case Root():
            return math.sqrt(value(part.inside, known))
        case Call(name="exp"):
            return math.exp(value(part.inside, known))
        case Call(name="ln"):
            return math.log(value(part.inside, known))
        case Call(name="lg"):
            return math.log10(value(part.inside, known))
    raise AssertionError(f"{part} has no number")
