"""What `equations` leaves: the sheet as LaTeX, as one page, as text, and as a summary."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Literal

from jinja2 import Environment, PackageLoader, StrictUndefined, select_autoescape
from markupsafe import Markup
from pydantic import BaseModel, ConfigDict, Field

from meanfree.equations.typeset import EquationSheet
from meanfree.equations.typeset.latex import escape
from meanfree.files import MANIFEST, OWNER_KEY, fresh_folder
from meanfree.report.record import CaseRecord, versions


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class EquationAnswer(_Record):
    """One formula as text and as LaTeX, what kind it is, and a remark."""

    kind: str
    text: str
    latex: str
    remark: str


class EquationGroup(_Record):
    """Formulas under a heading."""

    heading: str
    entries: list[EquationAnswer]


class EquationSummary(_Record):
    """`summary.json` of the command `equations`."""

    schema_: Literal["meanfree-equations-1"] = Field(
        default="meanfree-equations-1", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    groups: list[EquationGroup]


def write_equations(
    sheet: EquationSheet,
    full: EquationSheet,
    record: CaseRecord,
    folder: Path,
    *,
    owner: str,
    replace: bool,
) -> tuple[str, list[Path]]:
    """Write the folder; return the summary as JSON and the paths, the page first.

    ``full`` is the whole sheet where ``sheet`` shows only a part of a large mechanism. Raises
    `InputError` where the folder cannot be used, `ComputationError` for a full disk.
    """
    summary = summarise(full, record)
    manifest = {
        OWNER_KEY: owner,
        "case_sha256": record.sha256,
        "command": record.command_line("equations"),
        "settings": dict(record.settings),
        "versions": versions(),
    }
    texts = {
        "equations.html": page(sheet, record),
        "equations.tex": latex(full),
        "equations.txt": f"{full.title}\n\n{full.text}",
        "summary.json": summary + "\n",
        MANIFEST: json.dumps(manifest, indent=2, ensure_ascii=False) + "\n",
    }
    with fresh_folder(folder, owner=owner, replace=replace) as new:
        for name, text in texts.items():
            (new / name).write_text(text, encoding="utf-8", newline="")
    return summary, [folder / name for name in texts]


def summarise(sheet: EquationSheet, record: CaseRecord) -> str:
    """The sheet as JSON."""
    groups = [
        EquationGroup(
            heading=group.heading,
            entries=[
                EquationAnswer(kind=e.kind, text=e.text, latex=e.latex, remark=e.remark)
                for e in group.entries
            ],
        )
        for group in sheet.groups
    ]
    return EquationSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=sheet.title,
        groups=groups,
    ).model_dump_json(indent=2, by_alias=True)


def page(sheet: EquationSheet, record: CaseRecord) -> str:
    """The sheet as one HTML file; formulas as text where there are too many to set."""
    environment = Environment(
        loader=PackageLoader("meanfree.report", "templates"),
        autoescape=select_autoescape(default=True, default_for_string=True),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    groups = [
        (
            group.heading,
            [
                (None if sheet.as_text_only else Markup(entry.mathml), entry)
                for entry in group.entries
            ],
        )
        for group in sheet.groups
    ]
    text: str = environment.get_template("equations.html.j2").render(
        title=sheet.title,
        remark=sheet.remark,
        groups=groups,
        command=record.command_line("equations"),
        file=record.file,
        version=record.version,
    )
    return text


def latex(sheet: EquationSheet) -> str:
    """The sheet as a LaTeX document that needs amsmath and nothing else."""
    lines = [
        r"\documentclass{article}",
        r"\usepackage{amsmath}",
        r"\allowdisplaybreaks",
        r"\begin{document}",
        rf"\section*{{{escape(sheet.title)}}}",
    ]
    for group in sheet.groups:
        lines.append(rf"\subsection*{{{escape(group.heading)}}}")
        for entry in group.entries:
            remark = rf"\quad\text{{\footnotesize {escape(entry.remark)}}}"
            short = len(entry.text) + len(entry.remark) < 70
            lines.append(r"\[")
            lines.append(entry.latex + (remark if entry.remark and short else ""))
            lines.append(r"\]")
            if entry.remark and not short:
                lines.append(rf"{{\footnotesize\noindent {escape(entry.remark)}\par}}")
    lines.append(r"\end{document}")
    return "\n".join(lines) + "\n"
