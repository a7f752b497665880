"""One limit of the model or the vessel: a number held against a guideline."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

PRACTICE = "common practice, no source"


class Verdict(Enum):
    """What a number says against its guideline. There are no others."""

    BEYOND = "beyond the guideline"
    CAUTION = "caution"
    WITHIN = "within the guideline"
    UNKNOWN = "not known"

    @property
    def rank(self) -> int:
        """Place in a list that has the gravest first."""
        return list(Verdict).index(self)


@dataclass(frozen=True)
class Fact:
    """A number that went in: ``value`` in SI, ``dimension`` in the words of `meanfree.units`."""

    name: str
    value: float
    dimension: str = "pure"


@dataclass(frozen=True)
class Limit:
    """A number, what it should be, what that means, and where the guideline comes from.

    ``value`` and ``guideline`` in the SI unit of ``dimension``; None where nothing can be said.
    ``above`` is True where the number should lie above its guideline, else below.
    ``meaning`` is one sentence.
    """

    key: str
    name: str
    value: float | None
    guideline: float | None
    verdict: Verdict
    meaning: str
    source: str
    dimension: str = "pure"
    above: bool = False
    facts: tuple[Fact, ...] = ()


def judged(value: float, guideline: float, *, near: float = 3.0, above: bool = False) -> Verdict:
    """BEYOND past the guideline, CAUTION within a factor ``near`` of it, else WITHIN."""
    if above:
        value, guideline = guideline, value
    if value > guideline:
        return Verdict.BEYOND
    return Verdict.CAUTION if value * near > guideline else Verdict.WITHIN


def unknown(key: str, name: str, why: str, source: str = "") -> Limit:
    """A limit of which nothing can be said, and why."""
    return Limit(key, name, None, None, Verdict.UNKNOWN, why, source)
