"""The derivative of what stands on a tape, along a direction: forward differentiation.

Every operation is followed by that of its derivative where the direction reaches it. What is on
the tape already is used again, so a derivative costs about as much as its value.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from meanfree.kernel.tape import Entry, Op, Tape, operands


class Tangents:
    """Derivatives of values on a tape.

    ``wanted`` are the values whose derivatives are asked; only what they depend on, and what
    stands on the tape now, is differentiated.
    """

    def __init__(self, tape: Tape, wanted: Iterable[int]) -> None:
        self.tape = tape
        self.entries = list(tape.entries)
        self.wanted = list(wanted)
        used = [False] * len(self.entries)
        for value in self.wanted:
            used[value] = True
        for position in range(len(self.entries) - 1, -1, -1):
            if used[position]:
                for operand in operands(self.entries[position]):
                    used[operand] = True
        self.positions = [i for i, is_used in enumerate(used) if is_used]

    def along(self, seeds: Mapping[int, int]) -> dict[int, int]:
        """The derivative of every value that moves; ``seeds`` gives those of some values.

        What is not in the result does not move.
        """
        t, found = self.tape, dict[int, int]()
        for position in self.positions:
            if position in seeds:
                found[position] = seeds[position]
                continue
            entry = self.entries[position]
            if not any(x in found for x in operands(entry)):
                continue
            slope = self._slope(position, entry, found)
            if t.number(slope) != 0:
                found[position] = slope
        return found

    def _slope(self, value: int, entry: Entry, found: Mapping[int, int]) -> int:
        t, zero = self.tape, self.tape.const(0.0)
        op, a, b, c = entry
        da, db, dc = (found.get(x, zero) for x in (a, b, c))
        if op in (Op.MADD, Op.NMADD):
            product = t.madd(da, b, t.mul(a, db))
            return t.add(product, dc) if op == Op.MADD else t.sub(dc, product)
        if op == Op.MUL:
            return t.madd(da, b, t.mul(a, db))
        if op == Op.ADD:
            return t.add(da, db)
        if op == Op.SUB:
            return t.sub(da, db)
        if op == Op.DIV:
            return t.mul(t.nmadd(value, db, da), t.div(t.const(1.0), b))
        if op in (Op.MAX, Op.MIN):
            first, second = (da, db) if op == Op.MAX else (db, da)
            return t.select(t.sub(a, b), first, second)
        if op == Op.SELECT:
            return t.select(a, db, dc)
        return self._of_function(value, Op(op), a, da)

    def _of_function(self, value: int, op: Op, a: int, da: int) -> int:
        t = self.tape
        if op == Op.EXP:
            return t.mul(value, da)
        if op == Op.LOG:
            return t.mul(t.div(t.const(1.0), a), da)
        if op == Op.SQRT:
            return t.mul(t.div(t.const(0.5), value), da)
        if op == Op.NEG:
            return t.neg(da)
        if op == Op.ABS:
            return t.select(a, da, t.neg(da))
        return da
