"""What can go wrong, as values.

A `Problem` says what was found, where, and what would be right. Input errors
carry every problem found, so that a reader mends a file once and not ten times.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong with an input.

    ``key`` is the address in the words of the file (``steps.decomposition.Ea``),
    ``found`` quotes what stands there, ``expected`` says what would be right.
    """

    key: str
    found: str
    expected: str
    file: str = ""

    def __str__(self) -> str:
        place = f"{self.file}: {self.key}" if self.file and self.key else self.file or self.key
        head = f"{place}: " if place else ""
        return f"{head}found {self.found}; expected {self.expected}"

    def inside(self, file: str) -> Problem:
        """The same problem with the file that holds it named."""
        return self if self.file else replace(self, file=file)

    def under(self, prefix: str) -> Problem:
        """The same problem one level further down: ``prefix.key``."""
        return replace(self, key=f"{prefix}.{self.key}" if self.key else prefix)


class MeanfreeError(Exception):
    """Base of every error that a user is meant to read."""

    exit_status = 1


class InputError(MeanfreeError):
    """The input is wrong; ``problems`` lists everything that was found."""

    exit_status = 2

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = tuple(problems)
        if not self.problems:
            raise ValueError("an InputError needs at least one Problem")
        super().__init__("\n".join(str(problem) for problem in self.problems))

    @classmethod
    def at(cls, key: str, found: str, expected: str) -> InputError:
        """An error with a single problem."""
        return cls([Problem(key, found, expected)])


class ComputationError(MeanfreeError):
    """The input was understood, but the computation failed."""

    exit_status = 1
