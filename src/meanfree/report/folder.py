"""What `run` leaves: summary, page, figures, tables and manifest, in one folder, whole or not."""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from pathlib import Path

from meanfree.files import MANIFEST, OWNER_KEY, fresh_folder
from meanfree.integrate.run import Run
from meanfree.report.figures import draw
from meanfree.report.kinetics import rate_constants
from meanfree.report.page import page
from meanfree.report.record import CaseRecord, versions
from meanfree.report.run_models import RunSummary
from meanfree.report.tables import tables


def owner_name(case_file: Path, folder: Path) -> str:
    """The name under which a folder belongs to a case: the way from the folder to the file.

    It stays true when both are moved together, and names no place of this machine.
    """
    real = os.path.realpath(case_file)
    try:
        return Path(os.path.relpath(real, os.path.realpath(folder))).as_posix()
    except ValueError:  # another drive
        return Path(real).as_posix()


def write_run(
    run: Run, summary: RunSummary, record: CaseRecord, folder: Path, *, owner: str, replace: bool
) -> list[Path]:
    """Write everything that a run leaves and return the paths, the page first.

    Raises `InputError` where the folder cannot be used, `ComputationError` for a full disk.
    """
    rows = rate_constants(run)
    texts: dict[str, str] = {"summary.json": summary.to_json()}
    texts |= tables(run, summary, rows)
    figures = draw(run, summary)
    texts |= {f"{name}.svg": svg for name, (svg, _) in figures.items()}
    vectors = {name: svg for name, (svg, _) in figures.items()}
    texts["report.html"] = page(run, summary, rows, record, vectors)
    texts[MANIFEST] = _manifest(summary, record, owner)
    images = {f"{name}.png": png for name, (_, png) in figures.items()}
    return leave(folder, texts, images, owner=owner, replace=replace)


def leave(
    folder: Path,
    texts: Mapping[str, str],
    images: Mapping[str, bytes],
    *,
    owner: str,
    replace: bool,
) -> list[Path]:
    """Write files by their names, all or none, and return the paths, the page first.

    ``texts`` holds the manifest. Raises as `write_run`.
    """
    with fresh_folder(folder, owner=owner, replace=replace) as new:
        for name, text in texts.items():
            (new / name).write_text(text, encoding="utf-8", newline="")
        for name, content in images.items():
            (new / name).write_bytes(content)
    order = ["report.html", "summary.json", *sorted({*texts, *images})]
    return [folder / name for name in dict.fromkeys(order)]


def _manifest(summary: RunSummary, record: CaseRecord, owner: str) -> str:
    content = {
        OWNER_KEY: owner,
        "case_sha256": record.sha256,
        "command": record.command_line("run"),
        "settings": dict(record.settings),
        "versions": versions(),
        "solver": summary.solver.model_dump(),
        "drift": summary.drift.model_dump(),
    }
    return json.dumps(content, indent=2, ensure_ascii=False) + "\n"
