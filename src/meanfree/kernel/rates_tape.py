"""Rates of all steps on a tape, with their partial derivatives.

The formulas are those of `meanfree.equations.arrays`; here every operation is written down once
for all lanes. Derivatives are taken by concentrations, baths, the sum of concentrations (where a
law asks for the pressure of a rigid vessel) and T.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.powers import is_whole, smoothing
from meanfree.equations.system import System
from meanfree.kernel.duals import Dual, TapeFunctions
from meanfree.kernel.slots import Layout
from meanfree.kernel.tape import Op, Tape
from meanfree.kernel.thermal_tape import ThermalTape


@dataclass
class Rate:
    """r [mol/m^3/s] of a step and its derivatives; ``by_sum`` belongs to the sum of all c."""

    value: int
    by_c: dict[int, int] = field(default_factory=dict)
    by_bath: dict[int, int] = field(default_factory=dict)
    by_sum: int | None = None
    by_T: int | None = None


@dataclass(frozen=True)
class Surrounding:
    """Values that rates depend on: c of each gas, M of each bath, sum of c, p and T."""

    c: list[int]
    baths: list[int]
    total: int | None
    p: int | None
    T: int | None


class RateWriter:
    """Writes the rates of one System onto tapes."""

    def __init__(self, system: System, layout: Layout) -> None:
        self.system, self.layout = system, layout
        self.orders = [system.orders.row(j) + system.guards.row(j) for j in range(system.n_steps)]
        self.change = [sum(n for _, n in system.net.row(j)) for j in range(system.n_steps)]
        self.switched = any(s.switches is not None for s in system.segments)
        self._on_held_pressure = False
        self._depends = self._find_dependences()

    def _find_dependences(self) -> list[frozenset[str]]:
        """Which of T, p, M each coefficient depends on while the run lasts."""
        system = self.system
        found: list[frozenset[str]] = [frozenset()] * system.n_steps
        for block in system.blocks:
            tape = Tape()
            T, p, M = (tape.input(i) for i in range(3))
            zero, one = tape.const(0.0), tape.const(1.0)
            numbers: list[Any] = [
                Dual(tape, tape.input(3 + i)) for i in range(len(block.law.slots))
            ]
            units = [tuple(one if i == k else zero for i in range(3)) for k in range(3)]
            arguments = [Dual(tape, v, u) for v, u in zip((T, p, M), units, strict=True)]
            law: Any = block.law.coefficient
            k = law(TapeFunctions(tape), *arguments, numbers)
            names = frozenset(
                name
                for name, slope in zip("TpM", getattr(k, "slopes", ()), strict=False)
                if tape.number(slope) != 0
            )
            self._on_held_pressure |= system.volume_varies and "p" in names
            if system.volume_varies:
                names = names - {"p"}
            if system.mode == "isothermal":
                names = names - {"T"}
            for j in block.steps:
                found[int(j)] = names
        for j, forward in zip(system.reverses.step, system.reverses.forward, strict=True):
            moved = {"T"} if system.mode != "isothermal" else set()
            found[int(j)] = found[int(forward)] | moved
        return found

    @property
    def needs_pressure(self) -> bool:
        """True where a law asks for the pressure of a rigid vessel."""
        return any("p" in names for names in self._depends)

    @property
    def needs_held_pressure(self) -> bool:
        """True where a law asks for the pressure that a piston holds."""
        return self._on_held_pressure

    @property
    def needs_temperature(self) -> bool:
        """True where a coefficient is evaluated again and again at one temperature."""
        return any(self._depends)

    def is_constant(self, j: int) -> bool:
        """True where a step's coefficient is one number of a lane."""
        return not self._depends[j]

    def bath_matters(self) -> list[int]:
        """Rows of the baths that some rate depends on."""
        rows = {
            int(b)
            for j, b in enumerate(self.system.bath)
            if b >= 0 and (not self.system.bath_inside[j] or "M" in self._depends[j])
        }
        return sorted(rows)

    def write(self, tape: Tape, around: Surrounding, slopes: bool) -> list[Rate]:
        """The rates; with their derivatives where ``slopes`` is True."""
        coefficients = self._coefficients(tape, around)
        return [self._rate(tape, around, j, k, slopes) for j, k in enumerate(coefficients)]

    def _coefficients(self, tape: Tape, around: Surrounding) -> list[Dual]:
        system, layout = self.system, self.layout
        found: list[Dual | None] = [None] * system.n_steps
        for b, block in enumerate(system.blocks):
            for position, step in enumerate(block.steps):
                j = int(step)
                if self.is_constant(j):
                    continue
                numbers: list[Any] = []
                for slot in range(len(block.law.slots)):
                    # Zeros and ones stay numbers: most steps have no power of T.
                    value = float(block.numbers[slot, position])
                    name = ("number", b, slot, position)
                    literal = value in (0.0, 1.0) and name not in layout.varied
                    place = tape.const(value) if literal else tape.input(layout.parameter(*name))
                    numbers.append(Dual(tape, place))
                law: Any = block.law.coefficient
                found[j] = law(TapeFunctions(tape), *self._arguments(tape, around, j), numbers)
        for row, step in enumerate(system.reverses.step):
            j, forward = int(step), int(system.reverses.forward[row])
            if self.is_constant(j):
                continue
            base = found[forward]
            if base is None:
                base = Dual(tape, tape.input(layout.parameter("k", forward)))
            found[j] = base * self._inverse_Kc(tape, around, row)
        return [
            Dual(tape, tape.input(layout.parameter("k", j))) if k is None else k
            for j, k in enumerate(found)
        ]

    def _arguments(self, tape: Tape, around: Surrounding, j: int) -> list[Dual]:
        zero, one = tape.const(0.0), tape.const(1.0)
        bath = int(self.system.bath[j])
        values = (
            around.T if around.T is not None else one,
            around.p if around.p is not None else one,
            around.baths[bath] if bath >= 0 else one,
        )
        return [
            Dual(tape, value, [one if i == k else zero for i in range(3)])
            for k, value in enumerate(values)
        ]

    def _inverse_Kc(self, tape: Tape, around: Surrounding, row: int) -> Dual:
        """1/K_c(T) of a reversible step, with d ln K_c/dT = (dH - change R T)/R T^2."""
        system, reverses = self.system, self.system.reverses
        forward, T = int(reverses.forward[row]), around.T
        assert T is not None, "the temperature of a constant coefficient is not asked for"
        t, change = tape, self.change[forward]
        RT = t.mul(t.const(R), T)
        if reverses.given[row]:
            dH = t.input(self.layout.parameter("enthalpy", row))
            at = t.input(self.layout.parameter("at", row))
            lnK = t.input(self.layout.parameter("lnK_at", row))
            one = t.const(1.0)
            distance = t.sub(t.div(one, T), t.div(one, at))
            lnK = t.nmadd(t.div(dH, t.const(R)), distance, lnK)
        else:
            assert system.thermal is not None
            gases = ThermalTape.on(t, system.thermal, T)
            net = system.net.row(forward)
            dH = t.combine([(n, gases.enthalpy(i)) for i, n in net])
            dG = t.combine([(n, gases.gibbs_energy(i)) for i, n in net])
            lnK = t.neg(t.div(dG, RT))
        standard = t.sub(t.const(0.0), t.unary(Op.LOG, t.div(RT, t.const(STANDARD_PRESSURE))))
        lnK = t.madd(t.const(change), standard, lnK)
        slope = t.div(t.sub(dH, t.mul(t.const(change), RT)), t.mul(RT, T))
        value = t.unary(Op.EXP, t.neg(lnK))
        zero = t.const(0.0)
        return Dual(t, value, [t.neg(t.mul(value, slope)), zero, zero])

    def _rate(self, tape: Tape, around: Surrounding, j: int, k: Dual, slopes: bool) -> Rate:
        """k, times M where the step has one outside its law, times the powers of c."""
        system, t = self.system, tape
        bath = int(system.bath[j])
        outside = bath >= 0 and not system.bath_inside[j]
        factors = [self._power(t, around.c[gas], order, slopes) for gas, order in self.orders[j]]
        base = k.value
        if self.switched:
            base = t.mul(base, t.input(self.layout.parameter("switch", j)))
        with_bath = t.mul(base, around.baths[bath]) if outside else base
        value = with_bath
        for power, _ in factors:
            value = t.mul(value, power)
        rate = Rate(value)
        if not slopes:
            return rate
        for m, ((gas, _), (_, slope)) in enumerate(zip(self.orders[j], factors, strict=True)):
            term = t.mul(with_bath, slope)
            for other, (power, _) in enumerate(factors):
                if other != m:
                    term = t.mul(term, power)
            rate.by_c[gas] = t.add(rate.by_c[gas], term) if gas in rate.by_c else term
        product = t.const(1.0)
        for power, _ in factors:
            product = t.mul(product, power)
        if self.switched:
            product = t.mul(product, t.input(self.layout.parameter("switch", j)))
        by_T, by_p, by_M = k.slopes
        if outside:
            rate.by_bath[bath] = t.mul(k.value, product)
            product = t.mul(product, around.baths[bath])
        elif bath >= 0 and t.number(by_M) != 0:
            rate.by_bath[bath] = t.mul(by_M, product)
        self._pressure_and_T(t, around, rate, t.mul(by_T, product), t.mul(by_p, product))
        return rate

    def _pressure_and_T(
        self, t: Tape, around: Surrounding, rate: Rate, by_T: int, by_p: int
    ) -> None:
        """p = R T sum(c) in a rigid vessel: what depends on p depends on both."""
        if around.total is not None and t.number(by_p) != 0:
            temperature = around.T
            assert temperature is not None
            RT = t.mul(t.const(R), temperature)
            rate.by_sum = t.mul(by_p, RT)
            by_T = t.madd(by_p, t.mul(t.const(R), around.total), by_T)
        if t.number(by_T) != 0:
            rate.by_T = by_T

    def _power(self, t: Tape, c: int, order: float, slopes: bool) -> tuple[int, int]:
        """c^order, smooth at zero, and its derivative; see `meanfree.equations.powers`."""
        one = t.const(1.0)
        if is_whole(order):
            n = int(order)
            if n == 1:
                return c, one
            lower = t.whole_power(c, n - 1)
            return t.mul(c, lower), t.mul(t.const(n), lower)
        e = t.mul(t.const(smoothing(order)), t.input(self.layout.parameter("scale")))
        square = t.madd(c, c, t.mul(e, e))
        inner = t.power(square, (order - 1) / 2)
        if not slopes:
            return t.mul(c, inner), one
        slope = t.mul(t.div(inner, square), t.madd(t.const(order - 1), t.mul(c, c), square))
        return t.mul(c, inner), slope
