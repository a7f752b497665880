"""Several cases after one another: all of them looked at before any is computed."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import open_case, results_folder
from meanfree.errors import ComputationError, InputError, Problem

if TYPE_CHECKING:
    from meanfree.case import LoadedCase

Cases = Annotated[list[Path], typer.Argument(metavar="CASE...", help="The case files.")]


def for_each_case(
    command: str,
    cases: list[Path],
    settings: list[str] | None,
    one: Callable[[LoadedCase, Path], str],
    *,
    out: Path | None,
    replace: bool,
    as_json: bool,
    quiet: bool,
) -> None:
    """Call ``one`` with every case and its folder, and print what it returns.

    Raises `InputError` for anything wrong with any case or folder before any work is done, and
    `ComputationError` for those that failed after all others are done.
    """
    from meanfree.files import refuse_if_taken
    from meanfree.report.folder import owner_name

    loaded = _open_all(cases, settings)
    folders = _folders(command, loaded, out)
    for case, folder in zip(loaded, folders, strict=True):
        refuse_if_taken(folder, owner=owner_name(case.path, folder), replace=replace)
    texts: list[str] = []
    failures: list[str] = []
    for place, (case, folder) in enumerate(zip(loaded, folders, strict=True)):
        try:
            text = one(case, folder)
        except ComputationError as error:
            failures.append(f"{case.path}: {error}" if len(loaded) > 1 else str(error))
            continue
        if as_json:
            texts.append(text)
        else:
            typer.echo(("\n" if place and not quiet else "") + text)
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


def _folders(command: str, cases: list[LoadedCase], out: Path | None) -> list[Path]:
    """A folder for each case. Raises `InputError` where two cases would share one."""
    folders = [
        results_folder(case, command, out if out is None or len(cases) == 1 else out / case.name)
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
