"""Columns of numbers out of a text file: any delimiter, decimal comma, headings, comments.

Nothing is guessed that could change a number: a comma inside one is refused until the case says
that it is the decimal mark, and every refusal names the line and the column.
"""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import islice
from pathlib import Path

from meanfree.errors import Problem
from meanfree.units.gate import quoted

LARGEST = 1 << 24  # bytes: a million readings, which a logger at 1 Hz takes in twelve days
MOST_LINES = 1_000_000
MOST_CELLS = 4_000_000  # held in memory as text, some 300 MB
LONGEST_NUMBER = 100  # characters
MOST_PROBLEMS = 20
_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_DELIMITERS = ("\t", ";", ",", "|")
_COMMENTS = ("#", "%")
_FEWER = "fewer readings, thinned out"
NAMES = {"\t": "tab", ";": "semicolon", ",": "comma", "|": "bar", " ": "blanks"}


@dataclass(frozen=True)
class Layout:
    """How a file is written. Empty ``delimiter``: found from the lines; a blank: any white space.

    ``skip`` lines stand before the table; ``heading`` counts its heading lines, of which the first
    has the names (None: one, where a column is called by name or its first cell is no number).
    """

    delimiter: str = ""
    decimal: str = "."
    skip: int = 0
    heading: int | None = None


@dataclass(frozen=True)
class Cells:
    """The table of a file as text: ``heading`` names, and rows with the line each stood on."""

    heading: tuple[str, ...]
    rows: tuple[tuple[int, tuple[str, ...]], ...]
    delimiter: str


def content_of(path: Path) -> bytes | Problem:
    """The bytes of a file, or why there are none: never of a pipe or a device, never too many."""
    try:
        if path.is_dir():
            return Problem("", "a folder", "a file of readings")
        if not path.exists():
            return Problem("", "no such file", "a file beside the case file")
        if not path.is_file():
            return Problem("", "something that is no file", "a file of readings")
        with path.open("rb") as file:
            return file.read(LARGEST + 1)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "a name that no file can have"
        return Problem("", f"what cannot be read ({reason})", "a file that can be read")


def decoded(content: bytes) -> str | Problem:
    """Text of a file's bytes, or what is wrong with them."""
    if len(content) > LARGEST:
        size = f"{LARGEST >> 20} MiB"
        return Problem("", f"a file larger than {size}", f"one of at most {size}: {_FEWER}")
    encoding = "utf-16" if content.startswith((b"\xff\xfe", b"\xfe\xff")) else "utf-8-sig"
    try:
        text = content.decode(encoding)
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        return Problem(f"line {line}", "bytes that are not UTF-8", "a text file in UTF-8")
    if "\0" in text:
        line = text[: text.index("\0")].count("\n") + 1
        return Problem(f"line {line}", "a zero byte", "a text file")
    return text


def cells_of(text: str, layout: Layout, wanted: Sequence[str | int]) -> Cells | Problem:
    """The table in a text. ``wanted`` are the columns that will be asked for."""
    every = text.splitlines()
    if len(every) > MOST_LINES:
        return Problem("", f"{len(every)} lines", f"at most {MOST_LINES}: {_FEWER}")
    lines = [
        (place, line)
        for place, line in enumerate(every, start=1)
        if place > layout.skip and line.strip() and not line.lstrip().startswith(_COMMENTS)
    ]
    if not lines:
        return Problem("", "no line that is not blank or a comment", "a table of readings")
    delimiter = layout.delimiter or _delimiter([line for _, line in lines], layout.decimal)
    table: list[tuple[int, list[str]]] = []
    cells = 0
    for place, line in lines:
        row = _split(line, delimiter)
        table.append((place, row))
        cells += len(row)
        if cells > MOST_CELLS:
            found = f"more than {MOST_CELLS} cells up to here"
            return Problem(f"line {place}", found, "fewer columns, or fewer lines")
    count = layout.heading
    if count is None:
        count = 0 if _is_data(table[0][1], layout, wanted) else 1
    if count >= len(table):
        return Problem("", f"{len(table)} lines, all of them heading", "lines of readings")
    heading = tuple(table[0][1]) if count else ()
    return Cells(heading, tuple((place, tuple(row)) for place, row in table[count:]), delimiter)


def _is_data(row: Sequence[str], layout: Layout, wanted: Sequence[str | int]) -> bool:
    """True where the first line holds numbers and no names."""
    if any(isinstance(column, str) for column in wanted):
        return False
    places = [column - 1 for column in wanted if isinstance(column, int) and column <= len(row)]
    return any(number(row[place], layout.decimal) is not None for place in places)


def _delimiter(lines: Sequence[str], decimal: str) -> str:
    """The first delimiter that every line has equally often; white space where none does."""
    for delimiter in _DELIMITERS:
        if delimiter == decimal:
            continue
        counts = {len(_split(line, delimiter)) for line in lines[:50]}
        if len(counts) == 1 and counts.pop() > 1:
            return delimiter
    for delimiter in _DELIMITERS:
        if delimiter != decimal and sum(delimiter in line for line in lines[:50]) > len(lines) / 2:
            return delimiter
    return " "


def _split(line: str, delimiter: str) -> list[str]:
    if delimiter == " ":
        return line.split()
    try:
        row = next(csv.reader(io.StringIO(line), delimiter=delimiter), [])
    except csv.Error:  # a cell longer than the reader's limit: no number in any case
        row = line.split(delimiter)
    return [cell.strip() for cell in row]


def number(text: str, decimal: str = ".") -> float | None:
    """A number as a person writes it, None for anything else.

    >>> number("1.5e3"), number("1,5", decimal=","), number("1,5"), number("nan")
    (1500.0, 1.5, None, None)
    """
    if len(text) > LONGEST_NUMBER:
        return None
    plain = text.strip().replace("\N{MINUS SIGN}", "-")
    if decimal == ",":
        if "." in plain:
            return None
        plain = plain.replace(",", ".", 1)
    if _NUMBER.fullmatch(plain) is None:
        return None
    value = float(plain)
    return value if math.isfinite(value) else None


@dataclass(frozen=True)
class Column:
    """The numbers of one column and the lines on which they stood."""

    name: str
    values: tuple[float, ...]
    lines: tuple[int, ...]


def column(
    cells: Cells, wanted: str | int, layout: Layout, key: str
) -> tuple[Column | None, list[Problem]]:
    """One column by its name or number; ``key`` is where the case asks for it."""
    place = _place(cells, wanted, key)
    if isinstance(place, Problem):
        return None, [place]
    name = cells.heading[place] if place < len(cells.heading) else f"{place + 1}"
    values: list[float] = []
    lines: list[int] = []

    def unreadable() -> Iterator[Problem]:
        for line, row in cells.rows:
            text = row[place] if place < len(row) else ""
            value = number(text, layout.decimal)
            if value is None:
                yield _no_number(f"line {line}, column {name}", text, row, place, layout)
            else:
                values.append(value)
                lines.append(line)

    problems = first_few(unreadable(), f"column {name}", "numbers")
    return Column(name, tuple(values), tuple(lines)), problems


def first_few(problems: Iterable[Problem], key: str, expected: str) -> list[Problem]:
    """The first of many problems of one kind, and how many more there are."""
    pending = iter(problems)
    few = list(islice(pending, MOST_PROBLEMS))
    more = sum(1 for _ in pending)
    return [*few, Problem(key, f"{more} more of that kind", expected)] if more else few


def _no_number(where: str, text: str, row: Sequence[str], place: int, layout: Layout) -> Problem:
    if not text:
        found = f"{len(row)} cells" if place >= len(row) else "an empty cell"
        return Problem(where, found, "a number; a comment (#) takes a line out")
    if "," in text and layout.decimal == "." and number(text, ",") is not None:
        return Problem(where, f"{quoted(text)}, with a comma", 'a decimal point, or decimal = ","')
    if "." in text and layout.decimal == "," and number(text) is not None:
        return Problem(where, f"{quoted(text)}, with a point", 'a decimal comma, or decimal = "."')
    return Problem(where, quoted(text), "a number")


def _place(cells: Cells, wanted: str | int, key: str) -> int | Problem:
    widest = max(len(row) for _, row in cells.rows)
    if isinstance(wanted, int):
        if 1 <= wanted <= widest:
            return wanted - 1
        return Problem(key, f"column {wanted}", f"a column from 1 to {widest}")
    hits = [place for place, name in enumerate(cells.heading) if name == wanted]
    if len(hits) == 1:
        return hits[0]
    if hits:
        numbers = " or ".join(str(hit + 1) for hit in hits)
        return Problem(
            key, f"{quoted(wanted)}, a name of {len(hits)} columns", f"its number, {numbers}"
        )
    names = ", ".join(quoted(name) for name in cells.heading[:20])
    return Problem(key, f"{quoted(wanted)}, which heads no column", f"one of {names}, or a number")
