"""`meanfree ceiling CASE`: what fraction of collisions does each rate constant ask for?"""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out
from meanfree.cli.each_case import Cases
from meanfree.errors import InputError, Problem

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

Between = Annotated[
    tuple[str, str] | None,
    typer.Option(
        metavar="T T",
        help="The temperatures; else where each step is valid, or around the run's temperature.",
    ),
]


def ceiling(
    cases: Cases,
    between: Between = None,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Hold every rate constant against the most that collisions allow, reverse steps too.

    With several cases, --out names the folder that holds a folder for each.
    """
    span = None if between is None else _span(between)
    arguments = [] if between is None else ["--between", *between]

    def work(case: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
        from meanfree.planning.ceiling import ceiling_table
        from meanfree.report.ceiling.document import ceiling_document

        return ceiling_document(ceiling_table(case.experiment, span), record, arguments)

    carry_out(
        "ceiling",
        cases,
        settings,
        work,
        out=out,
        replace=replace,
        as_json=as_json,
        quiet=quiet,
    )


def _span(texts: tuple[str, str]) -> tuple[float, float]:
    """The two temperatures [K]. Raises `InputError` with everything that is wrong with them."""
    from meanfree import units

    problems: list[Problem] = []
    found: list[float] = []
    for text in texts:
        try:
            found.append(units.read(text, "temperature", "--between").value)
        except units.QuantityError as error:
            problems.append(Problem("--between", error.found, error.expected))
    if not problems and not found[0] < found[1]:
        said = f"{found[0]:g} K and then {found[1]:g} K"
        problems.append(Problem("--between", said, "the lower temperature first"))
    if problems:
        raise InputError(problems)
    return found[0], found[1]
