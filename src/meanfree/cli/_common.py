"""The arguments that commands share, and how a case is opened from them."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.errors import InputError

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.report.record import CaseRecord

CasePath = Annotated[Path, typer.Argument(metavar="CASE", help="The case file.")]
AsJson = Annotated[
    bool, typer.Option("--json", help="Print the summary as JSON, and nothing else.")
]
Quiet = Annotated[bool, typer.Option("--quiet", help="Print the paths written, and nothing else.")]
Out = Annotated[
    Path | None,
    typer.Option("--out", metavar="FOLDER", help="Where the results go, instead of outputs/."),
]
Replace = Annotated[
    bool, typer.Option("--replace", help="Give up the results of another case in that folder.")
]
Settings = Annotated[
    list[str] | None,
    typer.Option(
        "--set",
        metavar="ADDRESS=VALUE",
        help="Another value for this time, such as temperature.value='500 K'. May be repeated.",
    ),
]


def open_case(path: Path, settings: list[str] | None, *, files: bool = False) -> LoadedCase:
    """Load a case with its ``--set`` values; with ``files`` look into those it names too.

    Raises `InputError` with every problem.
    """
    from meanfree.case import load_case
    from meanfree.case.settings import split_settings

    wanted, findings = split_settings(settings or [])
    if not findings.problems:
        return load_case(path, wanted, files=files)
    try:
        load_case(path, wanted, files=files)
    except InputError as error:
        raise InputError([*findings.problems, *error.problems]) from None
    raise InputError(findings.problems)


def record_of(case: LoadedCase) -> CaseRecord:
    """What a report says about a case; no place of this machine is in it."""
    from meanfree.report.record import CaseRecord, portable

    return CaseRecord(case.name, portable(case.path), case.text, case.hash, case.settings)


def results_folder(case: LoadedCase, command: str, out: Path | None) -> Path:
    """Where a command leaves its results: ``outputs/<case>/<command>``, or what --out names."""
    return out if out is not None else Path("outputs") / case.name / command
