"""`schedule` as a summary, as answers, a run sheet and tables, and as a document."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from meanfree import units
from meanfree.planning.schedule import Kinds, Plan, Schedule
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import schedule as figures
from meanfree.report.figures import style
from meanfree.report.planning.naming import at_address, in_words
from meanfree.report.planning.showing import shown
from meanfree.report.record import CaseRecord
from meanfree.report.rows import Answer, Row, Sheet
from meanfree.report.tables import to_csv

NAMES: dict[Kinds, str] = {
    "equal times": "equal steps of time",
    "equal conversion": "equal steps of conversion",
    "D": "D-optimal",
    "A": "A-optimal",
    "E": "E-optimal",
}
DAY = 86400.0


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class ParameterAnswer(_Record):
    """A parameter and its standard error: relative to it, or absolute where it is 0 (in ``unit``);
    null: the readings do not determine it."""

    address: str
    value: float
    unit: str
    relative_error: float | None


class DesignAnswer(_Record):
    """One design: its sample times with what is read there, and what it makes of the parameters."""

    design: str
    times_s: list[float]
    signal: list[float]
    conversion: list[float]
    parameters: list[ParameterAnswer]


class ScheduleSummary(_Record):
    """Everything that `meanfree schedule` answers; signals in ``signal_unit`` (SI)."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-schedule-1"] = Field(
        default="meanfree-schedule-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    signal: str
    signal_unit: str
    sd: float
    sd_assumed: bool
    dead_time_s: float
    takes: float
    working_time_s: float
    last_seen_s: float | None
    chosen: str
    designs: list[DesignAnswer]

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"


def schedule_document(
    found: Schedule, chosen: Kinds, record: CaseRecord, arguments: Sequence[str]
) -> Document:
    """The document of `schedule`, with the run sheet of the chosen design."""
    plan = found.plans[chosen]
    with style.drawing():
        drawn = style.rendered(figures.figure(found, chosen))
    caption = (
        f"Above, the signal with the samples of the design used ({NAMES[chosen]}) and twice their "
        "standard deviation each way. Below, when every design draws its samples."
    )
    sheet = run_sheet(found, plan)
    return Document(
        command="schedule",
        title=f"When to sample: {found.experiment.title}",
        subtitle=found.experiment.purpose,
        answers=tuple(answers(found, chosen)),
        summary=summarise(found, chosen, record).to_json(),
        sections=(
            Section("Run sheet", (_sheet_text(found, chosen),), sheets=((sheet, "Samples"),)),
            Section("Designs", drawings=(Drawing("schedule", *drawn, caption),)),
            Section(
                "Expected standard errors",
                (
                    "What a least-squares fit to readings at these times would leave, with "
                    "everything else in the case taken as exact.",
                ),
                sheets=((errors_sheet(found), "By design (designs.csv)"),),
            ),
        ),
        notes=tuple(_notes(found)),
        arguments=tuple(arguments),
        screen=sheet,
        tables={"run_sheet.csv": _sheet_csv(found, plan), "designs.csv": _designs_csv(found)},
        work={"solver": {"method": found.experiment.plan.solver.method, "rtol": 1e-10}},
    )


def signal_words(found: Schedule) -> str:
    """``concentration of NOCl``."""
    if not found.gas:
        return "total pressure"
    return f"{found.signal_kind} of {wording.chemical(found.experiment.gas_named[found.gas])}"


def _dimension(found: Schedule) -> str:
    return "concentration" if found.signal_kind == "concentration" else "pressure"


def _signal(found: Schedule, value: float, digits: int = 4) -> str:
    return shown(value, _dimension(found), found.experiment, digits)


def answers(found: Schedule, chosen: Kinds) -> list[Answer]:
    """When to sample and how sharp the parameters become, against naive equal spacing."""
    plan, naive = found.plans[chosen], found.plans["equal times"]
    times = ", ".join(wording.duration(float(t)) for t in plan.times[:12])
    times += " …" if len(plan.times) > 12 else ""
    result = [Answer(f"Samples ({NAMES[chosen]})", times, f"reading the {signal_words(found)}")]
    for i, address in enumerate(found.parameters):
        error, other = float(plan.errors[i]), float(naive.errors[i])
        name = in_words(address, found.experiment)
        if not math.isfinite(error):
            note = "these readings at one temperature cannot tell the parameters apart"
            result.append(Answer(f"{name} to", "not determined", note))
            continue
        note = f"one standard error; {_error(other)} with equal steps of time"
        if error > 0 and math.isfinite(other) and chosen != "equal times":
            note += (
                f", which would take {wording.number((other / error) ** 2, 2)} times the samples"
            )
        result.append(Answer(f"{name} to", _error(error), note))
    if found.late is not None:
        gas = wording.chemical(found.experiment.gas_named[found.gas])
        note = "where no sample is drawn before" if found.ignoring else ""
        result.append(Answer(f"{gas} is seen until", wording.duration(found.late), note))
    return result


def _ignoring(found: Schedule, chosen: Kinds) -> str:
    """What the times would be worth, had what samples take been left out of their choice."""
    if chosen not in found.ignoring:
        return ""
    other, plan = found.ignoring[chosen], found.plans[chosen]
    told = [
        f"{in_words(address, found.experiment)} to {_error(float(was))}, not {_error(float(now))}"
        for address, was, now in zip(found.parameters, other.errors, plan.errors, strict=True)
        if _error(float(was)) != _error(float(now))
    ]
    if not told:
        return " Times chosen as if they took nothing would be as good."
    return f" Times chosen as if they took nothing would give {'; '.join(told)}."


def _error(value: float) -> str:
    return f"± {wording.percent(value)}" if math.isfinite(value) else "not determined"


def _sheet_text(found: Schedule, chosen: Kinds) -> str:
    sampling = found.sampling
    text = f"{NAMES[chosen]}; standard deviation of a reading {_signal(found, found.sd)}"
    text += " (assumed: 1 % of the largest signal)" if found.assumed else ""
    if sampling.dead_time is not None:
        text += f"; at least {wording.duration(sampling.dead_time.value)} from sample to sample"
    if found.begin > 0:
        text += f"; none in the warm-up of {wording.duration(found.begin)}"
    if sampling.takes > 0:
        text += f"; each takes {wording.percent(sampling.takes)} of the contents"
    return text[:1].upper() + text[1:] + "." + _ignoring(found, chosen)


def run_sheet(found: Schedule, plan: Plan) -> Sheet:
    """What is taken to the bench: number, clock, time, expected reading, room for the reading."""
    gas = found.experiment.watched
    name = "" if gas is None else wording.chemical(found.experiment.gas_named[gas])
    clocked = found.sampling.clock is not None
    heading = ["Sample", *(["clock"] if clocked else []), "after", "expected", "± 2 sd"]
    heading += [f"conversion of {name}", "reading"]
    rows: list[Row] = []
    for number, (time, signal, conversion) in enumerate(
        zip(plan.times, plan.signal, plan.conversion, strict=True), start=1
    ):
        row = [f"{number}"]
        if found.sampling.clock is not None:
            row.append(clock(found.sampling.clock + float(time)))
        row += [wording.duration(float(time), 4), _signal(found, float(signal))]
        row += [_signal(found, 2 * found.sd, 2), wording.percent(float(conversion)), "________"]
        rows.append(row)
    return Sheet(heading, rows, words=())


def clock(seconds: float) -> str:
    """A time of day, with the day where it is not the first: ``09:30:05``, ``day 2, 01:00:00``.

    >>> clock(34205.0), clock(90000.0)
    ('09:30:05', 'day 2, 01:00:00')
    """
    whole = round(seconds)
    day, rest = divmod(whole, int(DAY))
    text = f"{rest // 3600:02d}:{rest % 3600 // 60:02d}:{rest % 60:02d}"
    return text if day == 0 else f"day {day + 1}, {text}"


def errors_sheet(found: Schedule) -> Sheet:
    """The standard error of every parameter with every design."""
    heading = ["Design", *(in_words(address, found.experiment) for address in found.parameters)]
    heading += ["first sample", "last sample"]
    rows = [
        [
            NAMES[kind],
            *(_error(float(error)) for error in plan.errors),
            wording.duration(float(plan.times[0])),
            wording.duration(float(plan.times[-1])),
        ]
        for kind, plan in found.plans.items()
    ]
    return Sheet(heading, rows)


def _notes(found: Schedule) -> list[str]:
    notes = [
        "Expected errors hold for the parameters as the case has them: a design for a rate "
        "constant that is off by a factor of two is not the best one. A first run sharpens it.",
        "Readings are taken as independent, with one standard deviation.",
    ]
    values = "; ".join(
        f"{in_words(a, found.experiment)} = {at_address(float(v), a, found.experiment)}"
        for a, v in zip(found.parameters, found.values, strict=True)
    )
    notes.append(f"Designed for {values}.")
    if found.ignoring:
        notes.append(
            "Times, expected readings, conversions and errors count what each sample takes out; "
            "the line of the figure is the run without."
        )
    return notes


def summarise(found: Schedule, chosen: Kinds, record: CaseRecord) -> ScheduleSummary:
    """The summary of `schedule`."""
    from meanfree.experiment.inputs import inputs

    known = inputs(found.experiment)
    dead = found.sampling.dead_time
    return ScheduleSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=found.experiment.title,
        signal=f"{found.signal_kind} of {found.gas}" if found.gas else "total pressure",
        signal_unit=units.si_unit(_dimension(found)),
        sd=found.sd,
        sd_assumed=found.assumed,
        dead_time_s=0.0 if dead is None else dead.value,
        takes=found.sampling.takes,
        working_time_s=found.until,
        last_seen_s=found.late,
        chosen=chosen,
        designs=[
            DesignAnswer(
                design=kind,
                times_s=[float(t) for t in plan.times],
                signal=[float(s) for s in plan.signal],
                conversion=[float(x) for x in plan.conversion],
                parameters=[
                    ParameterAnswer(
                        address=address,
                        value=float(value),
                        unit=known[address].unit,
                        relative_error=float(error) if math.isfinite(error) else None,
                    )
                    for address, value, error in zip(
                        found.parameters, found.values, plan.errors, strict=True
                    )
                ],
            )
            for kind, plan in found.plans.items()
        ],
    )


def _sheet_csv(found: Schedule, plan: Plan) -> str:
    unit = "mol_per_m3" if _dimension(found) == "concentration" else "Pa"
    header = (
        "sample",
        "time_s",
        "clock",
        f"expected_{unit}",
        f"sd_{unit}",
        "conversion",
        "reading",
    )
    start = found.sampling.clock
    rows = [
        (
            number,
            float(t),
            None if start is None else clock(start + float(t)),
            float(s),
            found.sd,
            float(x),
            None,
        )
        for number, (t, s, x) in enumerate(
            zip(plan.times, plan.signal, plan.conversion, strict=True), start=1
        )
    ]
    return to_csv(header, rows)


def _designs_csv(found: Schedule) -> str:
    rows = [
        (kind, address, float(error) if math.isfinite(error) else None)
        for kind, plan in found.plans.items()
        for address, error in zip(found.parameters, plan.errors, strict=True)
    ]
    return to_csv(("design", "parameter", "relative_standard_error"), rows)
