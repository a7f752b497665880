"""What the commands that leave a document share: folders, the screen, progress."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from meanfree.cli._common import record_of
from meanfree.cli.each_case import for_each_case

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

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

    Raises as `for_each_case`.
    """

    def one(case: LoadedCase, folder: Path) -> str:
        return _one(case, folder, work, replace=replace, as_json=as_json, quiet=quiet)

    for_each_case(
        command, cases, settings, one, out=out, replace=replace, as_json=as_json, quiet=quiet
    )


def _one(
    case: LoadedCase,
    folder: Path,
    work: Callable[[LoadedCase, CaseRecord, Progress], Document],
    *,
    replace: bool,
    as_json: bool,
    quiet: bool,
) -> str:
    from meanfree.report.document import write_document
    from meanfree.report.folder import owner_name

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
    from meanfree.report.cautions import GUIDANCE

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
