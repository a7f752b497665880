"""What every report is made of: answers in a line each, and tables whose cells are text.

The screen and the page show the same ones; nothing here computes.
"""

from __future__ import annotations

from dataclasses import dataclass

Row = list[str]
NONE = "–"
"""What stands where there is no value."""


@dataclass(frozen=True)
class Answer:
    """One question and its answer; ``note`` says what goes with it."""

    question: str
    answer: str
    note: str = ""


@dataclass(frozen=True)
class Sheet:
    """A table: heading, rows, and which columns hold words rather than numbers."""

    heading: Row
    rows: list[Row]
    words: tuple[int, ...] = (0,)
