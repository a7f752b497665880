"""Phases as lists of integers, and the machine code that carries such lists out.

The interpreter is compiled once on a machine and then serves any mechanism: small jobs need not
wait for a compiler, and large mechanisms would keep one busy for minutes.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from llvmlite import ir
from numba import cfunc, types
from numba.extending import intrinsic
from numpy.typing import NDArray

from meanfree.kernel.cache import machine_code_in_user_cache
from meanfree.kernel.tape import Op, Phase, operands
from meanfree.kernel.vector import DOUBLE, LONG, Vectors

END = -1
Row = tuple[int, int, int, int, int]
OPERATIONS = [op for op in Op if op > Op.INPUT]


class Lowering:
    """Turns phases into code, with slots for constants and for values in between.

    Slots from ``first`` on are used; constants are shared by all phases and must be put into their
    slots (``constants``) before anything runs.
    """

    def __init__(self, first: int) -> None:
        self.next = first
        self.constants: dict[float, int] = {}
        self._scratch: list[int] = []
        self._owned: set[int] = set()

    def _new(self) -> int:
        self.next += 1
        return self.next - 1

    def code(self, phase: Phase) -> NDArray[np.int64]:
        """Runs of equal operations: operation, count, then result and operands of each."""
        needed, early = phase.needed(), phase.early()
        last = _last_uses(phase, needed)
        free = list(self._scratch)
        place: dict[int, int] = {}
        rows: list[Row] = []
        for position, entry in enumerate(phase.tape.entries):
            if not needed[position]:
                continue
            if entry[0] == Op.CONST:
                place[position] = self._constant(phase.tape.constants[entry[1]])
            elif entry[0] == Op.INPUT:
                place[position] = entry[1]
            else:
                taken = [place[x] for x in operands(entry)]
                free.extend(
                    place[x]
                    for x in set(operands(entry))
                    if last[x] == position and place[x] in self._owned
                )
                place[position] = early.get(position, -1)
                if place[position] < 0:
                    place[position] = free.pop() if free else self._scratch_slot()
                rows.append((entry[0], place[position], *_padded(taken)))
        rows += self._copies(phase, early, place, free)
        return _runs(rows)

    def _copies(
        self, phase: Phase, early: dict[int, int], place: dict[int, int], free: list[int]
    ) -> list[Row]:
        """Outputs that wait for the end; what one copy would overwrite another reads first."""
        waiting = [(s, place[v]) for s, v in phase.outputs.items() if early.get(v) != s]
        written = {slot for slot, _ in waiting}
        rows: list[Row] = []
        for position, (slot, source) in enumerate(waiting):
            if source in written:
                aside = free.pop() if free else self._scratch_slot()
                rows.append((int(Op.COPY), aside, source, 0, 0))
                waiting[position] = (slot, aside)
        return rows + [(int(Op.COPY), slot, source, 0, 0) for slot, source in waiting]

    def _scratch_slot(self) -> int:
        slot = self._new()
        self._scratch.append(slot)
        self._owned.add(slot)
        return slot

    def _constant(self, value: float) -> int:
        if value not in self.constants:
            self.constants[value] = self._new()
        return self.constants[value]


def _padded(slots: Sequence[int]) -> tuple[int, int, int]:
    a, b, c = (*slots, 0, 0, 0)[:3]
    return a, b, c


def _last_uses(phase: Phase, needed: list[bool]) -> list[int]:
    """Where each value is used last; outputs are used at the very end."""
    entries = phase.tape.entries
    last = [0] * len(entries)
    for position, entry in enumerate(entries):
        if needed[position]:
            for x in operands(entry):
                last[x] = position
    for value in phase.outputs.values():
        last[value] = len(entries)
    return last


def _runs(rows: list[Row]) -> NDArray[np.int64]:
    code: list[int] = []
    start = 0
    while start < len(rows):
        end = start
        while end < len(rows) and rows[end][0] == rows[start][0]:
            end += 1
        code += [rows[start][0], end - start]
        for row in rows[start:end]:
            code += row[1:]
        start = end
    return np.array([*code, END, 0], np.int64)


def _interpret(lanes: int) -> Any:
    """An intrinsic f(address of the work array, address of the code) for so many lanes."""

    def run(typingctx: Any, base: Any, code: Any) -> Any:
        def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            _loop(builder, arguments[0], arguments[1], lanes)
            return context.get_dummy_value()

        return types.void(types.int64, types.int64), codegen

    return intrinsic(run)


def _loop(builder: Any, base: Any, code: Any, lanes: int) -> None:
    """Fetch a run, branch to its operation, carry it out count times, fetch the next."""
    work = builder.inttoptr(base, DOUBLE.as_pointer())
    start = builder.inttoptr(code, LONG.as_pointer())
    before = builder.block
    fetch = builder.append_basic_block("fetch")
    done = builder.append_basic_block("done")
    builder.branch(fetch)
    builder.position_at_end(fetch)
    at = builder.phi(LONG.as_pointer())
    at.add_incoming(start, before)
    op = builder.load(at)
    count = builder.load(builder.gep(at, [ir.Constant(LONG, 1)]))
    first = builder.gep(at, [ir.Constant(LONG, 2)])
    switch = builder.switch(op, done)
    for operation in OPERATIONS:
        block = builder.append_basic_block(operation.name)
        switch.add_case(ir.Constant(LONG, int(operation)), block)
        builder.position_at_end(block)
        row, remaining = builder.phi(LONG.as_pointer()), builder.phi(LONG)
        vectors = Vectors(builder, lanes)
        slots = [builder.load(builder.gep(row, [ir.Constant(LONG, i)])) for i in range(4)]
        taken = [vectors.load(work, slot) for slot in slots[1 : 1 + _arity(operation)]]
        a, b, c = (*taken, None, None, None)[:3]
        vectors.store(work, slots[0], vectors.apply(operation, a, b, c))
        following = builder.gep(row, [ir.Constant(LONG, 4)])
        left = builder.sub(remaining, ir.Constant(LONG, 1))
        more = builder.icmp_signed(">", left, ir.Constant(LONG, 0))
        builder.cbranch(more, block, fetch)
        row.add_incoming(first, fetch)
        row.add_incoming(following, block)
        remaining.add_incoming(count, fetch)
        remaining.add_incoming(left, block)
        at.add_incoming(following, block)
    builder.position_at_end(done)


def _arity(op: Op) -> int:
    if op in (Op.MADD, Op.NMADD, Op.SELECT):
        return 3
    alone = (Op.NEG, Op.ABS, Op.SQRT, Op.EXP, Op.LOG, Op.COPY, Op.ROUGH_LOG2, Op.ROUGH_EXP2)
    return 1 if op in alone else 2


_interpret_8 = _interpret(8)
_interpret_16 = _interpret(16)
_interpret_32 = _interpret(32)
SIGNATURE = types.void(types.int64, types.int64)


def _run_8(base: int, code: int) -> None:
    _interpret_8(base, code)


def _run_32(base: int, code: int) -> None:
    _interpret_32(base, code)


def _run_16(base: int, code: int) -> None:
    _interpret_16(base, code)


with machine_code_in_user_cache():
    _FUNCTIONS = {
        lanes: cfunc(SIGNATURE, cache=True)(function)
        for lanes, function in ((8, _run_8), (16, _run_16), (32, _run_32))
    }

ADDRESSES: dict[int, int] = {lanes: int(f.address) for lanes, f in _FUNCTIONS.items()}
"""Address of the interpreter's machine code by number of lanes."""
