"""What the commands that plan share: several cases, folders, the screen, progress."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import open_case, record_of, results_folder
from meanfree.errors import ComputationError, InputError, Problem

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.progress import Progress
    from meanfree.report.planning.document import Document
    from meanfree.report.record import CaseRecord

Cases = Annotated[list[Path], typer.Argument(metavar="CASE...", help="The case files.")]


PATIENCE = 1.0
"""Seconds before progress is shown."""


def carry_out(
    command: str,
    cases: list[Path],
    settings: list[str] | None,
    work: Callable[[LoadedCase, CaseRecord, Progress], Document],
    *,
    out: Path | None,
    replace: bool,
    as_json: bool,
    quiet: bool,
) -> None:
    """Do the work of a command for every case; print what it says, or its JSON, or the paths.

    Raises `InputError` for anything wrong with any case before any work is done, and
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
            text = _one(case, folder, work, replace=replace, as_json=as_json, quiet=quiet)
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
    folders = [
        results_folder(case, command, out if out is None or len(cases) == 1 else out / case.name)
        for case in cases
    ]
    problems = [
        Problem("CASE", f"{case.path}, whose results would also go to {folder}", "other names")
        for place, (case, folder) in enumerate(zip(cases, folders, strict=True))
        if folder in folders[:place]
    ]
    if problems:
        raise InputError(problems)
    return folders


def _one(
    case: LoadedCase,
    folder: Path,
    work: Callable[[LoadedCase, CaseRecord, Progress], Document],
    *,
    replace: bool,
    as_json: bool,
    quiet: bool,
) -> str:
    from meanfree.report.folder import owner_name
    from meanfree.report.planning.document import write_document

    record = record_of(case)
    progress = ScreenProgress()
    try:
        document = work(case, record, progress)
    finally:
        progress.close()
    owner = owner_name(case.path, folder)
    paths = write_document(document, record, folder, owner=owner, replace=replace)
    if as_json:
        return document.summary.rstrip()
    if quiet:
        return "\n".join(str(path) for path in paths)
    return told(document, folder)


def told(document: Document, folder: Path) -> str:
    """A document for the screen: the answers, what is grave, the table meant for it."""
    from rich.text import Text

    from meanfree.cli.screen import answers_grid, as_text, hanging, sheet_grid
    from meanfree.report import wording
    from meanfree.report.planning.document import GUIDANCE

    parts: list[object] = [Text(wording.clean(document.title), style="bold"), ""]
    parts.append(answers_grid(document.answers))
    if document.grave:
        parts.append("")
        parts += [hanging("Caution:", text) for text in document.grave]
    if document.screen is not None:
        parts += ["", sheet_grid(document.screen)]
    parts += ["", Text(f"{folder / 'report.html'} has the figures, tables and sources.")]
    parts.append(Text(GUIDANCE, style="dim"))
    return as_text(parts)  # type: ignore[arg-type]


class ScreenProgress:
    """Progress on one line of a terminal, once the work has taken a second; else nothing."""

    def __init__(self) -> None:
        self.started = time.monotonic()
        self.last = 0.0
        self.width = 0

    def __call__(self, done: float, total: float, note: str = "") -> None:
        """Say how far the work is."""
        now = time.monotonic()
        if not sys.stderr.isatty() or now - self.started < PATIENCE or now - self.last < 0.1:
            return
        self.last = now
        share = done / total if total else 0.0
        left = (now - self.started) * (1 - share) / share if share > 0 else 0.0
        text = f"{note} {100 * share:.0f} %, about {left:.0f} s left".strip()
        sys.stderr.write("\r" + text.ljust(self.width))
        sys.stderr.flush()
        self.width = len(text)

    def close(self) -> None:
        """Clear the line."""
        if self.width:
            sys.stderr.write("\r" + " " * self.width + "\r")
            sys.stderr.flush()
