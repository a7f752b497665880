"""`window` as a summary, as answers, and as a document."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Literal

import numpy as np
from pydantic import BaseModel, ConfigDict, Field

from meanfree.experiment.experiment import Experiment
from meanfree.planning.window import Window
from meanfree.planning.window_reasons import COARSE, REGIONS
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import style
from meanfree.report.figures import window as figures
from meanfree.report.planning.naming import at_address, in_words
from meanfree.report.record import CaseRecord
from meanfree.report.rows import Answer, Sheet
from meanfree.report.tables import Cell, to_csv


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class AxisAnswer(_Record):
    """One side of the map."""

    address: str
    low: float
    high: float
    unit: str
    points: int


class RegionAnswer(_Record):
    """Something that makes a run no use, and its share of the map; null: nothing could be said,
    ``why_not`` says why."""

    region: str
    share: float | None
    why_not: str | None


class PointAnswer(_Record):
    """One point of the map."""

    across: float
    up: float
    time_s: float | None
    highest_pressure_Pa: float | None
    stands_against: list[str]


class WindowSummary(_Record):
    """Everything that `meanfree window` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-window-1"] = Field(
        default="meanfree-window-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    gas: str
    conversion: float
    across: AxisAnswer
    up: AxisAnswer
    usable_share: float
    regions: list[RegionAnswer]
    middle: PointAnswer | None
    case_as_it_stands: PointAnswer | None
    ran_until_s: float

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"


def window_document(
    found: Window, experiment: Experiment, record: CaseRecord, arguments: Sequence[str]
) -> Document:
    """The document of `window`."""
    with style.drawing():
        drawn = style.rendered(figures.figure(found, experiment))
    goal = _goal(found, experiment)
    caption = (
        f"Time to {goal} (lines) over {in_words(found.across.address, experiment)} and "
        f"{in_words(found.up.address, experiment)}. Shaded: where a run is no use, and why."
    )
    return Document(
        command="window",
        title=f"Where to run: {experiment.title}",
        subtitle=experiment.purpose,
        answers=tuple(answers(found, experiment)),
        summary=summarise(found, experiment, record).to_json(),
        sections=(
            Section("The map", drawings=(Drawing("window", *drawn, caption),)),
            Section("What stands against a run", sheets=((regions_sheet(found), "By reason"),)),
        ),
        notes=(
            f"{found.time.size} runs, each to {wording.duration(found.until)} at most. The "
            "warm-up and the mixing time are bounds here; a run that is ten times slower than "
            "both is safe from them (meanfree limits).",
            f"Mixing, equilibrium, collision limit and condensation are interpolated between "
            f"{COARSE} by {COARSE} points. Condensation is that of what is filled, at filling and "
            "at the start.",
        ),
        arguments=tuple(arguments),
        tables={"window.csv": _csv(found)},
        work={"runs": int(found.time.size), "solver": {"rtol": 1e-6}},
    )


def _goal(found: Window, experiment: Experiment) -> str:
    gas = wording.chemical(experiment.gas_named[found.gas])
    return f"{wording.percent(found.level)} of {gas}"


def answers(found: Window, experiment: Experiment) -> list[Answer]:
    """How much of the map is usable, its middle, and how the case stands."""
    goal = _goal(found, experiment)
    usable = found.usable
    result = []
    if found.middle is None:
        result.append(Answer("Usable", "nothing of this map", _largest(found)))
    else:
        row, column = found.middle
        across = at_address(float(found.across.values[column]), found.across.address, experiment, 4)
        up = at_address(float(found.up.values[row]), found.up.address, experiment, 4)
        result.append(Answer("Usable", f"{wording.percent(float(usable.mean()), 2)} of this map"))
        names = (in_words(found.across.address, experiment), in_words(found.up.address, experiment))
        time = wording.duration(float(found.time[row, column]))
        note = f"{goal} after {time}"
        result.append(Answer("In its middle", f"{names[0]} {across}, {names[1]} {up}", note))
        result += _span(found, experiment)
    base = _base(found)
    if base is not None:
        against = "; ".join(base.stands_against)
        if base.time_s is None:
            reached = f"{goal} not reached in {wording.duration(found.until)}"
        else:
            reached = f"{goal} after {wording.duration(base.time_s)}"
            against = against or "nothing stands against it"
        result.append(Answer("The case as it stands", reached, against))
    return result


def _largest(found: Window) -> str:
    shares = {name: float(mask.mean()) for name, mask in found.regions.items()}
    shares[f"not reached in {wording.duration(found.until)}"] = float(found.unreached.mean())
    name = max(shares, key=lambda key: shares[key])
    return f"mostly {name}"


def _span(found: Window, experiment: Experiment) -> list[Answer]:
    """The usable range of the first number where the second is as in the case."""
    y = found.up.values
    if not y[0] <= found.base[1] <= y[-1]:
        return []
    row = int(np.argmin(np.abs(found.up.positions - _position(found.base[1], found))))
    places = np.flatnonzero(found.usable[row])
    name = in_words(found.across.address, experiment)
    at = at_address(float(found.base[1]), found.up.address, experiment, 4)
    question = f"With {in_words(found.up.address, experiment)} {at}"
    if not len(places):
        return [Answer(question, f"no usable {name}")]
    low, high = (
        at_address(float(found.across.values[i]), found.across.address, experiment, 4)
        for i in (places[0], places[-1])
    )
    whole = len(places) == places[-1] - places[0] + 1
    return [Answer(question, f"{name} from {low} to {high}", "" if whole else "with gaps")]


def _position(value: float, found: Window) -> float:
    return math.log(value) if found.up.is_geometric else value


def regions_sheet(found: Window) -> Sheet:
    """Every reason with its share of the map, or why nothing could be said."""
    rows = []
    for name in REGIONS:
        if name in found.unsaid:
            rows.append([name, "–", f"not looked at: {wording.clean(found.unsaid[name])}"])
            continue
        mask = found.regions.get(name)
        share = 0.0 if mask is None else float(mask.mean())
        rows.append([name, wording.percent(share, 2), "" if share else "nowhere on this map"])
    unreached = float(found.unreached.mean())
    if unreached:
        remark = "for no other reason"
        name = f"not reached in {wording.duration(found.until)}"
        rows.append([name, wording.percent(unreached, 2), remark])
    return Sheet(["Reason", "share of the map", "remark"], rows, words=(0, 2))


def _point(found: Window, row: int, column: int) -> PointAnswer:
    return PointAnswer(
        across=float(found.across.values[column]),
        up=float(found.up.values[row]),
        time_s=_finite(float(found.time[row, column])),
        highest_pressure_Pa=_finite(float(found.pressure[row, column])),
        stands_against=[name for name, mask in found.regions.items() if mask[row, column]],
    )


def _base(found: Window) -> PointAnswer | None:
    """The case's own place, with what stands against the nearest point of the map; None where it
    lies off the map."""
    places = []
    for value, axis in ((found.base[1], found.up), (found.base[0], found.across)):
        if not axis.values[0] <= value <= axis.values[-1]:
            return None
        at = math.log(value) if axis.is_geometric else value
        places.append(int(np.argmin(np.abs(axis.positions - at))))
    there = _point(found, places[0], places[1])
    return there.model_copy(
        update={"across": found.base[0], "up": found.base[1], "time_s": _finite(found.base_time)}
    )


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def summarise(found: Window, experiment: Experiment, record: CaseRecord) -> WindowSummary:
    """The summary of `window`."""
    axes = [
        AxisAnswer(
            address=axis.address,
            low=float(axis.values[0]),
            high=float(axis.values[-1]),
            unit=axis.unit,
            points=len(axis.values),
        )
        for axis in (found.across, found.up)
    ]
    return WindowSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=experiment.title,
        gas=found.gas,
        conversion=found.level,
        across=axes[0],
        up=axes[1],
        usable_share=float(found.usable.mean()),
        regions=[
            RegionAnswer(
                region=name,
                share=None
                if name in found.unsaid
                else float(found.regions[name].mean())
                if name in found.regions
                else 0.0,
                why_not=found.unsaid.get(name),
            )
            for name in REGIONS
        ],
        middle=None if found.middle is None else _point(found, *found.middle),
        case_as_it_stands=_base(found),
        ran_until_s=found.until,
    )


def _csv(found: Window) -> str:
    header = ["across", "up", "time_s", "highest_pressure_Pa", "usable", *REGIONS]
    usable = found.usable
    absent = np.zeros(found.time.shape, bool)
    rows: list[list[Cell]] = []
    for row, y in enumerate(found.up.values):
        for column, x in enumerate(found.across.values):
            cells: list[Cell] = [float(x), float(y)]
            cells += [_finite(float(a[row, column])) for a in (found.time, found.pressure)]
            cells.append(int(usable[row, column]))
            for name in REGIONS:
                known = name not in found.unsaid
                mask = found.regions.get(name, absent)
                cells.append(int(mask[row, column]) if known else None)
            rows.append(cells)
    return to_csv(header, rows)
