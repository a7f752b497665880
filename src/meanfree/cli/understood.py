"""What `check` says: the case as it was understood, as one record."""

from __future__ import annotations

from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from meanfree import units
from meanfree.case.loaded import LoadedCase
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import Exchange, Program
from meanfree.gases.gas import Gas
from meanfree.report import wording
from meanfree.report.flow_words import flow_words, sample_words
from meanfree.report.law_words import choices, conditions
from meanfree.sourced import Sourced

MOST_POINTS = 20
"""Points of a temperature program that are shown."""


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", ser_json_inf_nan="constants")


class GasUnderstood(_Record):
    """Who a gas is, and what is known of it."""

    name: str
    formula: str | None
    cas: str | None
    diameter_m: float | None
    diameter_source: str | None
    thermochemistry_from_K: float | None
    thermochemistry_to_K: float | None


class FilledUnderstood(_Record):
    """One filled gas: as given, and what follows from it."""

    gas: str
    given: str
    moles_mol: float
    pressure_at_filling_Pa: float
    pressure_at_start_Pa: float


class StepUnderstood(_Record):
    """One step: what it is, and what its rate constant counts."""

    name: str
    reaction: str
    law: str
    choices: list[str]
    numbers: list[str]
    counts: str
    order: float
    orders: dict[str, float]
    bath: bool
    reverse: str | None
    conditions: list[str]
    source: str


class Understood(_Record):
    """A case as it was understood."""

    schema_: Literal["meanfree-check-1"] = Field(
        default="meanfree-check-1", serialization_alias="schema"
    )
    case: str
    file: str
    hash: str
    title: str
    purpose: str
    vessel: str
    volume_m3: float
    temperature: str
    filling_temperature_K: float
    initial_temperature_K: float
    filling_pressure_Pa: float
    initial_pressure_Pa: float
    initial_volume_m3: float
    fill: list[FilledUnderstood]
    gases: list[GasUnderstood]
    steps: list[StepUnderstood]
    samples: list[str]
    flows: list[str]
    run: str
    watch: str | None
    assumptions: list[str]
    notes: list[str]


def understood(case: LoadedCase) -> Understood:
    """The record of a loaded case."""
    experiment = case.experiment
    initial = experiment.temperature.initial
    return Understood(
        case=case.name,
        file=str(case.path),
        hash=case.hash,
        title=experiment.title,
        purpose=experiment.purpose,
        vessel=_vessel(experiment),
        volume_m3=experiment.vessel.volume.value,
        temperature=_temperature(experiment),
        filling_temperature_K=experiment.fill.temperature(initial),
        initial_temperature_K=initial,
        filling_pressure_Pa=experiment.fill.pressure(experiment.vessel, initial),
        initial_pressure_Pa=experiment.initial_pressure,
        initial_volume_m3=experiment.initial_volume,
        fill=_fill(experiment),
        gases=[_gas(gas) for gas in experiment.gases],
        steps=[_step(step, experiment) for step in experiment.steps],
        samples=[sample_words(sample) for sample in experiment.samples],
        flows=[flow_words(flow, experiment) for flow in experiment.flows],
        run=_run(experiment),
        watch=experiment.watched,
        assumptions=_assumptions(experiment),
        notes=[*experiment.notes],
    )


def _vessel(experiment: Experiment) -> str:
    vessel = experiment.vessel
    kind = "rigid" if vessel.is_rigid else "piston"
    parts = [f"{kind}, {_given(vessel.volume)}"]
    if not vessel.is_rigid:
        parts[0] += " at filling"
        held = vessel.pressure
        shown = wording.units_in_use(experiment)
        parts.append(
            f"holds {_given(held)}"
            if held is not None
            else f"holds {wording.pressure(experiment.held_pressure, shown)}, the sum filled"
        )
    if vessel.shape is not None:
        area = vessel.shape.area(vessel.volume.value)
        width = f"{wording.number(vessel.shape.width(vessel.volume.value) * 100)} cm wide, "
        width = "" if vessel.shape.form == "stated" else f"{vessel.shape.form} {width}"
        parts.append(f"{width}inner surface {wording.number(area * 1e4)} cm²")
    if vessel.rated_pressure is not None:
        parts.append(f"rated {_given(vessel.rated_pressure)}")
    if vessel.gauge_resolution is not None:
        parts.append(f"gauge reads to {_given(vessel.gauge_resolution)}")
    if vessel.dead_space is not None:
        dead = vessel.dead_space
        parts.append(f"dead space {_given(dead.volume)} at {_given(dead.temperature)}")
    return "; ".join(parts)


def _temperature(experiment: Experiment) -> str:
    mode = experiment.temperature
    if isinstance(mode, Program):
        points = [f"{_given(T)} at {_given(t) if t.value else '0'}" for t, T in mode.points]
        if len(points) > MOST_POINTS:
            points[MOST_POINTS - 1 : -1] = [f"… {len(points) - MOST_POINTS} more …"]
        return f"program: {', '.join(points)}; linear between, constant after"
    if isinstance(mode, Exchange):
        text = (
            f"exchange: {_given(mode.value)} at time zero, surroundings "
            f"{_given(mode.surroundings)}, {_given(mode.conductance)}"
        )
        wall = mode.wall_heat_capacity
        return text + (f", wall {_given(wall)}" if wall is not None else "")
    start = " at time zero" if mode.mode == "adiabatic" else ""
    return f"{mode.mode}, {_given(mode.value)}{start}"


def _fill(experiment: Experiment) -> list[FilledUnderstood]:
    fill, vessel = experiment.fill, experiment.vessel
    initial = experiment.temperature.initial
    moles = fill.moles(vessel, initial)
    total = sum(moles.values())
    filled = fill.pressure(vessel, initial)
    return [
        FilledUnderstood(
            gas=gas,
            given="balance" if gas == fill.balance else _given(fill.gases[gas].quantity),
            moles_mol=moles[gas],
            pressure_at_filling_Pa=filled * moles[gas] / total,
            pressure_at_start_Pa=experiment.initial_pressure * moles[gas] / total,
        )
        for gas in fill.names
    ]


def _given(quantity: Sourced) -> str:
    """A value as the file gives it, with all its digits."""
    value = units.from_si(
        quantity.value * quantity.per, quantity.unit, quantity.dimension or "pure"
    )
    return f"{value:.10g} {wording.pretty_unit(quantity.unit)}".strip()


def _gas(gas: Gas) -> GasUnderstood:
    known = gas.thermochemistry
    return GasUnderstood(
        name=gas.name,
        formula=None if gas.formula is None else gas.formula.hill,
        cas=gas.cas,
        diameter_m=None if gas.diameter is None else gas.diameter.value,
        diameter_source=None if gas.diameter is None else gas.diameter.source,
        thermochemistry_from_K=None if known is None else known.low,
        thermochemistry_to_K=None if known is None else known.high,
    )


def _step(step: Step, experiment: Experiment) -> StepUnderstood:
    numbers = [
        f"{key} = {_given(value)}" for key, value in step.law.inputs().items() if not value.default
    ]
    reverse: str | None = None
    if isinstance(step.reverse, GivenEquilibrium):
        given = step.reverse
        constant, at = _given(given.constant), _given(given.at)
        reverse = f"{given.kind} = {constant} at {at}"
        if given.enthalpy is not None:
            reverse += f", enthalpy {_given(given.enthalpy)}"
    elif step.reverse is not None:
        reverse = "thermochemistry"
    return StepUnderstood(
        name=step.name,
        reaction=wording.reaction(step.reaction, experiment),
        law=step.law.word,
        choices=choices(step, experiment),
        numbers=numbers,
        counts=step.counts,
        order=step.order,
        orders=step.orders,
        bath=step.bath is not None,
        reverse=reverse,
        conditions=list(conditions(step, experiment)),
        source=step.source,
    )


def _run(experiment: Experiment) -> str:
    plan = experiment.plan
    until = "until it is done (auto)" if plan.until is None else _given(plan.until)
    rows = ", ".join(_given(time) for time in plan.report_at)
    parts = [until, f"watching {experiment.watched}" if experiment.watched else ""]
    parts += [f"rows at {rows}" if rows else "", f"{plan.solver.method}, rtol {plan.solver.rtol:g}"]
    return "; ".join(part for part in parts if part)


def _assumptions(experiment: Experiment) -> list[str]:
    """What the case does not say and the computation takes for granted."""
    initial = experiment.temperature.initial
    filling = experiment.fill.temperature(initial)
    lines = ["The gas is ideal and well mixed, and nothing leaks."]
    if experiment.flows:
        lines = ["The gas is ideal and well mixed, and nothing flows but what is stated."]
    if experiment.samples:
        lines.append("Samples leave at once, as they are in the vessel, and do not come back.")
    if filling != initial and experiment.vessel.is_rigid:
        lines.append(
            f"Filled at {wording.temperature(filling)}, the vessel is brought to "
            f"{wording.temperature(initial)} at time zero; nothing reacts before."
        )
    if any(
        wording.is_per_molecule(q.unit) for s in experiment.steps for q in s.law.inputs().values()
    ):
        lines.append("Rate constants in cm³, cm⁶ … without mol are per molecule.")
    if any(step.reverse is not None for step in experiment.steps):
        lines.append("A reverse rate constant is the forward one over K_c: detailed balance.")
    return lines
