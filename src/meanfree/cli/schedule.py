"""`meanfree schedule CASE`: when to draw samples."""

from __future__ import annotations

from dataclasses import replace
from enum import StrEnum
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out
from meanfree.cli.each_case import Cases
from meanfree.errors import InputError

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.planning.schedule import Kinds
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

MOST = 200


class Design(StrEnum):
    """Whose run sheet is printed."""

    D = "D"
    A = "A"
    E = "E"
    conversion = "conversion"
    time = "time"


def schedule(
    cases: Cases,
    samples: Annotated[
        int | None, typer.Option(metavar="N", help="How many samples; else as the case says, or 8.")
    ] = None,
    design: Annotated[
        Design,
        typer.Option(help="Design of the run sheet: D, A or E-optimal, equal conversion or time."),
    ] = Design.D,
    settings: Settings = None,
    out: Out = None,
    replace_: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Choose the times of samples; leave a run sheet and the errors to expect.

    What is read, how well, and which numbers it is to find stand in the case under [plan.samples].
    With several cases, --out names the folder that holds a folder for each.
    """
    if samples is not None and not 1 <= samples <= MOST:
        raise InputError.at("--samples", f"{samples}", f"a number from 1 to {MOST}")
    kinds: dict[Design, Kinds] = {
        Design.D: "D",
        Design.A: "A",
        Design.E: "E",
        Design.conversion: "equal conversion",
        Design.time: "equal times",
    }
    arguments = [] if samples is None else ["--samples", str(samples)]
    arguments += [] if design is Design.D else ["--design", design.value]

    def work(case: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
        from meanfree.planning.schedule import schedule as find
        from meanfree.report.planning.schedule import schedule_document

        request = case.planning
        if samples is not None:
            request = replace(request, samples=replace(request.samples, count=samples))
        found = find(case.experiment, request, progress)
        return schedule_document(found, kinds[design], record, arguments)

    carry_out(
        "schedule",
        cases,
        settings,
        work,
        out=out,
        replace=replace_,
        as_json=as_json,
        quiet=quiet,
    )
