"""A tape evaluated by plain Python, one operation after the other."""

from __future__ import annotations

import math
from collections.abc import Mapping

from meanfree.kernel.tape import Op, Tape


def values_of(tape: Tape, slots: Mapping[int, float]) -> list[float]:
    """The value of every entry, given what the slots hold."""
    v: list[float] = []
    for op, a, b, c in tape.entries:
        if op == Op.CONST:
            v.append(tape.constants[a])
        elif op == Op.INPUT:
            v.append(float(slots[a]))
        else:
            v.append(_apply(Op(op), *(v[i] if i >= 0 else 0.0 for i in (a, b, c))))
    return v


def _apply(op: Op, a: float, b: float, c: float) -> float:
    if op in (Op.DIV, Op.LOG, Op.SQRT):
        with_care = {
            Op.DIV: lambda: a / b if b else math.nan,
            Op.LOG: lambda: math.log(a) if a > 0 else math.nan,
            Op.SQRT: lambda: math.sqrt(a) if a >= 0 else math.nan,
        }
        return with_care[op]()
    return {
        Op.NMADD: lambda: c - a * b,
        Op.MADD: lambda: a * b + c,
        Op.MUL: lambda: a * b,
        Op.ADD: lambda: a + b,
        Op.SUB: lambda: a - b,
        Op.NEG: lambda: -a,
        Op.ABS: lambda: abs(a),
        Op.MAX: lambda: a if a > b else b,
        Op.MIN: lambda: a if a < b else b,
        Op.EXP: lambda: math.exp(min(max(a, -708.0), 708.0)),
        Op.SELECT: lambda: b if a > 0 else c,
        Op.COPY: lambda: a,
    }[op]()
