"""`limits` as a summary, as answers and tables, and as a document."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from meanfree import units
from meanfree.experiment.experiment import Experiment
from meanfree.planning.limits import Limit, Survey, Verdict
from meanfree.planning.limits.motion import WallShare
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import limits as figure
from meanfree.report.figures import style
from meanfree.report.planning.naming import with_formulas
from meanfree.report.planning.showing import length, shown
from meanfree.report.record import CaseRecord
from meanfree.report.rows import NONE, Answer, Row, Sheet
from meanfree.report.tables import to_csv


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class FactAnswer(_Record):
    """A number that went into a limit, in ``unit`` (SI)."""

    name: str
    value: float
    unit: str


class LimitAnswer(_Record):
    """One limit. ``value`` and ``guideline`` in ``unit`` (SI); null: nothing can be said."""

    limit: str
    name: str
    value: float | None
    unit: str
    guideline: float | None
    should_be: Literal["below", "above"]
    verdict: str
    meaning: str
    source: str
    facts: list[FactAnswer]


class GasMotion(_Record):
    """How one gas moves in the filled mixture at the start of the run."""

    gas: str
    mean_free_path_m: float
    diffusion_m2_per_s: float
    mixing_time_s: float
    mean_speed_m_per_s: float
    gas_collisions_per_s: float
    wall_collisions_per_s: float
    harmless_uptake: float | None


class LimitsSummary(_Record):
    """Everything that `meanfree limits` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-limits-1"] = Field(
        default="meanfree-limits-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    own_time_s: float | None
    own_time: str
    beyond: int
    cautions: int
    within: int
    not_known: int
    limits: list[LimitAnswer]
    gases: list[GasMotion]

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"


def limits_document(survey: Survey, record: CaseRecord) -> Document:
    """The document of `limits`."""
    experiment = survey.run.experiment
    summary, survey = summarise(survey, record), _printed(survey)
    with style.drawing():
        svg, png = style.rendered(figure.figure(survey))
    drawing = Drawing("limits", svg, png, figure.CAPTION)
    beyond = survey.having(Verdict.BEYOND)
    sheets = ((limits_sheet(survey), "Every limit, the gravest first (limits.csv)"),)
    known = survey.molecules
    sections = [
        Section("Against their guidelines", drawings=(drawing,)),
        Section("Limits", sheets=sheets),
        Section("What went into them", sheets=((facts_sheet(survey), "By limit"),)),
    ]
    if known:
        sheet = (motion_sheet(survey), "At the start of the run")
        sections.append(Section("How the gases move", (_walls_text(survey),), sheets=(sheet,)))
    return Document(
        command="limits",
        title=f"Is the model honest here? {experiment.title}",
        subtitle=experiment.purpose,
        answers=tuple(answers(survey)),
        summary=summary.to_json(),
        grave=tuple(f"{limit.name}: {_said(survey, limit)} {limit.meaning}" for limit in beyond),
        sections=tuple(sections),
        notes=(
            "A guideline that is common practice is a habit of the trade, not a law; the numbers "
            "beside it are for a reader to judge.",
            "Transport properties are estimates by kinetic theory: diffusion is good to about "
            "10 %, conduction to about 10 to 20 %.",
        ),
        screen=screen_sheet(survey),
        tables={"limits.csv": limits_csv(summary), "gases.csv": gases_csv(summary)},
        work={"solver": {"method": survey.run.method, "rtol": survey.run.rtol}},
    )


def answers(survey: Survey) -> list[Answer]:
    """How many limits are beyond, near, within and not known; the gravest named."""
    found = []
    for verdict, question in (
        (Verdict.BEYOND, "Beyond a guideline"),
        (Verdict.CAUTION, "Look at"),
        (Verdict.WITHIN, "Within"),
        (Verdict.UNKNOWN, "Not known"),
    ):
        limits = survey.having(verdict)
        if not limits and verdict is not Verdict.BEYOND:
            continue
        names = "; ".join(_brief(limit, survey.run.experiment) for limit in limits)
        count = "nothing" if not limits else f"{len(limits)}"
        found.append(Answer(question, count, names))
    own = survey.own
    if own is not None:
        gas = wording.chemical(survey.run.experiment.gas_named[own.gas])
        time = wording.duration(own.seconds)
        found.append(Answer("Held against", time, f"{own.words} of {gas}"))
    return found


def _brief(limit: Limit, experiment: Experiment) -> str:
    first = limit.name.partition(" ")[0]
    gases = (wording.chemical(gas) for gas in experiment.gases)
    if first in ("Frank-Kamenetskii", "Semenov", "Knudsen", *gases):
        return wording.clean(limit.name)
    return wording.clean(limit.name[:1].lower() + limit.name[1:])


def _printed(survey: Survey) -> Survey:
    """The same with gases printed as formulas."""

    def told(text: str) -> str:
        return with_formulas(text, survey.run.experiment)

    limits = tuple(
        replace(
            limit,
            name=told(limit.name),
            meaning=told(limit.meaning),
            facts=tuple(replace(fact, name=told(fact.name)) for fact in limit.facts),
        )
        for limit in survey.limits
    )
    return replace(survey, limits=limits)


def _said(survey: Survey, limit: Limit) -> str:
    experiment = survey.run.experiment
    value = shown(limit.value, limit.dimension, experiment)
    if limit.guideline is None:
        return f"{value}."
    word = "at least" if limit.above else "at most"
    return f"{value}, where it should be {word} " + (
        f"{shown(limit.guideline, limit.dimension, experiment)}."
    )


def limits_sheet(survey: Survey) -> Sheet:
    """Number, guideline, verdict, meaning."""
    rows = [[*_cells(survey, limit), wording.clean(limit.meaning)] for limit in survey.limits]
    heading = ["Limit", "Number", "Guideline", "Verdict", "Meaning"]
    return Sheet(heading, rows, words=(0, 3, 4))


def facts_sheet(survey: Survey) -> Sheet:
    """The numbers that each limit was worked out from, and its source."""
    experiment = survey.run.experiment
    rows: list[Row] = []
    for limit in survey.limits:
        facts = "; ".join(
            f"{fact.name} {shown(fact.value, fact.dimension, experiment)}" for fact in limit.facts
        )
        if facts or limit.source:
            source = wording.clean(limit.source) or NONE
            rows.append([wording.clean(limit.name), wording.clean(facts) or NONE, source])
    return Sheet(["Limit", "From", "Source"], rows, words=(0, 1, 2))


def screen_sheet(survey: Survey) -> Sheet:
    """Number, guideline and verdict alone, of what has a number."""
    rows = [
        [*_cells(survey, limit)[:3], limit.verdict.value.partition(" ")[0]]
        for limit in survey.limits
        if limit.value is not None
    ]
    return Sheet(["Limit", "Number", "Guideline", "Verdict"], rows, words=(0, 3))


def _cells(survey: Survey, limit: Limit) -> Row:
    experiment = survey.run.experiment
    guideline = NONE
    if limit.guideline is not None:
        word = "≥" if limit.above else "≤"
        guideline = f"{word} {shown(limit.guideline, limit.dimension, experiment)}"
    number = shown(limit.value, limit.dimension, experiment)
    return [wording.clean(limit.name), number, guideline, limit.verdict.value]


def motion_sheet(survey: Survey) -> Sheet:
    """Mean free path, diffusion, speed, collisions and harmless uptake of every gas."""
    heading = ["Gas", "mean free path", "D (cm²/s)", "Λ²/D", "mean speed (m/s)"]
    heading += ["gas collisions (1/s)", "wall collisions (1/s)", "wall does not matter below γ ="]
    rows = []
    for share in survey.molecules:
        molecule = share.molecule
        rows.append(
            [
                wording.chemical(survey.run.experiment.gas_named[molecule.gas]),
                length(molecule.free_path),
                wording.number(molecule.diffusion * 1e4),
                wording.duration(share.diffusion_alone),
                wording.number(molecule.speed),
                wording.number(molecule.gas_collisions),
                wording.number(molecule.wall_collisions),
                _uptake(survey, share),
            ]
        )
    return Sheet(heading, rows, words=(0,))


def _uptake(survey: Survey, share: WallShare) -> str:
    if survey.own is None:
        return NONE
    return "any" if share.harmless is None else wording.number(share.harmless, 2)


def _walls_text(survey: Survey) -> str:
    if survey.own is None:
        return "No filled gas is consumed, so there is no rate to hold the wall against."
    return (
        "The last column is the uptake probability per wall collision below which the wall takes "
        "less than 1 % of what a reaction with the stated half-life takes, diffusion to the "
        "wall included."
    )


def summarise(survey: Survey, record: CaseRecord) -> LimitsSummary:
    """The summary of `limits`."""
    own = survey.own
    return LimitsSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=survey.run.experiment.title,
        own_time_s=None if own is None else own.seconds,
        own_time="" if own is None else f"{own.words} of {own.gas}",
        beyond=len(survey.having(Verdict.BEYOND)),
        cautions=len(survey.having(Verdict.CAUTION)),
        within=len(survey.having(Verdict.WITHIN)),
        not_known=len(survey.having(Verdict.UNKNOWN)),
        limits=[_answer(limit) for limit in survey.limits],
        gases=[
            GasMotion(
                gas=share.molecule.gas,
                mean_free_path_m=share.molecule.free_path,
                diffusion_m2_per_s=share.molecule.diffusion,
                mixing_time_s=share.diffusion_alone,
                mean_speed_m_per_s=share.molecule.speed,
                gas_collisions_per_s=share.molecule.gas_collisions,
                wall_collisions_per_s=share.molecule.wall_collisions,
                harmless_uptake=share.harmless,
            )
            for share in survey.molecules
        ],
    )


def _answer(limit: Limit) -> LimitAnswer:
    return LimitAnswer(
        limit=limit.key,
        name=limit.name,
        value=limit.value,
        unit=units.si_unit(limit.dimension),
        guideline=limit.guideline,
        should_be="above" if limit.above else "below",
        verdict=limit.verdict.value,
        meaning=limit.meaning,
        source=limit.source,
        facts=[
            FactAnswer(name=fact.name, value=fact.value, unit=units.si_unit(fact.dimension))
            for fact in limit.facts
        ],
    )


def limits_csv(summary: LimitsSummary) -> str:
    """The limits as a table, SI."""
    return to_csv(
        ("limit", "name", "value", "unit", "guideline", "should_be", "verdict", "source"),
        [
            (e.limit, e.name, e.value, e.unit, e.guideline, e.should_be, e.verdict, e.source)
            for e in summary.limits
        ],
    )


def gases_csv(summary: LimitsSummary) -> str:
    """The motion of the gases as a table, SI."""
    names = list(GasMotion.model_fields)
    return to_csv(names, [list(gas.model_dump().values()) for gas in summary.gases])
