"""What is written about one step: its rate, its rate constants, its equilibrium, its energy."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.build import is_open
from meanfree.equations.typeset import names
from meanfree.equations.typeset.falloff import falloff_lines
from meanfree.equations.typeset.parts import calls, depends_on_state, size
from meanfree.equations.typeset.plain import Plain
from meanfree.equations.typeset.tree import (
    Call,
    Concentration,
    Fraction,
    Node,
    Number,
    Relation,
    Row,
    Symbol,
    Unit,
    Words,
    Written,
    add,
    divide,
    equals,
    multiply,
    negative,
    power,
)
from meanfree.experiment.equilibrium import ln_K
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import has_energy_balance
from meanfree.rates.falloff import Falloff
from meanfree.rates.photolysis import Photolysis

LARGEST_FORMULA = 60
"""Parts of a formula beyond which words say it better."""

T, RT = Symbol("T"), multiply(Symbol("R"), Symbol("T"))
P_STANDARD = Symbol("p", mark="°")


@dataclass(frozen=True)
class Line:
    """One formula, what kind of thing it is, and a remark in plain text."""

    formula: Node
    kind: str = "equation"
    remark: str = ""


class StepWriter:
    """Writes the lines of step ``number`` (from 1) of an experiment."""

    def __init__(self, experiment: Experiment, number: int, many_baths: bool) -> None:
        self.experiment = experiment
        self.number = number
        self.step: Step = experiment.steps[number - 1]
        self.labels = {gas.name: names.gas_label(gas) for gas in experiment.gases}
        bath = Concentration(Words("M"))
        self.M: Node = Symbol("[M]", str(number)) if many_baths else bath
        self.forward = Symbol("k", str(number))
        self.back = Symbol("k", f"−{number}")
        self.context = experiment.context(self.step)
        self.template = self.step.law.template(self.context)

    def lines(self) -> Iterator[Line]:
        """Every line, the reaction as written first."""
        step = self.step
        yield Line(self.reaction(), "reaction")
        yield from self._rates()
        if step.bath is not None and not self.is_large:
            yield Line(equals(self.M, self._bath()))
        yield from self._rate_constant()
        if step.reverse is not None:
            yield from self._reverse()
        if has_energy_balance(self.experiment.temperature):
            yield from self._energy()

    @property
    def is_large(self) -> bool:
        """True where a sum over all gases would not be read by anybody."""
        return len(self.experiment.gases) > 12

    def rate_symbols(self) -> list[tuple[int, Symbol]]:
        """+r of the step and, where it is reversible, −r of its reverse."""
        symbols = [(1, Symbol("r", str(self.number)))]
        if self.step.reverse is not None:
            symbols.append((-1, Symbol("r", f"−{self.number}")))
        return symbols

    def reaction(self) -> Node:
        """The step as written."""
        arrow = "→" if self.step.reverse is None else "⇌"
        left, right = self._side(self.step.reactants), self._side(self.step.products)
        return Row((*left, arrow, *right))

    def _side(self, amounts: Any) -> list[Node | str]:
        parts: list[Node | str] = []
        for gas, number in amounts:
            shown = self.labels[gas]
            parts += ["+"] if parts else []
            parts.append(shown if number == 1 else multiply(number, shown))
        if self.step.bath is not None:
            parts += ["+", Words("M")] if parts else [Words("M")]
        return parts

    def _rates(self) -> Iterator[Line]:
        outside = self.step.bath is not None and not self.step.law.bath_inside
        constants = (self.forward, self.step.orders), (self.back, self.step.reverse_orders)
        for (sign, rate), (constant, orders) in zip(self.rate_symbols(), constants, strict=False):
            factors = [power(Concentration(self.labels[g]), order) for g, order in orders.items()]
            factors += [self.M] if outside else []
            yield Line(
                equals(rate, multiply(constant, *factors)), "equation", self._stops(orders, sign)
            )

    def _stops(self, orders: dict[str, float], sign: int) -> str:
        """Which gases stop a rate that would not fall to zero with them."""
        low = [
            Plain().write(self.labels[gas])
            for gas, number in self.step.net.items()
            if sign * number < 0 and orders.get(gas, 0.0) < 1
        ]
        return f"stops smoothly where {' or '.join(low)} is used up" if low else ""

    def _bath(self) -> Node:
        bath = self.step.bath
        assert bath is not None
        return add(
            *(
                multiply(bath.efficiency(gas), Concentration(label))
                for gas, label in self.labels.items()
            )
        )

    # Rate constants

    def _rate_constant(self) -> Iterator[Line]:
        law, numbers = self.step.law, self.step.law.numbers(self.context)
        given, values = law.inputs(), []
        for name, value in zip(self.template.slots, numbers, strict=True):
            fixed = name in {"s", "gs"} or (address(name) in given and given[address(name)].default)
            values.append(self._half(value) if fixed else names.slot(name)[0])
        formula = self.template.coefficient(Written(), T, Symbol("p"), self.M, values)
        remark = f"law: {law.word}" + self._counting()
        if isinstance(law, Photolysis) and law.switch_times():
            remark += "; while the lamp is on, else 0"
        if size(formula) > LARGEST_FORMULA or "linear" in calls(formula):
            told = (self.template.coefficient.__doc__ or "").strip().splitlines()[0].rstrip(".")
            remark += f"; {told}"
        as_filled = depends_on_state(formula)
        if size(formula) > LARGEST_FORMULA:
            formula = Call("k", Words("T, p") if as_filled else T)
        if isinstance(law, Falloff):
            first, *rest = falloff_lines(law, self.forward, self.M, values)
            yield Line(first, "equation", f"law: {law.word}" + self._counting())
            yield from map(Line, rest)
        elif not isinstance(formula, Symbol):
            yield Line(equals(self.forward, formula), "equation", remark)
        for name, value, symbol in zip(self.template.slots, numbers, values, strict=True):
            if isinstance(symbol, Symbol):
                unit = self._unit(names.slot(name)[1])
                source = given[address(name)].source if address(name) in given else ""
                same = formula == symbol
                shown = self.forward if same else symbol
                note = "; ".join(filter(None, [remark if same else "", names.visible(source)]))
                yield Line(valued(shown, value, unit), "number", note)
        at = self.experiment.constant_temperature
        if at is not None and not isinstance(formula, Symbol):
            p, M = self.experiment.initial_pressure, self._filled_bath()
            k = float(law.rate_constant(self.context, at, p, M))
            remark = f"at {at:g} K" + (", as filled" if as_filled else "")
            yield Line(valued(self.forward, k, self._unit("k")), "number", remark)

    def _filled_bath(self) -> float:
        """M at the start [mol/m^3]; 0 where the step has none."""
        bath, experiment = self.step.bath, self.experiment
        if bath is None:
            return 0.0
        dead = experiment.dead_capacity * experiment.temperature.initial
        weighted = sum(n * bath.efficiency(gas) for gas, n in experiment.moles.items())
        return weighted / (experiment.initial_volume + dead)

    def _half(self, value: float) -> Node:
        """One half as a fraction, other numbers as they are."""
        return Fraction(Number(1.0), Number(2.0)) if value == 0.5 else Number(value)

    def _counting(self) -> str:
        counted = self.step.law.inputs().get(self.step.law.counted)
        if counted is None or counted.per == 1:
            return ", k counts events"
        case = names.visible(self.step.counts)
        return f", k counts events; the case counts {case}, {counted.per:g} an event"

    def _unit(self, word: str) -> Unit:
        if word not in {"k", "k+"}:
            return names.unit(word)
        outside = self.step.bath is not None and not self.step.law.bath_inside
        return names.rate_constant_unit(self.step.order + outside + (word == "k+"))

    # Equilibrium

    def _reverse(self) -> Iterator[Line]:
        number, change = str(self.number), self.step.change_of_moles
        Kc, K = Symbol("K", f"c,{number}"), Symbol("K", number)
        yield Line(equals(self.back, divide(self.forward, Kc)))
        ratio = Fraction(P_STANDARD, RT)
        yield Line(equals(Kc, multiply(K, power(ratio, change))))
        yield from self._constant(K)
        at = self.experiment.constant_temperature
        if at is not None:
            lnK = ln_K(self.step, self.experiment.gas_named, at)
            lnKc = lnK + change * math.log(STANDARD_PRESSURE / (R * at))
            if abs(lnK) < 600 and abs(lnKc) < 600:
                remark = f"at {at:g} K"
                yield Line(valued(K, math.exp(lnK), Unit(())), "number", remark)
                if change:
                    unit = names.ordered_unit((("mol", change), ("m", -3 * change)))
                    yield Line(valued(Kc, math.exp(lnKc), unit), "number", remark)

    def _constant(self, K: Node) -> Iterator[Line]:
        """K at 1 bar from the gases or from the given constant."""
        given, change = self.step.reverse, self.step.change_of_moles
        if not isinstance(given, GivenEquilibrium):
            dG = Symbol("ΔG", str(self.number), "°")
            yield Line(equals(K, Call("exp", negative(Fraction(dG, RT)))), "equation", "1 bar")
            yield Line(equals(dG, self._over_gases("G", "°")), "equation", "G° = H° − T S°")
            return
        own, T0 = (Symbol(letter, f"given,{self.number}") for letter in "KT")
        if given.kind == "Kp":
            own = Symbol("K", f"p,{self.number}")
            standard = multiply(own, power(P_STANDARD, -change))
            unit = names.ordered_unit((("Pa", change),))
        elif given.kind == "Kc":
            factor = Fraction(multiply(Symbol("R"), T0), P_STANDARD)
            standard = multiply(own, power(factor, change))
            unit = names.ordered_unit((("mol", change), ("m", -3 * change)))
        else:
            standard, unit = own, Unit(())
        heat = Symbol("ΔH", f"{self.number}", "°")
        if given.enthalpy is not None:
            span = add(divide(1, T), negative(divide(1, T0)))
            exponent = negative(multiply(Fraction(heat, Symbol("R")), span))
            standard = multiply(standard, Call("exp", exponent))
        yield Line(equals(K, standard), "equation", "1 bar")
        yield Line(
            valued(own, given.constant.value, unit), "number", names.visible(given.constant.source)
        )
        if given.enthalpy is not None:
            source = names.visible(given.enthalpy.source)
            yield Line(valued(heat, given.enthalpy.value, names.unit("J mol^-1")), "number", source)
        if given.enthalpy is not None or (given.kind == "Kc" and change):
            yield Line(valued(T0, given.at.value, names.unit("K")), "number")

    def _over_gases(self, letter: str, mark: str) -> Node:
        return add(
            *(
                multiply(number, Symbol(letter, self.labels[gas], mark))
                for gas, number in sorted(self.step.net.items(), key=lambda item: -item[1])
                if number
            )
        )

    # Energy

    def _energy(self) -> Iterator[Line]:
        step, number = self.step, str(self.number)
        H = Symbol("ΔH", number)
        light: Node = Number(0.0)
        if step.photon is not None:
            light = Symbol("E", f"hν,{number}")
        if is_open(step):
            yield Line(
                equals(H, negative(light)), "equation", "what flows has the enthalpy of the gas"
            )
        elif step.heat is not None:
            given = Row((Number(-step.heat.value), names.unit("J mol^-1")))
            yield Line(equals(H, add(given, negative(light))), "equation", "as stated in the case")
        else:
            yield Line(equals(H, add(self._over_gases("H", "°"), negative(light))))
        if step.photon is not None:
            remark = "energy of the light, per mole of photons"
            yield Line(valued(light, step.photon.value, names.unit("J mol^-1")), "number", remark)
        if self.experiment.vessel.is_rigid:
            work = multiply(step.change_of_moles, RT)
            yield Line(equals(Symbol("ΔU", number), add(H, negative(work))))


_WALL = {
    "gamma": "uptake",
    "D_0": "diffusion",
    "p_0": "diffusion_pressure",
    "m": "diffusion_power",
}


def address(slot: str) -> str:
    """Where the inputs of a law hold one of its numbers."""
    if slot in _WALL:
        return _WALL[slot]
    letter, _, limit = slot.partition("_")
    key = {"E": "Ea", "T": "T_ref", "F": "Fc.constant"}.get(letter, letter)
    if slot == "F_0":
        return key
    if limit in {"0", "inf"}:
        return f"{'k0' if limit == '0' else 'kinf'}.{key}"
    return {"E": "Ea", "E0": "threshold", "P": "steric"}.get(slot, slot)


def valued(symbol: Node, value: float, unit: Unit) -> Relation:
    """``symbol = number unit``"""
    if not unit.factors:
        return equals(symbol, value)
    return Relation(symbol, (Row((Number(value), unit)),))
