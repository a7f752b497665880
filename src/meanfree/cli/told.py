"""What `run` says on the screen: the short answer first, the detail under it."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from meanfree.cli.screen import answers_grid, as_text, hanging
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.answers import answers
from meanfree.report.cautions import GUIDANCE, grave_cautions
from meanfree.report.kinetics import RateConstant, rate_constants
from meanfree.report.run_models import RunSummary
from meanfree.report.sheets import verified

MOST_CONSTANTS = 12
"""Rate constants that are listed on the screen; the tables have them all."""


def told(run: Run, summary: RunSummary, folder: Path) -> str:
    """The answer of a run as text for this screen; plain where it is no screen."""
    return as_text(_parts(run, summary, folder))


def _parts(run: Run, summary: RunSummary, folder: Path) -> Iterator[RenderableType]:
    yield Text(wording.clean(run.experiment.title), style="bold")
    if run.experiment.purpose:
        yield Text(wording.clean(run.experiment.purpose), style="italic")
    yield ""
    yield answers_grid(answers(run, summary))
    yield ""
    rows = rate_constants(run)
    for row in rows[:MOST_CONSTANTS]:
        yield _constant(row)
    if len(rows) > MOST_CONSTANTS:
        yield f"• and {len(rows) - MOST_CONSTANTS} more, in rate_constants.csv"
    yield ""
    if summary.verification is not None:
        yield Text(verified(summary))
        yield ""
    grave = list(grave_cautions(run, rows))
    for text in grave:
        yield hanging("Caution:", text)
    others = len(set(summary.cautions) - {*grave, GUIDANCE})
    if others:
        many = "1 more caution" if others == 1 else f"{others} more cautions"
        yield Text(f"The page has {many if grave else many.replace(' more', '')} to be read.")
    yield Text(f"{folder / 'report.html'} has the figures, tables and sources.")
    yield Text(GUIDANCE, style="dim")


def _constant(row: RateConstant) -> Table:
    line = Text(
        f"{row.printed} at {wording.temperature(row.temperature)}: k = {row.shown} per event"
    )
    if row.shown_as_counted:
        line.append(f" = {row.shown_as_counted}")
    if row.shown_by_pressure:
        line.append(f" = {row.shown_by_pressure}")
    if row.ceiling is not None:
        line.append(f"; Z = {wording.rate(row.ceiling.Z, row.shown_unit, row.order)}")
    judged = row.judgement
    if judged is not None and judged.steric is not None and judged.A_over_Z is not None:
        line.append(f", P = {wording.number(judged.steric)}")
        line.append(f", A over Z = {wording.number(judged.A_over_Z)}")
    if judged is not None:
        line.append(f"; {judged.verdict}")
    return hanging("•", line)
