"""What most commands leave: answers first, then figures, tables and how to repeat it.

A `Document` is complete text; the page and the screen show the same one.
"""

from __future__ import annotations

import json
import shlex
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

from meanfree.files import MANIFEST, OWNER_KEY
from meanfree.report import wording
from meanfree.report.cautions import GUIDANCE
from meanfree.report.folder import leave
from meanfree.report.page import inlined, templates
from meanfree.report.record import CaseRecord, versions
from meanfree.report.rows import Answer, Sheet


@dataclass(frozen=True)
class Drawing:
    """A figure: its name, SVG text, PNG bytes and caption."""

    name: str
    svg: str
    png: bytes
    caption: str


@dataclass(frozen=True)
class Section:
    """A part of the page: sentences, figures, then tables with their captions."""

    heading: str
    texts: tuple[str, ...] = ()
    drawings: tuple[Drawing, ...] = ()
    sheets: tuple[tuple[Sheet, str], ...] = ()


@dataclass(frozen=True)
class Document:
    """Everything that a command says of a case.

    ``arguments`` are those after the case file, as they must be given to repeat it; ``summary`` is
    the text of `summary.json`; ``screen`` is a table for the screen; ``tables`` maps file names
    to CSV text; ``work`` says what was computed, for the manifest.
    """

    command: str
    title: str
    subtitle: str
    answers: tuple[Answer, ...]
    summary: str
    grave: tuple[str, ...] = ()
    sections: tuple[Section, ...] = ()
    notes: tuple[str, ...] = ()
    arguments: tuple[str, ...] = ()
    screen: Sheet | None = None
    tables: Mapping[str, str] = field(default_factory=dict)
    work: Mapping[str, object] = field(default_factory=dict)

    def command_line(self, record: CaseRecord) -> str:
        """The line that repeats it."""
        return shlex.join([*shlex.split(record.command_line(self.command)), *self.arguments])

    @property
    def drawings(self) -> tuple[Drawing, ...]:
        """Every figure in the order of the page."""
        return tuple(drawing for section in self.sections for drawing in section.drawings)


def write_document(
    document: Document, record: CaseRecord, folder: Path, *, owner: str, replace: bool
) -> list[Path]:
    """Write everything and return the paths, the page first.

    Raises `InputError` where the folder cannot be used, `ComputationError` for a full disk.
    """
    texts = {"summary.json": document.summary, "report.html": page(document, record)}
    texts |= document.tables
    texts |= {f"{drawing.name}.svg": drawing.svg for drawing in document.drawings}
    manifest = {
        OWNER_KEY: owner,
        "case_sha256": record.sha256,
        "command": document.command_line(record),
        "settings": dict(record.settings),
        "versions": versions(),
        **document.work,
    }
    texts[MANIFEST] = json.dumps(manifest, indent=2, ensure_ascii=False) + "\n"
    images = {f"{drawing.name}.png": drawing.png for drawing in document.drawings}
    return leave(folder, texts, images, owner=owner, replace=replace)


def page(document: Document, record: CaseRecord) -> str:
    """The page as HTML."""
    text: str = (
        templates()
        .get_template("document.html.j2")
        .render(
            title=wording.clean(document.title),
            subtitle=wording.clean(document.subtitle),
            origin=f"meanfree {record.version}, {document.command} of {wording.clean(record.file)}",
            answers=document.answers,
            grave=document.grave,
            sections=[
                {
                    "heading": section.heading,
                    "texts": section.texts,
                    "sheets": section.sheets,
                    "drawings": [
                        {
                            "name": drawing.name,
                            "svg": inlined(drawing.svg, drawing.name, drawing.caption),
                            "caption": drawing.caption,
                        }
                        for drawing in section.drawings
                    ],
                }
                for section in document.sections
            ],
            notes=[*document.notes, GUIDANCE],
            command=document.command_line(record),
            sha256=record.sha256,
            versions=", ".join(f"{name} {version}" for name, version in versions().items()),
            settings=[f"{address} = {value}" for address, value in record.settings.items()],
            file=wording.clean(record.file),
            case_text="\n".join(
                wording.clean(line.expandtabs(4))
                for line in record.text.replace("\r\n", "\n").split("\n")
            ),
        )
    )
    return text
