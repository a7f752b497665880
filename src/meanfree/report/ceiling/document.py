"""`ceiling` as a document: verdicts first, then the Arrhenius figures and the tables."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from meanfree.planning.ceiling import CeilingTable, StepCeiling
from meanfree.rates.attraction import Attraction
from meanfree.rates.ceiling import NEAR
from meanfree.report import wording
from meanfree.report.ceiling import sheets
from meanfree.report.ceiling.models import summarise
from meanfree.report.ceiling.naming import wrongs
from meanfree.report.document import Document, Drawing, Section
from meanfree.report.figures import style
from meanfree.report.figures.ceiling import figure, grouped
from meanfree.report.record import CaseRecord

MOST_FIGURES = 6
"""Figures on a page; the table and ceiling_curves.csv have what is not drawn."""


def ceiling_document(
    table: CeilingTable, record: CaseRecord, arguments: Sequence[str] = ()
) -> Document:
    """The document of `ceiling`; ``arguments`` are those that repeat it."""
    summary = summarise(table, record)
    tables = {
        "ceiling.csv": sheets.ceiling_csv(summary),
        "ceiling_curves.csv": sheets.curves_csv(table),
        "crossings.csv": sheets.crossings_csv(summary),
    }
    return Document(
        command="ceiling",
        title=f"How close to the collision limit? {table.experiment.title}",
        subtitle=table.experiment.purpose,
        answers=tuple(sheets.answers(table)),
        summary=summary.to_json(),
        grave=tuple(text for one in table.steps for text in wrongs(one)),
        sections=tuple(_sections(table)),
        notes=tuple(_notes(table)),
        arguments=tuple(arguments),
        screen=sheets.screen_sheet(table),
        tables=tables,
    )


def _sections(table: CeilingTable) -> Iterator[Section]:
    if table.steps:
        yield Section("Against the ceiling", _left_undrawn(table), tuple(_drawings(table)))
        verdicts = (sheets.levels_sheet(table), "k counts events (ceiling.csv)")
        factors = (sheets.factors_sheet(table), "What a barrier takes, and what is left")
        yield Section("Verdicts", sheets=(verdicts, factors))
        where = (sheets.ranges_sheet(table), "Where k equals a ceiling (crossings.csv)")
        what = (sheets.pairs_sheet(table), "What the ceilings are made of")
        yield Section("Ranges, crossings, attractions", sheets=(where, what))
    missing = sheets.left_out_sheet(table)
    if missing is not None:
        yield Section("Without a ceiling", sheets=((missing, "Steps that are not judged"),))


def _left_undrawn(table: CeilingTable) -> tuple[str, ...]:
    groups, steps = grouped(table.steps), len(table.steps)
    if len(groups) <= MOST_FIGURES:
        return ()
    drawn = sum(len(group) for group in groups[:MOST_FIGURES])
    return (f"{drawn} of {steps} encounters are drawn; ceiling_curves.csv has all.",)


def _drawings(table: CeilingTable) -> Iterator[Drawing]:
    for place, part in enumerate(grouped(table.steps)[:MOST_FIGURES]):
        name = "ceiling" if place == 0 else f"ceiling_{place + 1}"
        with style.drawing():
            svg, png = style.rendered(figure(part))
        yield Drawing(name, svg, png, _caption(part))


def _caption(steps: Sequence[StepCeiling]) -> str:
    text = "Rate constants per event against temperature. Shaded: above the ceiling, "
    far = any(isinstance(one.attraction, Attraction) for one in steps)
    text += "which is the higher of Z and the long-range one." if far else "which is Z."
    text += " Dotted: the temperature of the run."
    if any(found.inside for one in steps for found in one.crossings):
        text += " A ring marks where k would cross."
    return text


def _notes(table: CeilingTable) -> Iterator[str]:
    yield (
        "Z is the rate constant if every encounter of hard spheres reacted, halved for like "
        "partners; P = k/(Z exp(−E0/RT)) with E0 = Ea − RT/2 at that temperature, A over Z = "
        "k exp(Ea/RT)/Z. k counts events."
    )
    share = wording.percent(NEAR)
    yield (
        f"Collision-limited is a step in which at least {share} of all encounters react; activated "
        f"and hindered mean that the barrier, or the steric factor, leaves less than {share} "
        "(or the most of what is lost). That border is common practice, not a law."
    )
    if any(isinstance(one.attraction, Attraction) for one in table.steps):
        yield (
            "The long-range ceiling is the capture rate constant of the attraction named, with "
            "every electronic surface attractive. London's formula is an estimate of C6, of which "
            "k takes the cube root."
        )
    if any(one.back for one in table.steps):
        yield (
            "A reverse rate constant is the forward one over Kc. Where it is above its ceiling, "
            "the forward rate constant and the thermochemistry cannot both be right."
        )
    remarks = {text for one in table.steps for text in one.remarks}
    yield from sorted(remarks)
    for one in table.steps:
        if not one.back and any(level.outside for level in one.levels):
            assert one.step.valid is not None
            low, high = (wording.temperature(limit.value) for limit in one.step.valid)
            name = wording.clean(one.name)
            yield f"Step {name} is looked at outside {low} to {high}, where its source holds."
