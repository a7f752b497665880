"""`size` as a summary, as answers and tables, and as a document."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from meanfree.experiment.experiment import Experiment
from meanfree.integrate.run import Run
from meanfree.planning.best_stop import Peak
from meanfree.planning.goal import Goal, Reach
from meanfree.planning.sensitivity import Sensitivities
from meanfree.planning.sizing import Root, Sizing
from meanfree.planning.uncertainty import Uncertainty
from meanfree.planning.why_not import Reason, at_equilibrium
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import sizing as figures
from meanfree.report.figures import style
from meanfree.report.planning.naming import at_address, in_words
from meanfree.report.planning.reasons import because
from meanfree.report.planning.size_models import (
    GoalAnswer,
    PeakAnswer,
    ReasonAnswer,
    RootAnswer,
    SizeSummary,
)
from meanfree.report.planning.spread import (
    SensitivityAnswer,
    UncertaintyAnswer,
    sensitivity_answers,
    sensitivity_section,
    uncertainty_answers,
    uncertainty_section,
)
from meanfree.report.record import CaseRecord
from meanfree.report.rows import Answer, Sheet
from meanfree.report.tables import to_csv


@dataclass(frozen=True)
class SizeResult:
    """All that `size` worked out, to be told."""

    experiment: Experiment
    goal: Goal
    run: Run
    reached: Reach
    peaks: tuple[Peak, ...]
    within: float | None = None
    sizing: Sizing | None = None
    sensitivities: Sensitivities | None = None
    uncertainty: Uncertainty | None = None


def size_document(result: SizeResult, record: CaseRecord, arguments: Sequence[str]) -> Document:
    """The document of `size`."""
    summary = summarise(result, record)
    goal = figures.goal_words(result.goal, result.experiment)
    tables = {}
    sections = []
    with style.drawing():
        if result.sizing is not None:
            drawn = style.rendered(figures.sizing_figure(result.sizing, result.experiment))
            words = in_words(result.sizing.address, result.experiment)
            caption = (
                f"Time to {goal} against {words}, and what is reached within the wanted time; "
                "grey: not reached in twenty times that time."
            )
            sections.append(
                Section(
                    "What reaches it",
                    drawings=(Drawing("sizing", *drawn, caption),),
                    sheets=_root_sheets(result),
                )
            )
            tables["sizing.csv"] = _curve(result.sizing)
        peaks = list(result.peaks)
        drawn = style.rendered(
            figures.progress_figure(result.run, result.goal, result.reached.time, peaks)
        )
    caption = f"The case as it stands on its way to {goal}; the dot is when it gets there."
    if peaks:
        caption += " Below: gases that rise and fall again, with the time of their most."
    sections.append(
        Section(
            "The case as it stands",
            drawings=(Drawing("progress", *drawn, caption),),
            sheets=_peak_sheets(result),
        )
    )
    if result.sensitivities is not None:
        section, table = sensitivity_section(result.sensitivities, result.experiment, goal)
        sections.append(section)
        tables["sensitivities.csv"] = table
    if result.uncertainty is not None:
        section, more = uncertainty_section(result.uncertainty, result.run, goal)
        sections.append(section)
        tables |= more
    return Document(
        command="size",
        title=f"{goal[:1].upper() + goal[1:]}: {result.experiment.title}",
        subtitle=result.experiment.purpose,
        answers=tuple(answers(result)),
        summary=summary.to_json(),
        sections=tuple(sections),
        notes=_notes(result),
        arguments=tuple(arguments),
        tables=tables,
        work={"solver": {"method": result.run.method, "rtol": result.run.rtol}},
    )


def _notes(result: SizeResult) -> tuple[str, ...]:
    found = []
    if result.sizing is not None:
        found.append(
            "A value is an answer where the goal is reached exactly at the wanted time, or where "
            "the most that is reached within it is the goal. Every one in the range is sought."
        )
        if result.sizing.address != "fill.at" and result.experiment.fill.at is None:
            found.append(
                "No filling temperature is stated: pressures are those at the run's temperature, "
                "so the amounts filled follow it."
            )
    if result.goal.kind == "yield":
        found.append("A yield is moles formed for each mole filled of the gas that is watched.")
    found.append("Limits of the vessel and of the model are held by: meanfree limits.")
    return tuple(found)


def answers(result: SizeResult) -> list[Answer]:
    """When, which value, or why none; when to stop for an intermediate."""
    experiment, goal = result.experiment, result.goal
    words = figures.goal_words(goal, experiment)
    found = []
    if result.sizing is not None:
        found += _sized(result, result.sizing, words)
    when = "not reached" if result.reached.time is None else wording.duration(result.reached.time)
    note = "the case as it stands"
    if result.reached.time is None:
        note += f"; it comes to {_level(goal, result.reached.most)}"
    found.append(Answer(words[:1].upper() + words[1:], when, note))
    rest = at_equilibrium(experiment, goal)
    if rest is not None:
        found.append(Answer("At equilibrium", _level(goal, rest)))
    for peak in result.peaks:
        gas = wording.chemical(experiment.gas_named[peak.gas])
        shown = wording.units_in_use(experiment).amount
        amount = wording.quantity(peak.amount, shown, "amount", 4)
        found.append(Answer(f"Most {gas}", f"after {wording.duration(peak.time)}", amount))
    if result.sensitivities is not None:
        found += sensitivity_answers(result.sensitivities, experiment)
    if result.uncertainty is not None:
        found += uncertainty_answers(result.uncertainty, words, experiment)
    return found


def _level(goal: Goal, value: float) -> str:
    return wording.percent(value) if goal.kind == "conversion" else wording.number(value)


def _sized(result: SizeResult, sizing: Sizing, words: str) -> list[Answer]:
    experiment = result.experiment
    question = f"{words[:1].upper() + words[1:]} in {wording.duration(sizing.within)}"
    name = in_words(sizing.address, experiment)
    if sizing.reason is not None:
        low, high = (at_address(v, sizing.address, experiment) for v in sizing.values[[0, -1]])
        sentence = because(sizing.reason, sizing, experiment)
        nothing = f"no {name} between {low} and {high}"
        if sizing.reason.why == "reached sooner":
            nothing = f"any {name} between {low} and {high}"
        return [Answer(question, nothing, sentence)]
    found = []
    for root, rising in zip(sizing.roots, sizing.rising, strict=True):
        value = at_address(root.value, sizing.address, experiment)
        note = f"or {'more' if rising else 'less'}: {_and_pressure(root, experiment)}"
        found.append(Answer(question, f"{name} {value}", note))
        question = "or"
    return found


def _and_pressure(root: Root, experiment: Experiment) -> str:
    p = float(root.run.pressure(root.run.trajectory.fine_times).max())
    units = wording.units_in_use(experiment)
    start = root.run.experiment.initial_pressure
    text = f"pressure {wording.pressure(start, units)} at the start"
    return text + (f", at most {wording.pressure(p, units)}" if p > 1.0005 * start else "")


def _root_sheets(result: SizeResult) -> tuple[tuple[Sheet, str], ...]:
    sizing, experiment = result.sizing, result.experiment
    if sizing is None or not sizing.roots:
        return ()
    units = wording.units_in_use(experiment)
    rows = []
    for root in sizing.roots:
        there = root.run.experiment
        rest = at_equilibrium(there, result.goal)
        most = float(root.run.pressure(root.run.trajectory.fine_times).max())
        rows.append(
            [
                at_address(root.value, sizing.address, experiment, 9),
                wording.duration(root.time, 6),
                wording.pressure(there.initial_pressure, units),
                wording.pressure(most, units),
                "–" if rest is None else _level(result.goal, rest),
            ]
        )
    words = in_words(sizing.address, experiment)
    heading = [words[:1].upper() + words[1:], "time, run again", "pressure at the start"]
    heading += ["pressure at most", "at equilibrium"]
    return ((Sheet(heading, rows, words=(0,)), "Each answer, run again"),)


def _peak_sheets(result: SizeResult) -> tuple[tuple[Sheet, str], ...]:
    if not result.peaks:
        return ()
    experiment = result.experiment
    unit = wording.units_in_use(experiment).amount
    rows = [
        [
            wording.chemical(experiment.gas_named[peak.gas]),
            wording.duration(peak.time, 5),
            wording.quantity(peak.amount, unit, "amount", 5),
            wording.quantity(peak.end, unit, "amount", 5),
        ]
        for peak in result.peaks
    ]
    heading = ["Gas", "most after", "most", "at the end of the run"]
    return ((Sheet(heading, rows), "When to stop for the most of an intermediate"),)


def _curve(sizing: Sizing) -> str:
    header = ("value", "unit", "time_s", f"{sizing.goal.kind}_within")
    rows = [
        (float(v), sizing.unit, _finite(t), _finite(x))
        for v, t, x in zip(sizing.values, sizing.times, sizing.reached, strict=True)
    ]
    return to_csv(header, rows)


def _finite(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def summarise(result: SizeResult, record: CaseRecord) -> SizeSummary:
    """The summary of `size`."""
    sizing, goal, experiment = result.sizing, result.goal, result.experiment
    return SizeSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=experiment.title,
        goal=GoalAnswer(kind=goal.kind, gas=goal.gas, level=goal.level, basis=goal.basis or None),
        time_s=result.reached.time,
        most=result.reached.most,
        most_at_s=result.reached.most_at,
        equilibrium=at_equilibrium(experiment, goal),
        within_s=result.within,
        varied=None if sizing is None else sizing.address,
        low=None if sizing is None else float(sizing.values[0]),
        high=None if sizing is None else float(sizing.values[-1]),
        unit=None if sizing is None else sizing.unit,
        roots=[] if sizing is None else _root_answers(sizing),
        reason=None if sizing is None else _reason_answer(sizing.reason, sizing, experiment),
        intermediates=[
            PeakAnswer(gas=p.gas, time_s=p.time, amount_mol=p.amount, end_mol=p.end)
            for p in result.peaks
        ],
        sensitivities=[]
        if result.sensitivities is None
        else SensitivityAnswer.all_of(result.sensitivities),
        uncertainty=None
        if result.uncertainty is None
        else UncertaintyAnswer.of(result.uncertainty),
    )


def _root_answers(sizing: Sizing) -> list[RootAnswer]:
    return [
        RootAnswer(
            value=root.value,
            unit=sizing.unit,
            time_s=root.time,
            easier_with_more=rising,
            initial_pressure_Pa=root.run.experiment.initial_pressure,
            highest_pressure_Pa=float(root.run.pressure(root.run.trajectory.fine_times).max()),
            equilibrium=at_equilibrium(root.run.experiment, sizing.goal),
        )
        for root, rising in zip(sizing.roots, sizing.rising, strict=True)
    ]


def _reason_answer(
    reason: Reason | None, sizing: Sizing, experiment: Experiment
) -> ReasonAnswer | None:
    if reason is None:
        return None
    return ReasonAnswer(
        why=reason.why,
        at=reason.at,
        unit=sizing.unit,
        reached_within=reason.most,
        reached_ever=reason.eventually,
        time_s=reason.time,
        in_the_way=reason.named or None,
        time_at_collision_limit_s=reason.at_limit,
        sentence=because(reason, sizing, experiment),
    )
