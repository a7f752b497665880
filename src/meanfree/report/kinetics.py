"""Every rate constant of a run as a row: its value, its ceiling, and what that says.

Reverse steps that follow from equilibrium stand beside their forward step. Tables, the page
and the summary show these rows; none works out its own.
"""

from __future__ import annotations

from dataclasses import dataclass

from meanfree import units
from meanfree.constants import R
from meanfree.equations.build import REVERSE_SUFFIX
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step, side
from meanfree.experiment.rate_constants import (
    activation_energy_at,
    encounter,
    order_of,
    own_diameter,
    rate_constant,
)
from meanfree.gases.gas import Gas
from meanfree.integrate.run import Run
from meanfree.rates.ceiling import Ceiling, Judgement, ceiling, judge
from meanfree.report import wording


@dataclass(frozen=True)
class RateConstant:
    """One rate constant at one temperature.

    ``reaction`` is as written, ``printed`` with subscripts. ``k`` is per event in ``unit`` (SI);
    ``counts`` and ``per`` say how the case counts it (k as counted = ``per`` k); ``shown_unit`` is
    the unit of the case, ``pressure_unit`` that in which its gauge is read. ``judgement`` is None
    where the step is no encounter of two gases whose masses and diameters are known.
    """

    step: str
    reaction: str
    printed: str
    law: str
    counts: str
    per: float
    temperature: float
    k: float
    order: float
    unit: str
    shown_unit: str
    Ea: float | None
    ceiling: Ceiling | None
    judgement: Judgement | None
    source: str
    is_reverse: bool
    pressure_unit: str = "kPa"

    @property
    def verdict(self) -> str:
        """What the ceiling says about it; why it says nothing where it does not."""
        if self.judgement is not None:
            return self.judgement.verdict
        if self.order != 2:
            return "no encounter of two molecules"
        if " + M" in self.reaction:
            return "no ceiling: the partner M is a mixture"
        return "no ceiling: a mass or a diameter is not known"

    @property
    def in_case(self) -> float:
        """k in the unit and the counting of the case."""
        dimension = units.rate_constant(self.order)
        return units.from_si(self.k * self.per, self.shown_unit, dimension)

    @property
    def shown(self) -> str:
        """k per event in the unit of the case."""
        return wording.quantity(self.k, self.shown_unit, units.rate_constant(self.order), 4)

    @property
    def by_pressure(self) -> float | None:
        """k per event for partial pressures, k/(RT)^(order-1) [Pa^(1-order)/s]; first order: None.

        Rate in pressure per time: -dp/dt of a gas is its net number times this times the product
        of the partial pressures, at this temperature.
        """
        return None if self.order == 1 else self.k / (R * self.temperature) ** (self.order - 1)

    @property
    def by_pressure_unit(self) -> str:
        """The SI unit of `by_pressure`, empty for a first order."""
        return "" if self.order == 1 else pressure_rate_unit("Pa", self.order)

    @property
    def shown_by_pressure(self) -> str:
        """`by_pressure` in the unit of the gauge: ``3.2 × 10⁻⁸ torr⁻¹ s⁻¹``; first order: empty."""
        if self.by_pressure is None:
            return ""
        gauge = units.to_si(1.0, self.pressure_unit, "pressure")
        value = self.by_pressure * gauge ** (self.order - 1)
        return f"{wording.number(value, 4)} {wording.powers(self.pressure_unit, 1 - self.order)}"

    @property
    def shown_as_counted(self) -> str:
        """k as the case counts it, empty where that is per event."""
        if self.counts == "events":
            return ""
        k = f"{wording.number(self.in_case, 4)} {wording.pretty_unit(self.shown_unit)}"
        return f"{k} ({wording.clean(self.counts)})"


def rate_constants(run: Run) -> tuple[RateConstant, ...]:
    """The rate constants at the start, and where the temperature moves at its extremes too."""
    rows: list[RateConstant] = []
    for step in run.experiment.steps:
        for T in temperatures(run):
            rows.append(_forward(run.experiment, step, T))
            if step.reverse is not None:
                rows.append(_reverse(run.experiment, step, T))
    return tuple(rows)


def temperatures(run: Run) -> tuple[float, ...]:
    """The temperatures at which rate constants are shown [K]: start, lowest, highest."""
    T = run.temperature(run.trajectory.times)
    found = [float(T[0])]
    for extreme in (float(T.min()), float(T.max())):
        if all(abs(extreme - known) > 0.05 for known in found):
            found.append(extreme)
    return tuple(found)


def _forward(experiment: Experiment, step: Step, T: float) -> RateConstant:
    k_of = rate_constant(experiment, step)
    counted = step.law.inputs().get(step.law.counted)
    order = order_of(step)
    return _row(
        step.name,
        step.reaction.replace("⇌", "→"),
        experiment,
        step.law.word,
        step.counts,
        getattr(counted, "per", 1.0),
        getattr(counted, "unit", ""),
        T,
        k_of(T),
        order,
        activation_energy_at(step, k_of, T),
        encounter(experiment, step),
        own_diameter(experiment, step),
        source_of(step),
        False,
    )


def _reverse(experiment: Experiment, step: Step, T: float) -> RateConstant:
    k_of = rate_constant(experiment, step, back=True)
    order = order_of(step, back=True)
    basis = "thermochemistry" if step.reverse == "thermochemistry" else "the given constant"
    bath = " + M" if step.bath is not None else ""
    text = f"{side(step.products)}{bath} → {side(step.reactants)}{bath}"
    return _row(
        step.name + REVERSE_SUFFIX,
        text,
        experiment,
        "equilibrium",
        "events",
        1.0,
        "",
        T,
        k_of(T),
        order,
        activation_energy_at(step, k_of, T),
        encounter(experiment, step, back=True),
        None,
        f"Kc from {basis}",
        True,
    )


def _row(
    name: str,
    reaction: str,
    experiment: Experiment,
    law: str,
    counts: str,
    per: float,
    unit: str,
    T: float,
    k: float,
    order: float,
    Ea: float | None,
    partners: tuple[Gas, ...],
    own_diameter: float | None,
    source: str,
    is_reverse: bool,
) -> RateConstant:
    limit = ceiling(partners, T, own_diameter) if order == 2 else None
    si = units.si_unit(units.rate_constant(order))
    return RateConstant(
        step=name,
        reaction=wording.clean(reaction),
        printed=wording.reaction(reaction, experiment),
        law=law,
        counts=counts,
        per=per,
        temperature=T,
        k=k,
        order=order,
        unit=si,
        shown_unit=unit or {2.0: "L/mol/s", 3.0: "L^2/mol^2/s"}.get(order, si),
        Ea=Ea,
        ceiling=limit,
        judgement=None if limit is None else judge(k, Ea, limit),
        source=source,
        is_reverse=is_reverse,
        pressure_unit=wording.units_in_use(experiment).pressure,
    )


def pressure_rate_unit(pressure: str, order: float) -> str:
    """The unit of k for partial pressures: ``1/Pa/s`` of a second order, ``Pa/s`` of none."""
    power = order - 1
    raised = pressure if abs(power) == 1 else f"{pressure}^{abs(power):g}"
    return f"1/{raised}/s" if power > 0 else f"{raised}/s"


def source_of(step: Step) -> str:
    """Where the numbers of a step come from, each source once."""
    sources = [step.source, *(q.source for q in step.law.inputs().values() if not q.default)]
    return "; ".join(dict.fromkeys(wording.clean(s) for s in sources if s)) or "the case file"
