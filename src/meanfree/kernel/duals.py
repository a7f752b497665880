"""A rate law read onto a tape: its value and its derivatives by T, p and M.

A law is written over a namespace of functions; here the namespace is one of dual numbers whose
parts are values on a tape. Equal operations are written once, so derivatives come cheap.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import Any

from meanfree import constants
from meanfree.kernel.tape import Op, Tape

DIRECTIONS = 3
"""T, p and M."""


class Dual:
    """A value on a tape with its derivatives; arithmetic goes by the rules of calculus."""

    __slots__ = ("slopes", "tape", "value")

    def __init__(self, tape: Tape, value: int, slopes: Sequence[int] | None = None) -> None:
        zero = tape.const(0.0)
        self.tape, self.value = tape, value
        self.slopes = tuple(slopes) if slopes is not None else (zero,) * DIRECTIONS

    def _lift(self, other: Any) -> Dual:
        return other if isinstance(other, Dual) else Dual(self.tape, self.tape.const(other))

    def chain(self, value: int, slope: int) -> Dual:
        """A function of this value, from its value and its derivative."""
        return Dual(self.tape, value, [self.tape.mul(slope, s) for s in self.slopes])

    def __add__(self, other: Any) -> Dual:
        t, o = self.tape, self._lift(other)
        slopes = [t.add(a, b) for a, b in zip(self.slopes, o.slopes, strict=True)]
        return Dual(t, t.add(self.value, o.value), slopes)

    __radd__ = __add__

    def __neg__(self) -> Dual:
        return Dual(self.tape, self.tape.neg(self.value), [self.tape.neg(s) for s in self.slopes])

    def __sub__(self, other: Any) -> Dual:
        t, o = self.tape, self._lift(other)
        slopes = [t.sub(a, b) for a, b in zip(self.slopes, o.slopes, strict=True)]
        return Dual(t, t.sub(self.value, o.value), slopes)

    def __rsub__(self, other: Any) -> Dual:
        return self._lift(other) - self

    def __mul__(self, other: Any) -> Dual:
        t, o = self.tape, self._lift(other)
        slopes = [
            t.madd(a, o.value, t.mul(self.value, b))
            for a, b in zip(self.slopes, o.slopes, strict=True)
        ]
        return Dual(t, t.mul(self.value, o.value), slopes)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> Dual:
        t, o = self.tape, self._lift(other)
        quotient = t.div(self.value, o.value)
        slopes = [
            t.div(t.nmadd(quotient, b, a), o.value)
            for a, b in zip(self.slopes, o.slopes, strict=True)
        ]
        return Dual(t, quotient, slopes)

    def __rtruediv__(self, other: Any) -> Dual:
        return self._lift(other) / self

    def __pow__(self, exponent: Any) -> Dual:
        t, o = self.tape, self._lift(exponent)
        number = t.number(o.value)
        if number is None:
            logarithm = self.chain(t.unary(Op.LOG, self.value), t.div(t.const(1.0), self.value))
            return exponential(o * logarithm)
        if number == 0:
            return Dual(t, t.const(1.0))
        lower = t.power(self.value, number - 1) if number != 1 else t.const(1.0)
        value = self.value if number == 1 else t.power(self.value, number)
        return self.chain(value, t.mul(o.value, lower))

    def __rpow__(self, base: Any) -> Dual:
        return self._lift(base) ** self


def exponential(x: Dual) -> Dual:
    """e^x"""
    value = x.tape.unary(Op.EXP, x.value)
    return x.chain(value, value)


class TapeFunctions:
    """The `Functions` of a law, on a tape. See `meanfree.rates.law`."""

    def __init__(self, tape: Tape) -> None:
        self.tape = tape
        self.R: Any = constants.R
        self.k_B: Any = constants.k_B
        self.N_A: Any = constants.N_A
        self.pi: Any = 3.141592653589793

    def _lift(self, x: Any) -> Dual:
        return x if isinstance(x, Dual) else Dual(self.tape, self.tape.const(float(x)))

    def exp(self, x: Any, /) -> Dual:
        """e^x"""
        return exponential(self._lift(x))

    def log(self, x: Any, /) -> Dual:
        """Natural logarithm."""
        y, t = self._lift(x), self.tape
        return y.chain(t.unary(Op.LOG, y.value), t.div(t.const(1.0), y.value))

    def log10(self, x: Any, /) -> Dual:
        """Decimal logarithm."""
        return self.log(x) * 0.4342944819032518

    def sqrt(self, x: Any, /) -> Dual:
        """Square root."""
        y, t = self._lift(x), self.tape
        root = t.unary(Op.SQRT, y.value)
        return y.chain(root, t.div(t.const(0.5), root))

    def below(self, x: Any, limit: Any, then: Any, otherwise: Any, /) -> Dual:
        """``then`` where x < limit, else ``otherwise``."""
        t = self.tape
        distance = (self._lift(limit) - x).value
        first, second = self._lift(then), self._lift(otherwise)
        slopes = [
            t.select(distance, a, b) for a, b in zip(first.slopes, second.slopes, strict=True)
        ]
        return Dual(t, t.select(distance, first.value, second.value), slopes)

    def piecewise_linear(self, x: Any, xs: Sequence[Any], ys: Sequence[Any], /) -> Dual:
        """Linear between the points, the outer pieces continued beyond them."""
        value: Dual | None = None
        for (x0, x1), (y0, y1) in zip(pairwise(xs), pairwise(ys), strict=True):
            piece = y0 + (y1 - y0) / (x1 - x0) * (x - x0)
            value = piece if value is None else self.below(x, x0, value, piece)
        if value is None:
            raise ValueError("a piecewise line needs two points")
        return value
