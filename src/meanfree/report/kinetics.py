"""Every rate constant of a run as a row: its value, its ceiling, and what that says.

Reverse steps that follow from equilibrium stand beside their forward step. Tables, the page
and the summary show these rows; none works out its own.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from meanfree import units
from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.build import REVERSE_SUFFIX
from meanfree.experiment.equilibrium import ln_K
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step, side
from meanfree.gases.gas import Gas
from meanfree.integrate.run import Run
from meanfree.rates.ceiling import Ceiling, Judgement, activation_energy, ceiling, judge
from meanfree.rates.collision import Collision
from meanfree.rates.fixed import Fixed
from meanfree.report import wording


@dataclass(frozen=True)
class RateConstant:
    """One rate constant at one temperature.

    ``reaction`` is as written, ``printed`` with subscripts. ``k`` is per event in ``unit`` (SI);
    ``counts`` and ``per`` say how the case counts it (k as counted = ``per`` k); ``shown_unit`` is
    the unit of the case. ``judgement`` is None where the step is no encounter of two gases whose
    masses and diameters are known.
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


def coefficient(experiment: Experiment, step: Step, back: bool = False) -> Callable[[float], float]:
    """k of a step (or of its reverse) as a function of T [K], at the pressure and bath filled."""
    context = experiment.context(step)
    M = _bath(experiment, step)

    def forward(T: float) -> float:
        return float(step.law.rate_constant(context, T, experiment.initial_pressure, M))

    def reverse(T: float) -> float:
        lnKc = ln_K(step, experiment.gas_named, T)
        lnKc += step.change_of_moles * math.log(STANDARD_PRESSURE / (R * T))
        return forward(T) * math.exp(-lnKc)

    return reverse if back else forward


def _bath(experiment: Experiment, step: Step) -> float:
    """M [mol/m^3] at the start, 0 where the step has none."""
    if step.bath is None:
        return 0.0
    spread = experiment.initial_volume + experiment.dead_capacity * experiment.temperature.initial
    return sum(n * step.bath.efficiency(gas) for gas, n in experiment.moles.items()) / spread


def _energy(step: Step, k_of: Callable[[float], float], T: float) -> float | None:
    """Ea at T [J/mol]; a fixed k does not say how it changes with temperature."""
    if isinstance(step.law, Fixed) or k_of(T) <= 0:
        return None
    return activation_energy(k_of, T)


def _forward(experiment: Experiment, step: Step, T: float) -> RateConstant:
    k_of = coefficient(experiment, step)
    counted = step.law.inputs().get(step.law.counted)
    order = _full_order(step, step.order)
    partners = tuple(experiment.gas_named[name] for name in step.partners)
    own = (
        step.law.pair_diameter(experiment.context(step))
        if isinstance(step.law, Collision)
        else None
    )
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
        _energy(step, k_of, T),
        partners,
        own,
        source_of(step),
        False,
    )


def _reverse(experiment: Experiment, step: Step, T: float) -> RateConstant:
    k_of = coefficient(experiment, step, back=True)
    orders = step.reverse_orders
    order = _full_order(step, sum(orders.values()))
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
        _energy(step, k_of, T),
        _encounter(experiment, orders) if step.bath is None else (),
        None,
        f"Kc from {basis}",
        True,
    )


def _encounter(experiment: Experiment, orders: dict[str, float]) -> tuple[Gas, ...]:
    """The two gases that meet, where orders say that two meet."""
    if sum(orders.values()) != 2 or any(order not in (1.0, 2.0) for order in orders.values()):
        return ()
    return tuple(
        experiment.gas_named[gas] for gas, order in orders.items() for _ in range(int(order))
    )


def _full_order(step: Step, order: float) -> float:
    return order + 1.0 if step.bath is not None and not step.law.bath_inside else order


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
    )


def source_of(step: Step) -> str:
    """Where the numbers of a step come from, each source once."""
    sources = [step.source, *(q.source for q in step.law.inputs().values() if not q.default)]
    return "; ".join(dict.fromkeys(wording.clean(s) for s in sources if s)) or "the case file"
