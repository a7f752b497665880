"""`meanfree size CASE`: how long, or what temperature, fill or volume, to reach a goal."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out
from meanfree.cli.each_case import Cases
from meanfree.errors import InputError, Problem

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.cli.size_work import Question
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord


def size(
    cases: Cases,
    conversion: Annotated[
        str | None, typer.Option(metavar="X", help="Conversion to reach, such as 0.25 or '25 %'.")
    ] = None,
    yielded: Annotated[
        str | None,
        typer.Option("--yield", metavar="Y", help="Yield to reach: moles for each mole watched."),
    ] = None,
    of: Annotated[
        str | None, typer.Option(metavar="GAS", help="Of this gas; else of the one watched.")
    ] = None,
    within: Annotated[
        str | None, typer.Option(metavar="TIME", help="Within this time, such as '8 h'.")
    ] = None,
    vary: Annotated[
        str | None,
        typer.Option(metavar="ADDRESS", help="By another value here: temperature.value, say."),
    ] = None,
    between: Annotated[
        tuple[str, str] | None,
        typer.Option(metavar="LOW HIGH", help="The range of that value, such as '400 K' '600 K'."),
    ] = None,
    sensitivity: Annotated[
        bool, typer.Option("--sensitivity", help="Also what the answers follow, and how much.")
    ] = False,
    uncertainty: Annotated[
        bool, typer.Option("--uncertainty", help="Also bands from the uncertainties stated.")
    ] = False,
    runs: Annotated[
        int, typer.Option(metavar="N", help="Runs for the bands: a power of two.")
    ] = 256,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Say when a conversion or a yield is reached, or what reaches it within a time.

    Every value in the range that does is found; where none does, the end that comes nearest and
    why. With several cases, --out names the folder that holds a folder for each.
    """
    from meanfree.cli.size_work import Question, worked_out

    question = Question(
        conversion, yielded, of, within, vary, between, sensitivity, uncertainty, runs
    )
    _refuse(question)

    def work(case: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
        return worked_out(question, case, record, progress)

    carry_out(
        "size",
        cases,
        settings,
        work,
        out=out,
        replace=replace,
        as_json=as_json,
        quiet=quiet,
    )


def _refuse(question: Question) -> None:
    """Options that do not go together, all of them in one go."""
    problems = []
    if question.conversion is not None and question.yielded is not None:
        problems.append(Problem("--yield", "both --conversion and --yield", "one of them"))
    if (question.vary is None) != (question.between is None):
        given = "--vary" if question.vary is not None else "--between"
        expected = "--vary ADDRESS and --between LOW HIGH together"
        problems.append(Problem(given, f"{given} alone", expected))
    if question.yielded is not None and question.of is None:
        problems.append(Problem("--of", "nothing beside --yield", "the gas that is to form"))
    if question.runs < 16 or question.runs > 2**20 or question.runs & (question.runs - 1):
        expected = "a power of two from 16 to 1048576"
        problems.append(Problem("--runs", f"{question.runs}", expected))
    if problems:
        raise InputError(problems)
