"""A sweep as a summary, as answers, as a page, and as the folder that holds its parts."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from meanfree.campaigns.campaign import Campaign, makers
from meanfree.campaigns.designs import Grid, Listed, QuasiRandom
from meanfree.campaigns.digest import GOOD, Digest
from meanfree.campaigns.digest import Spread as Distribution
from meanfree.campaigns.store import IDENTITY, PARTS_FOLDER, Store, linked, part_name
from meanfree.experiment.experiment import Experiment
from meanfree.files import MANIFEST, OWNER_KEY, fresh_folder
from meanfree.integrate.observables import At
from meanfree.report import wording
from meanfree.report.document import Document, Drawing, Section, page
from meanfree.report.figures import style
from meanfree.report.figures import sweep as figures
from meanfree.report.planning.naming import in_words
from meanfree.report.record import CaseRecord, versions
from meanfree.report.rows import NONE, Answer, Sheet
from meanfree.report.sweep import naming
from meanfree.report.sweep.models import (
    ConditionAnswer,
    EndingAnswer,
    ObservableAnswer,
    SweepSummary,
)
from meanfree.report.tables import to_csv

MOST_ENDINGS = 20
"""Ways to end that are told apart; the parts have them all."""

DIGITS = 4


@dataclass(frozen=True)
class SweepResult:
    """A finished sweep: what was run, and what it shows."""

    campaign: Campaign
    digest: Digest

    @property
    def experiment(self) -> Experiment:
        """What was varied."""
        return self.campaign.experiment


def sweep_document(result: SweepResult, record: CaseRecord, arguments: Sequence[str]) -> Document:
    """The document of `sweep`."""
    digest, experiment = result.digest, result.experiment
    summary = summarise(result, record)
    tables = {"observables.csv": _observables_csv(digest)}
    if digest.failures:
        names = list(digest.failures[0])
        tables["failures.csv"] = to_csv(names, [list(f.values()) for f in digest.failures])
    sections = [
        *([Section("What it shows", drawings=tuple(_drawings(result)))] if digest.curves else []),
        Section(
            "Observables", sheets=((observables_sheet(result, words=True), "Over all conditions"),)
        ),
        Section("Conditions", sheets=((_varied_sheet(summary, experiment), "What was varied"),)),
        Section("How the runs ended", sheets=((_endings_sheet(summary), "By reason"),)),
    ]
    return Document(
        command="sweep",
        title=f"{_count(digest.conditions)} conditions: {experiment.title}",
        subtitle=experiment.purpose,
        answers=tuple(answers(result)),
        summary=summary.to_json(),
        grave=tuple(_grave(digest)),
        sections=tuple(sections),
        notes=(
            "Quantiles are good to 0.05 %; the parts hold every number as it was computed.",
            f"The parts are Parquet files in {PARTS_FOLDER}/, one row a condition: index, the "
            "conditions in the units of the case, the observables in the units that end their "
            "names (null: not reached), and how the run ended. meanfree.read_sweep reads them "
            "as one table.",
            *_too_late(result.campaign),
            "The same program, versions and kind of processor give the same bits, in whatever "
            "order and on however many processes the parts are made.",
        ),
        arguments=tuple(arguments),
        screen=_narrow(observables_sheet(result, words=False)),
        tables=tables,
        work={
            "conditions": digest.conditions,
            "parts": result.campaign.parts,
            "failed": digest.failed,
            "campaign": dict(result.campaign.identity),
        },
    )


def _too_late(campaign: Campaign) -> list[str]:
    """A run that ends by itself has no later moment."""
    asked = any(isinstance(o, At) and o.time is not None for o in campaign.observables)
    if not asked or campaign.experiment.plan.until is not None:
        return []
    return [
        'Runs end by themselves here (until = "auto"): what is asked of a later time is null. A '
        "time as until runs all of them to it."
    ]


def summarise(result: SweepResult, record: CaseRecord) -> SweepSummary:
    """The summary of a sweep."""
    campaign, digest = result.campaign, result.digest
    return SweepSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=campaign.experiment.title,
        experiment_sha256=campaign.experiment_hash,
        campaign_sha256=campaign.hash,
        design=_design(campaign),
        conditions=digest.conditions,
        parts=campaign.parts,
        failed=digest.failed,
        varied=[
            ConditionAnswer(
                address=address,
                column=campaign.columns.conditions[address],
                unit=campaign.columns.units[address],
                low=digest.ranges[address][0],
                high=digest.ranges[address][1],
            )
            for address in campaign.design.addresses
        ],
        observables=[_observable(spread) for spread in digest.spreads],
        endings=_endings(digest),
    )


def _observable(spread: Distribution) -> ObservableAnswer:
    return ObservableAnswer(
        column=spread.column,
        reached=spread.reached,
        lowest=spread.least,
        quantile_0_16=spread.low,
        median=spread.median,
        quantile_0_84=spread.high,
        highest=spread.most,
    )


def _endings(digest: Digest) -> list[EndingAnswer]:
    every = list(digest.endings.items())
    rows = [
        EndingAnswer(ending=words, conditions=times, failed=words not in GOOD)
        for words, times in every[:MOST_ENDINGS]
    ]
    others = sum(times for _, times in every[MOST_ENDINGS:])
    if others:
        rows.append(EndingAnswer(ending="for other reasons", conditions=others, failed=True))
    return rows


def _design(campaign: Campaign) -> dict[str, object]:
    design = campaign.design
    if isinstance(design, Grid):
        points = {address: len(column) for address, column in design.values.items()}
        return {"kind": "grid", "points": points}
    if isinstance(design, QuasiRandom):
        return {"kind": "quasi-random", "samples": design.count, "seed": design.seed}
    assert isinstance(design, Listed)
    return {"kind": "list", "file": design.file}


def answers(result: SweepResult) -> list[Answer]:
    """How many, how many failed, and the first observables."""
    digest = result.digest
    kind = str(_design(result.campaign)["kind"])
    over = ", ".join(in_words(a, result.experiment) for a in result.campaign.design.addresses[:6])
    found = [Answer("Conditions", _count(digest.conditions), f"{kind} over {over}")]
    if digest.failed:
        share = wording.percent(digest.failed / digest.conditions, 2)
        note = f"{share}; conditions and reasons in failures.csv"
        found.append(Answer("Failed", _count(digest.failed), note))
    else:
        found.append(Answer("Failed", "none"))
    return found


def observables_sheet(result: SweepResult, words: bool) -> Sheet:
    """Every observable with its distribution; with ``words`` also what it is."""
    digest, rows = result.digest, []
    told = naming.in_words(result.campaign.observables, result.experiment)
    for spread in digest.spreads:
        numbers = [spread.least, spread.low, spread.median, spread.high, spread.most]
        shown = [NONE if v is None else wording.number(v, DIGITS) for v in numbers]
        name = [told[spread.column]] if words else []
        rows.append([*name, wording.clean(spread.column), _count(spread.reached), *shown])
    heading = ["Observable", "reached", "lowest", "16 %", "median", "84 %", "highest"]
    if words:
        return Sheet(["Observable", "column", *heading[1:]], rows, words=(0, 1))
    return Sheet(heading, rows, words=(0,))


def _narrow(sheet: Sheet) -> Sheet:
    """The same without the 16 and 84 %: a screen of 80 columns has no room for them."""
    kept = (0, 1, 2, 4, 6)
    return Sheet([sheet.heading[i] for i in kept], [[row[i] for i in kept] for row in sheet.rows])


def _varied_sheet(summary: SweepSummary, experiment: Experiment) -> Sheet:
    rows = [
        [
            in_words(entry.address, experiment),
            wording.clean(entry.column),
            wording.number(entry.low, 5),
            wording.number(entry.high, 5),
            wording.pretty_unit(entry.unit) if entry.unit else "",
        ]
        for entry in summary.varied
    ]
    return Sheet(["Number", "column", "lowest", "highest", "unit"], rows, words=(0, 1, 4))


def _endings_sheet(summary: SweepSummary) -> Sheet:
    rows = [
        [wording.clean(entry.ending), _count(entry.conditions), "failed" if entry.failed else ""]
        for entry in summary.endings
    ]
    return Sheet(["Ending", "conditions", ""], rows, words=(0, 2))


def _grave(digest: Digest) -> list[str]:
    """Failures that change what the distributions mean."""
    if digest.failed * 100 <= digest.conditions:
        return []
    share = wording.percent(digest.failed / digest.conditions, 2)
    return [f"{share} of the conditions failed; the numbers here are of the others."]


def _drawings(result: SweepResult) -> list[Drawing]:
    digest, experiment = result.digest, result.experiment
    words = naming.in_words(result.campaign.observables, experiment)
    found = []
    with style.drawing():
        for place, entry in enumerate(digest.maps):
            drawn = style.rendered(figures.mapped(entry, experiment, words[entry.column]))
            caption = f"{words[entry.column]}: its median in every cell. White: reached by no run."
            found.append(Drawing(_numbered("map", place), *drawn, caption))
        if not digest.maps:
            names = list(dict.fromkeys(curve.column for curve in digest.curves))
            for place, name in enumerate(names):
                own = [curve for curve in digest.curves if curve.column == name]
                drawn = style.rendered(figures.marginal(own, experiment, words[name]))
                caption = (
                    f"{words[name]} against each number, the others as the design has them: median "
                    "of the runs that reached it, and the band that holds two in three of those."
                )
                found.append(Drawing(_numbered("marginal", place), *drawn, caption))
    return found


def _numbered(name: str, place: int) -> str:
    return name if place == 0 else f"{name}_{place + 1}"


def _observables_csv(digest: Digest) -> str:
    header = ["observable", "reached", "lowest", "q_0.16", "median", "q_0.84", "highest"]
    rows = [[s.column, s.reached, s.least, s.low, s.median, s.high, s.most] for s in digest.spreads]
    return to_csv(header, rows)


def _count(number: int) -> str:
    r"""A whole number with its thousands apart.

    >>> _count(1048576).split("\N{NO-BREAK SPACE}")
    ['1', '048', '576']
    """
    return f"{number:,}".replace(",", "\N{NO-BREAK SPACE}")


def write_sweep(
    document: Document,
    store: Store,
    record: CaseRecord,
    folder: Path,
    *,
    owner: str,
    replace: bool,
) -> list[Path]:
    """Write everything, parts included, and return the paths, the page first.

    Raises `InputError` where the folder cannot be used, `ComputationError` for a full disk; the
    parts are kept in either case.
    """
    texts = {"summary.json": document.summary, "report.html": page(document, record)}
    texts |= document.tables
    texts |= {f"{drawing.name}.svg": drawing.svg for drawing in document.drawings}
    manifest = {
        OWNER_KEY: owner,
        "case_sha256": record.sha256,
        "command": document.command_line(record),
        "settings": dict(record.settings),
        "versions": versions() | makers(),
        **document.work,
    }
    texts[MANIFEST] = json.dumps(manifest, indent=2, ensure_ascii=False) + "\n"
    texts[IDENTITY] = json.dumps(dict(store.campaign.identity), indent=2) + "\n"
    with fresh_folder(folder, owner=owner, replace=replace) as new:
        for name, text in texts.items():
            (new / name).write_text(text, encoding="utf-8", newline="")
        for drawing in document.drawings:
            (new / f"{drawing.name}.png").write_bytes(drawing.png)
        (new / PARTS_FOLDER).mkdir()
        for number in range(store.campaign.parts):
            linked(store.path(number), new / PARTS_FOLDER / part_name(number))
    order = ["report.html", "summary.json", *sorted(texts)]
    order += [f"{drawing.name}.png" for drawing in document.drawings]
    return [folder / name for name in (*dict.fromkeys(order), PARTS_FOLDER)]
