"""What is found while a case is read: every problem, and notes on what was assumed."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass, field

from meanfree.errors import InputError, Problem
from meanfree.units import QuantityError

MOST = 300
"""Problems after which reading stops: nobody mends more in one go."""
LONGEST_KEY = 200
MOST_CHOICES = 40


@dataclass
class Findings:
    """Problems and notes in the order in which they were found."""

    problems: list[Problem] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    _said: set[Problem] = field(default_factory=set)
    _noted: set[str] = field(default_factory=set)

    def wrong(self, key: str, found: str, expected: str) -> None:
        """Add a problem, unless the same was said before.

        Raises `InputError` with all problems once there are more than `MOST`: a file that is no
        case at all would keep a reader busy for hours.
        """
        self.add(Problem(_short(key), found, expected))

    def add(self, *problems: Problem) -> None:
        """Add problems that were found elsewhere; as `wrong`."""
        for problem in problems:
            if problem in self._said:
                continue
            if len(self.problems) >= MOST:
                rest = Problem("", f"more than {MOST} problems", "these mended first")
                raise InputError([*self.problems, rest])
            self._said.add(problem)
            self.problems.append(problem)

    def refused(self, key: str, error: QuantityError) -> None:
        """Add what a quantity's reader says."""
        self.wrong(key, error.found, error.expected)

    def note(self, text: str) -> None:
        """Add a note, once."""
        if text not in self._noted:
            self._noted.add(text)
            self.notes.append(text)


def _short(key: str) -> str:
    """A key that a person can read; what was written as one may be a whole file."""
    if len(key) <= LONGEST_KEY:
        return key
    return f"{key[: LONGEST_KEY - 40]}… ({len(key)} characters)"


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """`` (did you mean "threshold"?)``, or nothing where no known word is near."""
    near = nearest(word, known)
    return f' (did you mean "{near}"?)' if near else ""


def nearest(word: str, known: Iterable[str]) -> str:
    """The known word that is nearest to ``word``, empty where none is near."""
    if len(word) > LONGEST_KEY:
        return ""
    words = list(known)
    folded = {w.lower(): w for w in words}
    close = difflib.get_close_matches(word, words, n=1, cutoff=0.6)
    return folded.get(word.lower()) or next(iter(close), "")


def one_of(words: Iterable[str]) -> str:
    """``one of "volume", "pressure"``; of very many the first ones."""
    listed = [f'"{word}"' for word in words]
    if len(listed) > MOST_CHOICES:
        listed[MOST_CHOICES:] = [f"{len(listed) - MOST_CHOICES} more"]
    return listed[0] if len(listed) == 1 else "one of " + ", ".join(listed)
