"""A tape carried out with numpy: one array a value, one entry a condition.

For the few evaluations that no run needs: rate constants that last and their derivatives, and
what a state does at one moment.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import Any

import numpy as np

from meanfree.kernel.records import Floats
from meanfree.kernel.tape import Op, Tape, operands

FUNCTIONS: dict[int, Callable[..., Any]] = {
    Op.NMADD: lambda a, b, c: c - a * b,
    Op.MADD: lambda a, b, c: a * b + c,
    Op.MUL: lambda a, b: a * b,
    Op.ADD: lambda a, b: a + b,
    Op.SUB: lambda a, b: a - b,
    Op.DIV: lambda a, b: a / b,
    Op.NEG: lambda a: -a,
    Op.ABS: np.abs,
    Op.MAX: lambda a, b: np.where(a > b, a, b),
    Op.MIN: lambda a, b: np.where(a < b, a, b),
    Op.SQRT: np.sqrt,
    Op.EXP: lambda a: np.exp(np.clip(a, -708.0, 708.0)),
    Op.LOG: np.log,
    Op.SELECT: lambda a, b, c: np.where(a > 0, b, c),
    Op.COPY: lambda a: a,
}


def on_columns(tape: Tape, wanted: Sequence[int], slots: Mapping[int, Floats]) -> list[Floats]:
    """The wanted values; ``slots`` holds what inputs read [shape (count,) or (1,)]."""
    found: dict[int, Any] = {}
    with np.errstate(all="ignore"):
        for position in _needed(tape, wanted):
            entry = tape.entries[position]
            if entry[0] == Op.CONST:
                found[position] = np.array([tape.constants[entry[1]]])
            elif entry[0] == Op.INPUT:
                found[position] = np.asarray(slots[entry[1]], float)
            else:
                taken = (found[x] for x in operands(entry))
                found[position] = np.asarray(FUNCTIONS[entry[0]](*taken), float)
    return [found[value] for value in wanted]


def _needed(tape: Tape, wanted: Iterable[int]) -> list[int]:
    used = [False] * len(tape.entries)
    for value in wanted:
        used[value] = True
    for position in range(len(used) - 1, -1, -1):
        if used[position]:
            for operand in operands(tape.entries[position]):
                used[operand] = True
    return [i for i, is_used in enumerate(used) if is_used]
