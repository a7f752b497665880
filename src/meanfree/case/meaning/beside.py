"""Files that a case names: inside its own folder, links followed, and nowhere else."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from meanfree.case.findings import Findings
from meanfree.errors import Problem
from meanfree.measured.delimited import content_of, decoded
from meanfree.units.gate import quoted


def file_beside(
    text: str | None, key: str, case_file: Path, findings: Findings, example: str = "run1.csv"
) -> Path | None:
    """The file that ``text`` names; None, and a problem, where it leads out of the folder."""
    if text is None:
        return None
    inside = f"a file inside the case file's folder, such as {example}"
    folder = case_file.parent.resolve()
    if not text.isprintable() or Path(text).is_absolute() or "\\" in text:
        findings.wrong(key, quoted(text), inside)
        return None
    try:
        path = (folder / text).resolve()
    except (OSError, ValueError, RuntimeError):
        findings.wrong(key, quoted(text), inside)
        return None
    if not path.is_relative_to(folder) or path == folder:
        findings.wrong(key, f"{quoted(text)}, which is outside the case file's folder", inside)
        return None
    return path


def look_at_files(tables: dict[str, Any], case_file: Path, findings: Findings) -> None:
    """Whether the files that a case names can be read at all; their columns are not looked at.

    For a case whose experiment is wrong, so that its readings cannot be held against it.
    """
    data = tables.get("data")
    for place, table in enumerate(data if isinstance(data, list) else []):
        if not isinstance(table, dict):
            continue
        _look(table, f"data.{place}", case_file, findings)
        if isinstance(table.get("blank"), dict):
            _look(table["blank"], f"data.{place}.blank", case_file, findings)
    if isinstance(tables.get("sweep"), dict):
        _look(tables["sweep"], "sweep", case_file, findings)


def _look(table: dict[str, Any], key: str, case_file: Path, findings: Findings) -> None:
    name = table.get("file")
    if not isinstance(name, str) or not name.strip():
        return
    path = file_beside(name.strip(), f"{key}.file", case_file, findings)
    if path is None:
        return
    content = content_of(path)
    text = content if isinstance(content, Problem) else decoded(content)
    if isinstance(text, Problem):
        findings.add(text.inside(name.strip()))
