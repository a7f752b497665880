"""Words and tables for the screen: styled where it is one, plain where output goes elsewhere."""

from __future__ import annotations

import io
from collections.abc import Iterable, Sequence

from rich.cells import cell_len
from rich.console import Console, RenderableType
from rich.table import Table
from rich.text import Text

from meanfree.report.rows import Answer, Sheet

_UNBOUNDED = 10_000

_READABLE = 24
"""Letters that words which wrap are given in a line at least."""


def as_text(parts: Iterable[RenderableType]) -> str:
    """What stands on the screen, part under part.

    A part that needs more than a narrow screen has is left to the terminal to break: cut off, it
    would lose its numbers.
    """
    out = io.StringIO()
    screen = Console()
    console = Console(
        file=out,
        force_terminal=screen.is_terminal,
        color_system=screen.color_system if screen.is_terminal else None,  # type: ignore[arg-type]
        width=screen.width,
        highlight=False,
        markup=False,
        emoji=False,
    )
    for part in parts:
        console.width = _UNBOUNDED
        needed = console.measure(part).minimum
        console.width = max(screen.width, needed)
        console.print(part)
    return "\n".join(line.rstrip() for line in out.getvalue().rstrip().split("\n"))


def answers_grid(answers: Sequence[Answer]) -> Table:
    """Questions on the left, answers on the right."""
    grid = Table.grid(padding=(0, 2))
    grid.add_column(no_wrap=True, min_width=_widest([entry.question for entry in answers]))
    grid.add_column(min_width=_READABLE)
    for entry in answers:
        line = Text(entry.answer, style="bold")
        if entry.note:
            line.append(f"  {entry.note}", style="not bold")
        grid.add_row(Text(entry.question), line)
    return grid


def sheet_grid(sheet: Sheet) -> Table:
    """A table without lines; its last column of words wraps, nothing else does."""
    grid = Table(box=None, padding=(0, 2, 0, 0), show_edge=False, header_style="bold")
    last = len(sheet.heading) - 1
    for place, heading in enumerate(sheet.heading):
        words = place in sheet.words
        wraps = words and place == last
        widest = _widest([heading, *(row[place] for row in sheet.rows)])
        grid.add_column(
            Text(heading),
            justify="left" if words else "right",
            no_wrap=not wraps,
            overflow="fold",
            min_width=min(widest, _READABLE) if wraps else widest,
        )
    for row in sheet.rows:
        grid.add_row(*(Text(cell) for cell in row))
    return grid


def hanging(head: str, body: str | Text) -> Table:
    """Text whose further lines are set in."""
    grid = Table.grid(padding=(0, 1, 0, 0))
    grid.add_column(no_wrap=True, min_width=_widest([head]))
    grid.add_column(min_width=_READABLE)
    grid.add_row(Text(head), body if isinstance(body, Text) else Text(body))
    return grid


def _widest(cells: Sequence[str]) -> int:
    return max((cell_len(cell) for cell in cells), default=0)
