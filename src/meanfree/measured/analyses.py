"""Everything that a case asks of its readings, one after the other: fit, order, lines, plots."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from meanfree.collisions import encounters
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.measured.arrhenius_lines import (
    DIAMETER_FACTOR,
    TemperatureSeries,
    temperature_series,
)
from meanfree.measured.each_run import points_of, step_named
from meanfree.measured.fits import Fit, FitRequest
from meanfree.measured.fitting import fit
from meanfree.measured.initial_rates import InitialRates, initial_rates
from meanfree.measured.integrated_lines import IntegratedLine, integrated_line
from meanfree.measured.orders import USUAL, OrderTest, applicable, order_test
from meanfree.measured.pseudo_first_order import PseudoFirstOrder, pseudo_first_order
from meanfree.measured.relative_rates import RelativeRate, relative_rate
from meanfree.measured.walls import WallTest, wall_test
from meanfree.rates.collision import Collision

KINDS: Final[tuple[str, ...]] = (
    "initial rates",
    "pseudo-first-order",
    "relative rate",
    "temperature series",
    "wall",
)


@dataclass(frozen=True)
class Wanted:
    """A further analysis: its kind (one of `KINDS`) and what it needs.

    ``reference_k`` in ``reference_unit``; ``until`` [s].
    """

    kind: str
    gas: str = ""
    partner: str = ""
    reference: str = ""
    reference_k: float | None = None
    reference_unit: str = ""
    reference_factor: float = 1.0
    step: str = ""
    until: float | None = None
    base_line: bool = False
    diameter_factor: float = DIAMETER_FACTOR


@dataclass(frozen=True)
class OrderWanted:
    """A test of a step's order in a gas (empty: its only reactant)."""

    step: str
    gas: str = ""
    orders: tuple[float, ...] = USUAL


@dataclass(frozen=True)
class Plan:
    """What a case asks of its readings."""

    request: FitRequest
    lines: bool = False
    order: OrderWanted | None = None
    wanted: tuple[Wanted, ...] = ()


@dataclass(frozen=True)
class Findings:
    """What was found. ``series`` has one entry a step; each tuple is empty where not asked for."""

    plan: Plan
    fit: Fit | None
    lines: tuple[IntegratedLine, ...] = ()
    order: OrderTest | None = None
    series: tuple[TemperatureSeries, ...] = ()
    walls: tuple[WallTest, ...] = ()
    pseudo: tuple[PseudoFirstOrder, ...] = ()
    relative: tuple[tuple[Wanted, RelativeRate], ...] = ()
    initial: tuple[InitialRates, ...] = ()
    notes: tuple[str, ...] = ()


def analyse(plan: Plan) -> Findings:
    """Carry out a plan.

    Raises
    ------
    InputError
        Nothing is asked for, or an analysis is asked for that the runs do not allow.
    ComputationError
        A fit failed.
    """
    request = plan.request
    wanted = (*plan.wanted, *_of_temperature(plan))
    if not request.asked and not wanted:
        raise InputError.at(
            "fit.parameters", "nothing", 'what to find, such as ["steps.decomposition.k"]'
        )
    found = fit(request) if request.asked else None
    lines = tuple(integrated_line(run) for run in request.runs) if plan.lines else ()
    order, notes = _order(plan)
    by_kind = {kind: [one for one in wanted if one.kind == kind] for kind in KINDS}
    return Findings(
        plan,
        found,
        lines,
        order,
        tuple(_series(request, one) for one in by_kind["temperature series"]),
        tuple(_walls(request, one) for one in by_kind["wall"]),
        tuple(
            pseudo_first_order(request.runs, one.gas, one.partner, base_line=one.base_line)
            for one in by_kind["pseudo-first-order"]
        ),
        tuple(
            (
                one,
                relative_rate(
                    request.runs, one.gas, one.reference, one.reference_k, one.reference_factor
                ),
            )
            for one in by_kind["relative rate"]
        ),
        tuple(initial_rates(request.runs, one.gas, one.until) for one in by_kind["initial rates"]),
        notes,
    )


def _order(plan: Plan) -> tuple[OrderTest | None, tuple[str, ...]]:
    """The order asked for; that of a single step with one reactant also without being asked."""
    if plan.order is not None:
        experiment = plan.request.runs[0].experiment
        step = step_named(experiment, plan.order.step, "fit.order.step")
        gas = plan.order.gas
        if not gas:
            losing = [name for name, n in step.net.items() if n < 0]
            if len(losing) != 1:
                found = f"no gas, of {', '.join(losing) or 'none'}"
                raise InputError.at("fit.order.gas", found, "the gas whose order is in question")
            gas = losing[0]
        return order_test(plan.request, step.name, gas, plan.order.orders), ()
    alone = applicable(plan.request)
    if alone is None or sum(len(run.readings) for run in plan.request.runs) < 5:
        return None, ()
    try:
        return order_test(plan.request, *alone), ()
    except ComputationError as error:
        return None, (str(error),)


def _of_temperature(plan: Plan) -> tuple[Wanted, ...]:
    """A series for every step whose A and Ea are fitted to runs at three temperatures or more."""
    asked = {one.address for one in plan.request.asked}
    done = {one.step for one in plan.wanted if one.kind == "temperature series"}
    found = []
    for step in plan.request.runs[0].experiment.steps:
        both = {f"steps.{step.name}.A", f"steps.{step.name}.Ea"} <= asked
        if step.name in done or not both:
            continue
        if len(_temperatures(plan.request, step.name)) >= 3:
            found.append(Wanted("temperature series", step=step.name))
    return tuple(found)


def _temperatures(request: FitRequest, step: str) -> set[float]:
    found: set[float] = set()
    for run in request.runs:
        readings, T = run.readings, run.experiment.constant_temperature
        if readings.signal.is_rate_constant:
            if readings.signal.step == step:
                found |= {round(float(value), 6) for value in readings.times}
        elif T is None:
            return set()
        else:
            found.add(round(T, 6))
    return found


def _series(request: FitRequest, wanted: Wanted) -> TemperatureSeries:
    experiment = request.runs[0].experiment
    step = step_named(experiment, wanted.step, "fit.analyses")
    partners = tuple(experiment.gas_named[name] for name in step.partners)
    own = pair_diameter(experiment, wanted.step)
    if step.bath is not None or step.order != 2:
        partners = ()
    points = points_of(request, wanted.step)
    return temperature_series(wanted.step, points, partners, own, wanted.diameter_factor)


def pair_diameter(experiment: Experiment, name: str) -> float | None:
    """Diameter of the pair [m] of a step that has its own, or whose gases have one; else None."""
    step = step_named(experiment, name, "fit.analyses")
    if isinstance(step.law, Collision):
        return step.law.pair_diameter(experiment.context(step))
    known = [experiment.gas_named[gas].diameter for gas in step.partners]
    if len(known) != 2 or known[0] is None or known[1] is None:
        return None
    return float(np.asarray(encounters.pair_diameter(known[0].value, known[1].value)))


def _walls(request: FitRequest, wanted: Wanted) -> WallTest:
    experiment = request.runs[0].experiment
    step = step_named(experiment, wanted.step, "fit.analyses")
    if step.order != 1:
        found = f"{wanted.step}, of order {step.order:g}"
        raise InputError.at("fit.analyses", found, "a step of first order")
    runs = tuple(run for run in request.runs if not run.readings.signal.is_rate_constant)
    return wall_test(wanted.step, runs, points_of(replace(request, runs=runs), wanted.step))
