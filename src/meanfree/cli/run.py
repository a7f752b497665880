"""`meanfree run CASE`: concentrations against time, the short answer first."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import (
    AsJson,
    Out,
    Quiet,
    Replace,
    Settings,
    open_case,
    record_of,
    results_folder,
)
from meanfree.errors import ComputationError, InputError, Problem

if TYPE_CHECKING:
    from meanfree.case import LoadedCase

Cases = Annotated[list[Path], typer.Argument(metavar="CASE...", help="The case files.")]


def run(
    cases: Cases,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
    check_twice: Annotated[
        bool,
        typer.Option(
            "--verify", help="Repeat with a second method at a tenth of the tolerance, and compare."
        ),
    ] = False,
) -> None:
    """Predict concentrations against time; leave figures, tables and a page.

    With several cases, --out names the folder that holds a folder for each.
    """
    from meanfree.files import refuse_if_taken
    from meanfree.report.folder import owner_name

    loaded = _open_all(cases, settings)
    targets = _targets(loaded, out)
    for case, folder in zip(loaded, targets, strict=True):
        refuse_if_taken(folder, owner=owner_name(case.path, folder), replace=replace)
    failures: list[str] = []
    texts: list[str] = []
    for place, (case, folder) in enumerate(zip(loaded, targets, strict=True)):
        try:
            text = _one(
                case,
                folder,
                replace=replace,
                as_json=as_json,
                quiet=quiet,
                check_twice=check_twice,
            )
        except ComputationError as error:
            failures.append(f"{case.path}: {error}" if len(loaded) > 1 else str(error))
            continue
        if as_json:
            texts.append(text)
        elif quiet:
            typer.echo(text)
        else:
            typer.echo(("\n" if place else "") + text)
    if as_json and texts:
        typer.echo(texts[0] if len(loaded) == 1 else f"[{', '.join(texts)}]")
    if failures:
        raise ComputationError("\n".join(failures))


def _open_all(cases: list[Path], settings: list[str] | None) -> list[LoadedCase]:
    """Every case, or every problem of every case in one go."""
    loaded: list[LoadedCase] = []
    problems: list[Problem] = []
    for path in cases:
        try:
            loaded.append(open_case(path, settings))
        except InputError as error:
            problems += error.problems
    if problems:
        raise InputError(problems)
    return loaded


def _targets(cases: list[LoadedCase], out: Path | None) -> list[Path]:
    """A folder for each case. Raises `InputError` where two cases would share one."""
    folders = [
        results_folder(case, "run", out if out is None or len(cases) == 1 else out / case.name)
        for case in cases
    ]
    problems = [
        Problem(
            "CASE",
            f"{case.path}, whose results would also go to {folder}",
            "cases whose files have different names",
        )
        for place, (case, folder) in enumerate(zip(cases, folders, strict=True))
        if folder in folders[:place]
    ]
    if problems:
        raise InputError(problems)
    return folders


def _one(
    case: LoadedCase,
    folder: Path,
    *,
    replace: bool,
    as_json: bool,
    quiet: bool,
    check_twice: bool,
) -> str:
    """Run one case, leave its folder, and return what to print."""
    from meanfree.integrate.single import integrate
    from meanfree.integrate.verify import verify
    from meanfree.report.folder import owner_name, write_run
    from meanfree.report.summary import summarise

    record = record_of(case)
    result = integrate(case.experiment)
    summary = summarise(
        result,
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        verification=verify(result) if check_twice else None,
    )
    owner = owner_name(case.path, folder)
    paths = write_run(result, summary, record, folder, owner=owner, replace=replace)
    if as_json:
        return summary.to_json().rstrip()
    if quiet:
        return "\n".join(str(path) for path in paths)
    from meanfree.cli.told import told

    return told(result, summary, folder)
