"""What `run` says on the screen: the short answer first, the detail under it."""

from __future__ import annotations

import io
from pathlib import Path

from rich.console import Console
from rich.table import Table
from rich.text import Text

from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.answers import answers
from meanfree.report.cautions import GUIDANCE
from meanfree.report.kinetics import RateConstant, rate_constants
from meanfree.report.summary import RunSummary


def told(run: Run, summary: RunSummary, folder: Path) -> str:
    """The answer of a run as text for this screen; plain where it is no screen."""
    out = io.StringIO()
    screen = Console()
    console = Console(
        file=out,
        force_terminal=screen.is_terminal,
        color_system=screen.color_system if screen.is_terminal else None,  # type: ignore[arg-type]
        width=screen.width,
        highlight=False,
        markup=False,
        emoji=False,
    )
    console.print(Text(wording.clean(run.experiment.title), style="bold"))
    if run.experiment.purpose:
        console.print(Text(wording.clean(run.experiment.purpose), style="italic"))
    console.print()
    console.print(_answers(run, summary))
    console.print()
    for row in rate_constants(run):
        console.print(_constant(row))
    cautions = [text for text in summary.cautions if text != GUIDANCE]
    if cautions:
        console.print()
        for text in cautions:
            console.print(_hanging("Caution:", text))
    console.print()
    console.print(Text(f"{folder / 'report.html'} has the figures, tables and sources."))
    console.print(Text(GUIDANCE, style="dim"))
    return "\n".join(line.rstrip() for line in out.getvalue().rstrip().split("\n"))


def _answers(run: Run, summary: RunSummary) -> Table:
    grid = Table.grid(padding=(0, 2))
    grid.add_column(no_wrap=True)
    grid.add_column()
    for entry in answers(run, summary):
        line = Text(entry.answer, style="bold")
        if entry.note:
            line.append(f"  {entry.note}", style="not bold")
        grid.add_row(Text(entry.question), line)
    return grid


def _constant(row: RateConstant) -> Table:
    line = Text(
        f"{row.printed} at {wording.temperature(row.temperature)}: k = {row.shown} per event"
    )
    if row.shown_as_counted:
        line.append(f" = {row.shown_as_counted}")
    if row.ceiling is not None:
        line.append(f"; Z = {wording.rate(row.ceiling.Z, row.shown_unit, row.order)}")
    judged = row.judgement
    if judged is not None and judged.steric is not None and judged.A_over_Z is not None:
        line.append(f", P = {wording.number(judged.steric)}")
        line.append(f", A over Z = {wording.number(judged.A_over_Z)}")
    if judged is not None:
        line.append(f"; {judged.verdict}")
    return _hanging("•", line)


def _hanging(head: str, body: str | Text) -> Table:
    """Text whose further lines are set in."""
    grid = Table.grid(padding=(0, 1, 0, 0))
    grid.add_column(no_wrap=True)
    grid.add_column()
    grid.add_row(Text(head), body if isinstance(body, Text) else Text(body))
    return grid
