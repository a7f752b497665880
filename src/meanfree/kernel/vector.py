"""Phases as vector instructions: LLVM code for all lanes of a slot at once.

numba compiles and caches; what it compiles is written here with one vector per value, because
its own vectoriser gives up on long loops and never uses the widest registers.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

from llvmlite import ir
from numba import types
from numba.extending import intrinsic

from meanfree.kernel.tape import Op, Phase

DOUBLE, LONG = ir.DoubleType(), ir.IntType(64)

LN2_HIGH, LN2_LOW = 6.93147180369123816490e-01, 1.90821492927058770002e-10
"""ln 2 in two parts, the first with enough zeros at its end that a multiple is exact."""

SHIFT = 6755399441055744.0
"""1.5 x 2^52: added to a small number it leaves the nearest integer in the last bits."""

LOG_TERMS = (
    6.666666666666735130e-01, 3.999999999940941908e-01, 2.857142874366239149e-01,
    2.222219843214978396e-01, 1.818357216161805012e-01, 1.531383769920937332e-01,
    1.479819860511658591e-01,
)  # fmt: skip
"""Remez polynomial of log in s^2, s = f/(2 + f); error below 2^-58.

Source: FreeBSD msun e_log.c (Sun Microsystems, 1993)."""


RECIPROCAL = 0x7FDE623822FC16E6
"""Less the bits of a number: the bits of its reciprocal to 5 %. Found by trial."""

ROUGH_LOG2 = (
    -6.308052796e-06, 1.442517608, -0.7202141342, 0.4882256956, -0.393689683, 0.2432727782,
)  # fmt: skip
"""log2(1 + f) for sqrt(1/2) <= 1 + f <= sqrt(2) to 2e-5, interpolated at Chebyshev points."""

ROUGH_EXP2 = (0.999924557, 0.6931367339, 0.2426394785, 0.05583828295)
"""2^f for |f| <= 1/2 to 8e-5, interpolated at Chebyshev points."""


class Vectors:
    """Arithmetic on vectors of ``lanes`` doubles with an LLVM builder."""

    def __init__(self, builder: Any, lanes: int) -> None:
        self.builder, self.lanes = builder, lanes
        self.type = ir.VectorType(DOUBLE, lanes)
        self.longs = ir.VectorType(LONG, lanes)

    def number(self, value: float) -> Any:
        """The same number in all lanes."""
        return ir.Constant(self.type, [ir.Constant(DOUBLE, float(value))] * self.lanes)

    def whole(self, value: int) -> Any:
        """The same integer in all lanes."""
        return ir.Constant(self.longs, [ir.Constant(LONG, value)] * self.lanes)

    def call(self, name: str, *values: Any) -> Any:
        """An LLVM intrinsic on vectors."""
        module = self.builder.module
        full = f"llvm.{name}.v{self.lanes}f64"
        function = module.globals.get(full)
        if function is None:
            kind = ir.FunctionType(self.type, [self.type] * len(values))
            function = ir.Function(module, kind, full)
        return self.builder.call(function, values)

    def exp(self, x: Any) -> Any:
        """e^x to about one unit in the last place; the argument is held within ±708.

        2^n times the Taylor series of the rest, |rest| <= ln(2)/2: its next term is 4e-18.
        """
        b = self.builder
        x = self.smaller(self.larger(x, self.number(-708.0)), self.number(708.0))
        shifted = self.call("fmuladd", x, self.number(1 / math.log(2)), self.number(SHIFT))
        n = b.fsub(shifted, self.number(SHIFT))
        rest = self.call("fmuladd", n, self.number(-LN2_HIGH), x)
        rest = self.call("fmuladd", n, self.number(-LN2_LOW), rest)
        total = self.number(1 / math.factorial(13))
        for k in range(12, -1, -1):
            total = self.call("fmuladd", total, rest, self.number(1 / math.factorial(k)))
        bits = b.sub(b.bitcast(shifted, self.longs), b.bitcast(self.number(SHIFT), self.longs))
        power = b.shl(b.add(bits, self.whole(1023)), self.whole(52))
        return b.fmul(total, b.bitcast(power, self.type))

    def log(self, x: Any) -> Any:
        """ln x of a normal positive number, to about one unit in the last place.

        Source: FreeBSD msun e_log.c.
        """
        b = self.builder
        bits = b.bitcast(x, self.longs)
        # Moved so that the mantissa comes out between sqrt(1/2) and sqrt(2).
        offset = b.sub(bits, self.whole(0x3FE6A09E667F3BCD))
        exponent = b.ashr(offset, self.whole(52))
        mantissa = b.bitcast(b.sub(bits, b.shl(exponent, self.whole(52))), self.type)
        magic = b.bitcast(self.number(SHIFT), self.longs)
        k = b.fsub(b.bitcast(b.add(exponent, magic), self.type), self.number(SHIFT))
        f = b.fsub(mantissa, self.number(1.0))
        s = b.fdiv(f, b.fadd(f, self.number(2.0)))
        z = b.fmul(s, s)
        total = self.number(LOG_TERMS[-1])
        for term in reversed(LOG_TERMS[:-1]):
            total = self.call("fmuladd", total, z, self.number(term))
        total = b.fmul(total, z)
        half = b.fmul(self.number(0.5), b.fmul(f, f))
        inner = self.call("fmuladd", s, b.fadd(half, total), b.fmul(k, self.number(LN2_LOW)))
        return self.call("fmuladd", k, self.number(LN2_HIGH), b.fsub(f, b.fsub(half, inner)))

    def quotient(self, a: Any, b: Any) -> Any:
        """a / b to 1.5 units in the last place; no number where b is 0 or not finite.

        Newton's method from the exponent's bits, twice with a cubic term: half the time of the
        machine's division, and the same bits on every machine that fuses products and sums.
        """
        builder, one = self.builder, self.number(1.0)
        bits = builder.sub(self.whole(RECIPROCAL), builder.bitcast(b, self.longs))
        y, negative = builder.bitcast(bits, self.type), builder.fneg(b)
        for cubic in (True, True, False):
            rest = self.call("fmuladd", negative, y, one)
            if cubic:
                rest = self.call("fmuladd", rest, rest, rest)
            y = self.call("fmuladd", y, rest, y)
        return builder.fmul(a, y)

    def rough_log2(self, x: Any) -> Any:
        """log2 x of a normal positive number to 2e-5; anything finite for what is none."""
        b = self.builder
        bits = b.bitcast(x, self.longs)
        offset = b.sub(bits, self.whole(0x3FE6A09E667F3BCD))
        exponent = b.ashr(offset, self.whole(52))
        mantissa = b.bitcast(b.sub(bits, b.shl(exponent, self.whole(52))), self.type)
        magic = b.bitcast(self.number(SHIFT), self.longs)
        k = b.fsub(b.bitcast(b.add(exponent, magic), self.type), self.number(SHIFT))
        return b.fadd(k, self._polynomial(ROUGH_LOG2, b.fsub(mantissa, self.number(1.0))))

    def rough_exp2(self, x: Any) -> Any:
        """2^x to 8e-5; the argument is held within ±1000."""
        b = self.builder
        x = self.smaller(self.larger(x, self.number(-1000.0)), self.number(1000.0))
        shifted = b.fadd(x, self.number(SHIFT))
        rest = b.fsub(x, b.fsub(shifted, self.number(SHIFT)))
        total = b.bitcast(self._polynomial(ROUGH_EXP2, rest), self.longs)
        power = b.shl(b.bitcast(shifted, self.longs), self.whole(52))
        return b.bitcast(b.add(total, power), self.type)

    def _polynomial(self, coefficients: tuple[float, ...], x: Any) -> Any:
        total = self.number(coefficients[-1])
        for value in reversed(coefficients[:-1]):
            total = self.call("fmuladd", total, x, self.number(value))
        return total

    def larger(self, a: Any, b: Any) -> Any:
        """a where a > b, else b."""
        return self.builder.select(self.builder.fcmp_ordered(">", a, b), a, b)

    def smaller(self, a: Any, b: Any) -> Any:
        """a where a < b, else b."""
        return self.builder.select(self.builder.fcmp_ordered("<", a, b), a, b)

    def negative(self, a: Any) -> Any:
        """-a"""
        return self.builder.fneg(a)

    def apply(self, op: int, a: Any, b: Any, c: Any) -> Any:
        """The value of one operation."""
        builder = self.builder
        simple = {Op.MUL: builder.fmul, Op.ADD: builder.fadd, Op.SUB: builder.fsub}
        if op in simple:
            return simple[Op(op)](a, b)
        if op == Op.MADD:
            return self.call("fmuladd", a, b, c)
        if op == Op.NMADD:
            return self.call("fmuladd", builder.fneg(a), b, c)
        if op == Op.DIV:
            return self.quotient(a, b)
        if op == Op.SELECT:
            return builder.select(builder.fcmp_ordered(">", a, self.number(0.0)), b, c)
        if op in (Op.MAX, Op.MIN):
            return self.larger(a, b) if op == Op.MAX else self.smaller(a, b)
        if op in (Op.ABS, Op.SQRT):
            return self.call("fabs" if op == Op.ABS else "sqrt", a)
        if op == Op.COPY:
            return a
        functions = {
            Op.NEG: builder.fneg, Op.EXP: self.exp, Op.LOG: self.log,
            Op.ROUGH_LOG2: self.rough_log2, Op.ROUGH_EXP2: self.rough_exp2,
        }  # fmt: skip
        return functions[Op(op)](a)

    def place(self, base: Any, slot: Any) -> Any:
        """Address of a slot: ``slot`` a number, or an LLVM integer."""
        if isinstance(slot, int):
            offset = ir.Constant(LONG, slot * self.lanes)
        else:
            offset = self.builder.mul(slot, ir.Constant(LONG, self.lanes))
        return self.builder.bitcast(self.builder.gep(base, [offset]), self.type.as_pointer())

    def load(self, base: Any, slot: Any) -> Any:
        """All lanes of a slot."""
        value = self.builder.load(self.place(base, slot))
        value.align = 64
        return value

    def store(self, base: Any, slot: Any, value: Any) -> None:
        """Put a value into a slot."""
        self.builder.store(value, self.place(base, slot), align=64)


def emit(builder: Any, base: Any, phase: Phase, lanes: int) -> None:
    """Write the instructions of a phase; ``base`` is a pointer to doubles."""
    vectors = Vectors(builder, lanes)
    needed, early = phase.needed(), phase.early()
    values: dict[int, Any] = {}
    for position, (op, a, b, c) in enumerate(phase.tape.entries):
        if not needed[position]:
            continue
        if op == Op.CONST:
            values[position] = vectors.number(phase.tape.constants[a])
        elif op == Op.INPUT:
            values[position] = vectors.load(base, a)
        else:
            arguments = [values.get(x) for x in (a, b, c)]
            values[position] = vectors.apply(op, *arguments)
            if position in early:
                vectors.store(base, early[position], values[position])
    for slot, value in phase.outputs.items():
        if early.get(value) != slot:
            vectors.store(base, slot, values[value])


def compiled_phase(name: str, phase: Callable[[], Phase], lanes: int) -> Any:
    """A numba intrinsic f(address of the work array) that carries out a phase."""

    def run(typingctx: Any, base: Any) -> Any:
        def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
            emit(builder, builder.inttoptr(arguments[0], DOUBLE.as_pointer()), phase(), lanes)
            return context.get_dummy_value()

        return types.void(types.int64), codegen

    run.__name__ = run.__qualname__ = name
    return intrinsic(run)


@intrinsic  # type: ignore[untyped-decorator]
def unowned(typingctx: Any, array: Any) -> Any:
    """The same array without a count of its users, who must not outlive it.

    numba counts users with locked instructions at every call; that took a quarter of the time.
    """

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        from numba.core import cgutils

        view = context.make_array(array)(context, builder, arguments[0])
        view.meminfo = cgutils.get_null_value(view.meminfo.type)
        view.parent = cgutils.get_null_value(view.parent.type)
        return view._getvalue()

    return array(array), codegen


@intrinsic  # type: ignore[untyped-decorator]
def positive_lanes(typingctx: Any, base: Any, slot: Any, lanes: Any) -> Any:
    """One bit for each lane, from the lowest: 1 where the slot is > 0; 8, 16, … 64 lanes."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        address, place, count = arguments
        eight, before = ir.Constant(LONG, 8), builder.block
        work = builder.inttoptr(address, DOUBLE.as_pointer())
        first = builder.gep(work, [builder.mul(place, count)])
        block, done = builder.append_basic_block("part"), builder.append_basic_block("done")
        builder.branch(block)
        builder.position_at_end(block)
        at, mask = builder.phi(LONG), builder.phi(LONG)
        vectors = Vectors(builder, 8)
        source = builder.bitcast(builder.gep(first, [at]), vectors.type.as_pointer())
        value = builder.load(source)
        value.align = 64
        set_bits = builder.fcmp_ordered(">", value, vectors.number(0.0))
        bits = builder.zext(builder.bitcast(set_bits, ir.IntType(8)), LONG)
        joined = builder.or_(mask, builder.shl(bits, at))
        following = builder.add(at, eight)
        for phi, start, later in ((at, 0, following), (mask, 0, joined)):
            phi.add_incoming(ir.Constant(LONG, start), before)
            phi.add_incoming(later, block)
        builder.cbranch(builder.icmp_signed("<", following, count), block, done)
        builder.position_at_end(done)
        return joined

    return types.int64(types.int64, types.int64, types.int64), codegen


@intrinsic  # type: ignore[untyped-decorator]
def call_address(typingctx: Any, address: Any, base: Any, code: Any) -> Any:
    """Call the machine code at an address with the addresses of work array and code."""

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        kind = ir.FunctionType(ir.VoidType(), [LONG, LONG])
        function = builder.inttoptr(arguments[0], kind.as_pointer())
        builder.call(function, arguments[1:])
        return context.get_dummy_value()

    return types.void(types.int64, types.int64, types.int64), codegen
