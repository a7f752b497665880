"""`meanfree compare CASE`: the kinetics beside collision theory and the collision limit."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out
from meanfree.cli.each_case import Cases

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

Of = Annotated[
    str | None,
    typer.Option("--run", metavar="NAME", help="The measured run to compare; default: the first."),
]
Diameters = Annotated[
    float,
    typer.Option(
        "--diameter-factor",
        metavar="FACTOR",
        min=1.0,
        max=3.0,
        help="Diameters are good to x/÷ this factor (one standard deviation).",
    ),
]


def compare(
    cases: Cases,
    run: Of = None,
    diameter_factor: Diameters = 1.1,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Set a case beside collision theory with P = 1 and beside every collision reacting.

    Where the case has data and says what to fit, the fitted kinetics stand in for the supplied
    ones and the readings lie over the curves.
    """

    def work(loaded: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
        return _work(loaded, record, run, diameter_factor)

    carry_out(
        "compare", cases, settings, work, out=out, replace=replace, as_json=as_json, quiet=quiet
    )


def _work(
    case: LoadedCase, record: CaseRecord, name: str | None, diameter_factor: float
) -> Document:
    from meanfree.case.measurements import measurements_of
    from meanfree.errors import InputError
    from meanfree.measured.comparison import compare as compared
    from meanfree.measured.fitting import fit
    from meanfree.report.measured.compare_document import compare_document

    found = measurements_of(case, needed=name is not None)
    timed = [run for run in found.runs if not run.readings.signal.is_rate_constant]
    names = [run.name for run in timed]
    if name is not None and name not in names:
        raise InputError.at("--run", f'"{name}"', f"one of {', '.join(names)}")
    fitted = fit(found.request) if found.request.asked else None
    if not timed:
        own = compared(case.experiment, None, 0, diameter_factor)
        return compare_document(own, (), record)
    chosen = timed[0 if name is None else names.index(name)]
    place = found.runs.index(chosen)
    same = [run for run in timed if run.conditions == chosen.conditions]
    own = compared(chosen.experiment, fitted, place, diameter_factor)
    return compare_document(own, same, record)
