"""`compare` as a document: one figure, one table, one paragraph, and its summary."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Literal

from pydantic import ConfigDict, Field

from meanfree.measured.comparison import CEILING, THEORY, Comparison, StepAgainstCollisions
from meanfree.measured.runs import MeasuredRun
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import comparison as figures
from meanfree.report.figures import style
from meanfree.report.measured import numbers
from meanfree.report.measured.models import IntervalAnswer, Record
from meanfree.report.record import CaseRecord
from meanfree.report.rows import NONE, Answer, Sheet
from meanfree.report.tables import to_csv

CONVENTION = (
    "All rate constants here count events. Z is that of every encounter, halved for like partners; "
    "collision theory has k = Z exp(−E0/RT) with E0 = Ea − RT/2 of the kinetics it is compared "
    "with, and P is what these are over that."
)


class ScenarioAnswer(Record):
    """One of the kinetics: successive half-lives of the watched gas; null: not reached."""

    name: str
    half_lives_s: list[float | None]
    half_way_to_equilibrium_s: float | None
    final_pressure_Pa: float


class StepComparison(Record):
    """One step: k, collision theory and the ceiling, all per event."""

    step: str
    T_K: float
    k_m3_per_mol_s: float
    k_low: float | None
    k_high: float | None
    theory_m3_per_mol_s: float | None
    Z_m3_per_mol_s: float
    E0_J_per_mol: float | None
    steric_factor: IntervalAnswer | None
    A_over_Z: float | None
    diameter_factor: float
    verdict: str


class CompareSummary(Record):
    """Everything that `meanfree compare` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-compare-1"] = Field(
        default="meanfree-compare-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    kinetics: Literal["as supplied", "as fitted"]
    watched_gas: str
    scenarios: list[ScenarioAnswer]
    steps: list[StepComparison]
    left_out: list[str]
    paragraph: str

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(indent=2, by_alias=True) + "\n"


def compare_document(
    found: Comparison, runs: Sequence[MeasuredRun], record: CaseRecord
) -> Document:
    """Everything that `compare` says. ``runs`` are those of the same vessel and conditions."""
    title = wording.clean(found.experiment.title)
    paragraph = in_a_paragraph(found)
    with style.drawing():
        svg, png = style.rendered(figures.figure(found, runs))
    over = "; points: the readings" if _drawn(found, runs) else ""
    gas = wording.chemical(found.experiment.gas_named[found.watched])
    caption = f"What is left of {gas} under each kinetics{over}."
    tables: list[tuple[Sheet, str]] = [
        (_half_lives(found), f"Half-lives of {gas} in the same vessel (half_lives.csv)"),
        (_steps(found), "Steps against their collision limits (comparison.csv)"),
    ]
    summary = _summary(found, record, paragraph)
    return Document(
        command="compare",
        title=f"Against collisions: {title}",
        subtitle=wording.clean(found.experiment.purpose),
        answers=tuple(_answers(found)),
        summary=summary.to_json(),
        sections=(
            Section("Comparison", (paragraph,), (Drawing("compare", svg, png, caption),)),
            Section("In numbers", sheets=tuple(tables)),
        ),
        notes=(CONVENTION, *(wording.clean(text) for text in found.left_out)),
        tables={"half_lives.csv": _half_life_table(found), "comparison.csv": _table(found)},
    )


def _drawn(found: Comparison, runs: Sequence[MeasuredRun]) -> bool:
    return any(figures.remaining(run, found.watched) is not None for run in runs)


def in_a_paragraph(found: Comparison) -> str:
    """What the comparison says, for someone who reads one paragraph."""
    gas = wording.chemical(found.experiment.gas_named[found.watched])
    first = found.scenarios[0]
    half = {one.name: one.time for one in found.scenarios}
    own, head = wording.duration(half[first.name]), f"{first.name[:1].upper()}{first.name[1:]}"
    sentences = [f"{head}, {gas} has a half-life of {own}."]
    if half[first.name] is None:
        sentences = [f"{head}, {gas} does not fall to half."]
    elif first.half_way is not None:
        sentences = [f"{head}, {gas} goes half of its way to equilibrium in {own}."]
    others = {
        THEORY: "With the same energy term and P = 1",
        CEILING: "If every collision reacted",
    }
    for name, words in others.items():
        if half.get(name) is None:
            continue
        text = f"{words} it would be {wording.duration(half[name])}"
        if half[first.name] is not None and half[name]:
            ratio = float(half[first.name] or 0.0) / float(half[name] or 1.0)
            text += f", {wording.number(ratio)} times shorter" if ratio > 1.005 else ""
        sentences.append(text + ".")
    sentences += [_of_step(one) for one in found.steps]
    return " ".join(wording.clean(text) for text in sentences)


def _of_step(one: StepAgainstCollisions) -> str:
    at = wording.temperature(one.temperature)
    text = f"Step {one.step} at {at} is {one.judgement.verdict}"
    if one.steric is not None:
        low, high = one.steric.low, one.steric.high
        known = "which includes 1" if low <= 1 <= high else "which excludes 1"
        text += f" (P = {numbers.of_interval(one.steric)}, {known})"
    return text + "."


def _answers(found: Comparison) -> list[Answer]:
    gas = wording.chemical(found.experiment.gas_named[found.watched])
    said = []
    for one in found.scenarios:
        times = [wording.duration(half) for half in one.half_lives if half is not None]
        answer = times[0] if times else "not reached"
        note = f"then {', '.join(times[1:])}" if len(times) > 1 else ""
        if one.half_way is not None:
            note = f"half of the way to equilibrium in {wording.duration(one.half_way)}"
        said.append(Answer(f"Half-life of {gas}, {one.name}", answer, note))
    for step in found.steps:
        if step.steric is not None:
            value = numbers.of_interval(step.steric)
            name = f"P of {wording.clean(step.step)}"
            over = step.judgement.A_over_Z
            note = "" if over is None else f"A over Z = {wording.number(over)}; "
            said.append(Answer(name, value, f"{note}{step.judgement.verdict}"))
        else:
            name = f"k over Z of {wording.clean(step.step)}"
            value = wording.number(step.k / step.limit.Z)
            said.append(Answer(name, value, step.judgement.verdict))
    return said


def _half_lives(found: Comparison) -> Sheet:
    most = max(len(one.half_lives) for one in found.scenarios)
    heading = ["Kinetics", *(["1st", "2nd", "3rd"][:most])]
    way = any(one.half_way is not None for one in found.scenarios)
    heading += ["half-way to equilibrium"] if way else []
    rows = []
    for one in found.scenarios:
        times = [wording.duration(half) for half in one.half_lives]
        row = [one.name, *(times + [NONE] * most)[:most]]
        if way:
            row.append(NONE if one.half_way is None else wording.duration(one.half_way))
        rows.append(row)
    return Sheet(heading, rows)


def _steps(found: Comparison) -> Sheet:
    rows = []
    for one in found.steps:
        k = wording.rate(one.k, "L/mol/s", 2.0)
        if one.k_interval is not None:
            low, high = (1e3 * end for end in one.k_interval)
            k += f" ({numbers.interval(low, high, 1e3 * (one.k_interval[1] - one.k) / 2)})"
        threshold = one.judgement.threshold
        rows.append(
            [
                wording.clean(one.step),
                wording.temperature(one.temperature),
                k,
                NONE if one.in_theory is None else wording.rate(one.in_theory, "L/mol/s", 2.0),
                wording.rate(one.limit.Z, "L/mol/s", 2.0),
                NONE if threshold is None else f"{wording.number(threshold / 1e3, 4)} kJ/mol",
                NONE if one.steric is None else numbers.of_interval(one.steric),
            ]
        )
    heading = ["Step", "T", "k (95 %)", "Z exp(−E0/RT)", "Z", "E0", "P (95 %)"]
    return Sheet(heading, rows)


def _half_life_table(found: Comparison) -> str:
    rows = [
        (one.name, found.watched, ordinal, half)
        for one in found.scenarios
        for ordinal, half in enumerate(one.half_lives, start=1)
    ]
    return to_csv(("kinetics", "gas", "ordinal", "duration_s"), rows)


def _table(found: Comparison) -> str:
    header = ("step", "T_K", "k_SI", "k_low", "k_high", "theory_SI", "Z_SI", "E0_J_per_mol")
    rows = []
    for one in found.steps:
        low, high = one.k_interval if one.k_interval is not None else (None, None)
        P = one.steric
        rows.append(
            (
                *(one.step, one.temperature, one.k, low, high, one.in_theory, one.limit.Z),
                one.judgement.threshold,
                *((None, None, None) if P is None else (P.value, P.low, P.high)),
                one.judgement.verdict,
            )
        )
    return to_csv((*header, "steric_factor", "steric_low", "steric_high", "verdict"), rows)


def _summary(found: Comparison, record: CaseRecord, paragraph: str) -> CompareSummary:
    return CompareSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=found.experiment.title,
        kinetics="as supplied" if found.fit is None else "as fitted",
        watched_gas=found.watched,
        scenarios=[
            ScenarioAnswer(
                name=one.name,
                half_lives_s=list(one.half_lives),
                half_way_to_equilibrium_s=one.half_way,
                final_pressure_Pa=float(one.run.pressure(one.run.end)[0]),
            )
            for one in found.scenarios
        ],
        steps=[_step(one) for one in found.steps],
        left_out=list(found.left_out),
        paragraph=paragraph,
    )


def _step(one: StepAgainstCollisions) -> StepComparison:
    low, high = one.k_interval if one.k_interval is not None else (math.nan, math.nan)
    P = one.steric
    return StepComparison(
        step=one.step,
        T_K=one.temperature,
        k_m3_per_mol_s=one.k,
        k_low=numbers.finite(low),
        k_high=numbers.finite(high),
        theory_m3_per_mol_s=one.in_theory,
        Z_m3_per_mol_s=one.limit.Z,
        E0_J_per_mol=one.judgement.threshold,
        steric_factor=None
        if P is None
        else IntervalAnswer(
            value=P.value,
            stderr=numbers.finite(P.error),
            low=numbers.finite(P.low),
            high=numbers.finite(P.high),
        ),
        A_over_Z=one.judgement.A_over_Z,
        diameter_factor=one.diameter_factor,
        verdict=one.judgement.verdict,
    )
