"""Straight-line arithmetic written down once, for a compiler or for an interpreter.

A `Tape` is a list of operations on values; every value is made once and equal operations give
one value. A `Phase` is a tape with its outputs. Numbers live in slots of one flat work array
that holds every slot once for each lane.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from enum import IntEnum


class Op(IntEnum):
    """The operations. ``MADD`` is a b + c, ``NMADD`` c - a b, ``SELECT`` b where a > 0, else c.

    The rough functions are good to 1e-4, enough for the choice of a step.
    """

    CONST = 0
    INPUT = 1
    NMADD = 2
    MADD = 3
    MUL = 4
    ADD = 5
    SUB = 6
    DIV = 7
    NEG = 8
    ABS = 9
    MAX = 10
    MIN = 11
    SQRT = 12
    EXP = 13
    LOG = 14
    SELECT = 15
    COPY = 16
    ROUGH_LOG2 = 17
    ROUGH_EXP2 = 18


Entry = tuple[int, int, int, int]


_PLAIN: dict[Op, Callable[[float], float]] = {
    Op.ABS: abs,
    Op.SQRT: math.sqrt,
    Op.EXP: math.exp,
    Op.LOG: math.log,
}


@dataclass
class Tape:
    """Operations in order; a value is its position. ``constants`` holds the numbers of CONST."""

    entries: list[Entry] = field(default_factory=list)
    constants: list[float] = field(default_factory=list)
    _known: dict[Entry, int] = field(default_factory=dict)
    _places: dict[float, int] = field(default_factory=dict)

    def _make(self, op: Op, a: int, b: int = -1, c: int = -1) -> int:
        key = (int(op), a, b, c)
        found = self._known.get(key)
        if found is None:
            found = self._known[key] = len(self.entries)
            self.entries.append(key)
        return found

    def const(self, value: float) -> int:
        """A number."""
        value = float(value) + 0.0  # one zero only
        index = self._places.get(value)
        if index is None:
            index = self._places[value] = len(self.constants)
            self.constants.append(value)
        return self._make(Op.CONST, index)

    def input(self, slot: int) -> int:
        """What a slot holds when the phase begins."""
        return self._make(Op.INPUT, slot)

    def number(self, value: int) -> float | None:
        """The number that a value is, None where it is not known beforehand."""
        op, a, _, _ = self.entries[value]
        return self.constants[a] if op == Op.CONST else None

    def add(self, a: int, b: int) -> int:
        """a + b"""
        x, y = self.number(a), self.number(b)
        if x is not None and y is not None:
            return self.const(x + y)
        if x == 0:
            return b
        if y == 0:
            return a
        return self._make(Op.ADD, min(a, b), max(a, b))

    def sub(self, a: int, b: int) -> int:
        """a - b; also of a value and itself, which is no number where the value is none."""
        x, y = self.number(a), self.number(b)
        if x is not None and y is not None:
            return self.const(x - y)
        if y == 0:
            return a
        return self.neg(b) if x == 0 else self._make(Op.SUB, a, b)

    def neg(self, a: int) -> int:
        """-a"""
        x = self.number(a)
        if x is not None:
            return self.const(-x)
        op, first, second, _ = self.entries[a]
        if op == Op.SUB:
            return self._make(Op.SUB, second, first)
        return first if op == Op.NEG else self._make(Op.NEG, a)

    def mul(self, a: int, b: int) -> int:
        """a b"""
        x, y = self.number(a), self.number(b)
        if x is not None and y is not None:
            return self.const(x * y)
        for number, other in ((x, b), (y, a)):
            if number == 0:
                return self.const(0.0)
            if number == 1:
                return other
            if number == -1:
                return self.neg(other)
        return self._make(Op.MUL, min(a, b), max(a, b))

    def madd(self, a: int, b: int, c: int) -> int:
        """a b + c"""
        x, y, z = self.number(a), self.number(b), self.number(c)
        if z == 0:
            return self.mul(a, b)
        for number, other in ((x, b), (y, a)):
            if number == 0:
                return c
            if number == 1:
                return self.add(other, c)
            if number == -1:
                return self.sub(c, other)
        if x is not None and y is not None:
            return self.add(self.const(x * y), c)
        return self._make(Op.MADD, min(a, b), max(a, b), c)

    def nmadd(self, a: int, b: int, c: int) -> int:
        """c - a b"""
        x, y, z = self.number(a), self.number(b), self.number(c)
        if z == 0:
            return self.neg(self.mul(a, b))
        for number, other in ((x, b), (y, a)):
            if number == 0:
                return c
            if number == 1:
                return self.sub(c, other)
            if number == -1:
                return self.add(c, other)
        if x is not None and y is not None:
            return self.sub(c, self.const(x * y))
        return self._make(Op.NMADD, min(a, b), max(a, b), c)

    def div(self, a: int, b: int) -> int:
        """a / b"""
        x, y = self.number(a), self.number(b)
        if x is not None and y is not None and y != 0:
            return self.const(x / y)
        if x == 0 or y == 1:
            return a
        return self._make(Op.DIV, a, b)

    def unary(self, op: Op, a: int) -> int:
        """ABS, SQRT, EXP, LOG or a rough function of a."""
        x = self.number(a)
        if x is not None and op in _PLAIN:
            return self.const(_PLAIN[op](x))
        return self._make(op, a)

    def max(self, a: int, b: int) -> int:
        """The larger of two values; b where a is no number."""
        return a if a == b else self._make(Op.MAX, a, b)

    def min(self, a: int, b: int) -> int:
        """The smaller of two values; b where a is no number."""
        return a if a == b else self._make(Op.MIN, a, b)

    def select(self, condition: int, yes: int, no: int) -> int:
        """``yes`` where ``condition`` > 0, else ``no``."""
        return yes if yes == no else self._make(Op.SELECT, condition, yes, no)

    def sum(self, values: Iterable[int]) -> int:
        """Sum of values, in pairs so that the chain of additions is short."""
        level = list(values)
        if not level:
            return self.const(0.0)
        while len(level) > 1:
            level = [
                self.add(level[i], level[i + 1]) if i + 1 < len(level) else level[i]
                for i in range(0, len(level), 2)
            ]
        return level[0]

    def combine(self, terms: Iterable[tuple[float, int]], start: int | None = None) -> int:
        """``start`` + sum of number times value."""
        total = self.const(0.0) if start is None else start
        for number, value in terms:
            total = self.madd(self.const(number), value, total)
        return total

    def whole_power(self, a: int, n: int) -> int:
        """a^n for n = 0, 1, 2, …"""
        result, square = self.const(1.0), a
        while n:
            if n & 1:
                result = self.mul(result, square)
            n >>= 1
            if n:
                square = self.mul(square, square)
        return result

    def power(self, a: int, exponent: float) -> int:
        """a^exponent for a > 0: roots where quarters suffice, else by exp and log."""
        if exponent < 0:
            return self.div(self.const(1.0), self.power(a, -exponent))
        quarters = exponent * 4
        if quarters != int(quarters) or exponent > 16:
            return self.unary(Op.EXP, self.mul(self.const(exponent), self.unary(Op.LOG, a)))
        whole, rest = divmod(int(quarters), 4)
        result = self.whole_power(a, whole)
        if rest:
            root = self.unary(Op.SQRT, a)
            if rest & 2:
                result = self.mul(result, root)
            if rest & 1:
                result = self.mul(result, self.unary(Op.SQRT, root))
        return result


@dataclass(frozen=True)
class Phase:
    """A tape that ends by putting values into slots: ``outputs`` maps a slot to a value.

    All inputs count as read before any output is written.
    """

    name: str
    tape: Tape
    outputs: dict[int, int]

    def needed(self) -> list[bool]:
        """Which entries the outputs depend on."""
        entries = self.tape.entries
        used = [False] * len(entries)
        for value in self.outputs.values():
            used[value] = True
        for position in range(len(entries) - 1, -1, -1):
            if used[position]:
                for operand in operands(entries[position]):
                    used[operand] = True
        return used

    def inputs(self) -> set[int]:
        """Slots that the phase reads."""
        used = self.needed()
        return {
            e[1]
            for e, needed in zip(self.tape.entries, used, strict=True)
            if needed and e[0] == Op.INPUT
        }

    def early(self) -> dict[int, int]:
        """Value to slot for outputs that may be written as soon as they are known."""
        read = self.inputs()
        found: dict[int, int] = {}
        for slot, value in self.outputs.items():
            if slot not in read and self.tape.entries[value][0] > Op.INPUT:
                found.setdefault(value, slot)
        return found


def operands(entry: Entry) -> tuple[int, ...]:
    """The values that an operation takes."""
    op, a, b, c = entry
    if op <= Op.INPUT:
        return ()
    return tuple(x for x in (a, b, c) if x >= 0)
