"""What is found while a case is read: every problem, and notes on what was assumed."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass, field

from meanfree.errors import Problem
from meanfree.units import QuantityError


@dataclass
class Findings:
    """Problems and notes in the order in which they were found."""

    problems: list[Problem] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)

    def wrong(self, key: str, found: str, expected: str) -> None:
        """Add a problem, unless the same was said before."""
        problem = Problem(key, found, expected)
        if problem not in self.problems:
            self.problems.append(problem)

    def refused(self, key: str, error: QuantityError) -> None:
        """Add what a quantity's reader says."""
        self.wrong(key, error.found, error.expected)

    def note(self, text: str) -> None:
        """Add a note, once."""
        if text not in self.notes:
            self.notes.append(text)


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """`` (did you mean "threshold"?)``, or nothing where no known word is near."""
    near = nearest(word, known)
    return f' (did you mean "{near}"?)' if near else ""


def nearest(word: str, known: Iterable[str]) -> str:
    """The known word that is nearest to ``word``, empty where none is near."""
    words = list(known)
    folded = {w.lower(): w for w in words}
    close = difflib.get_close_matches(word, words, n=1, cutoff=0.6)
    return folded.get(word.lower()) or next(iter(close), "")


def one_of(words: Iterable[str]) -> str:
    """``one of "volume", "pressure"``."""
    listed = [f'"{word}"' for word in words]
    return listed[0] if len(listed) == 1 else "one of " + ", ".join(listed)
