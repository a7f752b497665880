"""`meanfree fit CASE`: rate constants from measured runs, with their intervals."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, CasePath, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.measured.evidence import Candidate
    from meanfree.measured.fits import Fit
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

Against = Annotated[
    list[Path] | None,
    typer.Option(
        "--against",
        metavar="CASE",
        help="Another case with the same data, ranked beside it. May be repeated.",
    ),
]
Write = Annotated[
    Path | None,
    typer.Option("--write", metavar="FILE", help="Write a new case with the fitted values."),
]


def fit(
    case: CasePath,
    against: Against = None,
    write: Write = None,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Fit rate constants and other numbers to measured runs.

    The tables [[data]] name the readings, [fit] what to find from them.
    """

    def work(loaded: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
        return _work(loaded, record, against or [], write, replace=replace)

    carry_out("fit", [case], settings, work, out=out, replace=replace, as_json=as_json, quiet=quiet)


def _work(
    case: LoadedCase,
    record: CaseRecord,
    against: list[Path],
    write: Path | None,
    *,
    replace: bool,
) -> Document:
    from meanfree.case.measurements import measurements_of
    from meanfree.case.written import refuse_target, write_fitted
    from meanfree.measured.analyses import analyse
    from meanfree.report.measured.fit_document import fit_document
    from meanfree.report.record import portable

    if write is not None:
        refuse_target(write, case, replace=replace)
    measurements = measurements_of(case)
    others = [_other(path, measurements) for path in against]
    found = analyse(measurements.plan)
    ranking = _ranked(case.name, found.fit, others) if others else ()
    arguments = [word for path in against for word in ("--against", portable(path))]
    if write is not None:
        if found.fit is None:
            from meanfree.errors import InputError

            raise InputError.at("--write", "a case whose [fit] has no parameters", "parameters")
        write_fitted(case, found.fit, write)
        arguments += ["--write", portable(write)]
    return fit_document(found, record, ranking, tuple(arguments))


def _other(path: Path, measurements: object) -> tuple[str, object]:
    """Another case, whose readings must be the same ones."""
    from meanfree.case import load_case
    from meanfree.case.measurements import Measurements, measurements_of
    from meanfree.errors import InputError

    assert isinstance(measurements, Measurements)
    case = load_case(path)
    own = measurements_of(case)
    if not own.request.asked:
        raise InputError.at("--against", f"{path}, whose [fit] has no parameters", "parameters")
    same = len(own.runs) == len(measurements.runs) and all(
        one.readings.file == other.readings.file
        and one.readings.signal.kind == other.readings.signal.kind
        and list(one.readings.values) == list(other.readings.values)
        and list(one.readings.times) == list(other.readings.times)
        for one, other in zip(own.runs, measurements.runs, strict=False)
    )
    if not same:
        raise InputError.at("--against", f"{path}, whose data are others", "the same [[data]]")
    return case.name, own.request


def _ranked(name: str, own: Fit | None, others: list[tuple[str, object]]) -> tuple[Candidate, ...]:
    from meanfree.errors import InputError
    from meanfree.measured.evidence import ranked
    from meanfree.measured.fits import FitRequest
    from meanfree.measured.fitting import fit as fit_request

    if own is None:
        raise InputError.at("--against", "a case whose [fit] has no parameters", "parameters")
    fits = [(name, own)]
    for other, request in others:
        assert isinstance(request, FitRequest)
        fits.append((other, fit_request(request)))
    return ranked(fits)
