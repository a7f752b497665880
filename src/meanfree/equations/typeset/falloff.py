"""A step between its limits, written as its authors write it.

The law itself evaluates one exponential of the difference of both limits, which no reader would
recognise; the test of the typesetter holds the two to the same number.
"""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.equations.typeset.tree import (
    Call,
    Fraction,
    Node,
    Number,
    Relation,
    Symbol,
    add,
    divide,
    equals,
    multiply,
    negative,
    power,
)
from meanfree.rates.falloff import Falloff

T = Symbol("T")
LOW, HIGH = Symbol("k", "0"), Symbol("k", "∞")


def falloff_lines(law: Falloff, k: Node, M: Node, symbols: list[Node]) -> Iterator[Relation]:
    """k between k_0 [M] and k_inf; ``symbols`` one for each number of the law, in its order."""
    reduced = Symbol("P", "r")
    broadened = law.broadening != "none" and law.Fc is not None
    F = [Symbol("F")] if broadened else []
    yield equals(k, multiply(Fraction(multiply(LOW, M), add(1, reduced)), *F))
    yield equals(reduced, Fraction(multiply(LOW, M), HIGH))
    for limit, (A, n, T_ref, E) in ((LOW, symbols[:4]), (HIGH, symbols[4:8])):
        exponent = negative(divide(E, multiply(Symbol("R"), T)))
        falling = Number(1.0) if Number(0.0) == E else Call("exp", exponent)
        yield equals(limit, multiply(A, power(divide(T, T_ref), n), falling))
    if not broadened:
        return
    assert law.Fc is not None
    Fc, N = Symbol("F", "c"), Symbol("N")
    logarithm = Call("lg", Fc)
    width: Node = Number(1.0) if law.broadening == "unit width" else N
    place = power(divide(Call("lg", reduced), width), 2)
    yield equals(Call("lg", Symbol("F")), Fraction(logarithm, add(1, place)))
    if width is N:
        yield equals(N, add(0.75, negative(multiply(1.27, logarithm))))
    centre: Node = symbols[8]
    pairs = zip(symbols[9::2], symbols[10::2], strict=True)
    for term, (weight, scale) in zip(law.Fc.ordered, pairs, strict=True):
        exponent = divide(scale, T) if term.rises else divide(T, scale)
        centre = add(centre, multiply(weight, Call("exp", negative(exponent))))
    yield equals(Fc, centre)
