"""Why a condition ended: a closed set, and nothing else."""

from __future__ import annotations

from enum import IntEnum


class Ending(IntEnum):
    """How the integration of one condition ended."""

    PENDING = 0
    REACHED = 1
    CONVERTED = 2
    SETTLED = 3
    HORIZON = 4
    STEP_TOO_SMALL = 5
    TOO_MANY_STEPS = 6
    NOT_FINITE = 7
    NEGATIVE = 8
    SINGULAR = 9
    DRIFTED = 10
    RESTLESS = 11
    UNBOUNDED = 12

    @property
    def is_good(self) -> bool:
        """True where the results may be used."""
        return self in GOOD

    @property
    def sentence(self) -> str:
        """The ending in words."""
        return SENTENCES[self]


GOOD = (Ending.REACHED, Ending.CONVERTED, Ending.SETTLED, Ending.HORIZON, Ending.RESTLESS)

SENTENCES = {
    Ending.PENDING: "not integrated",
    Ending.REACHED: "reached the stated time",
    Ending.CONVERTED: "99.9 % of the watched gas was converted",
    Ending.SETTLED: "99.9 % of the way to where it settles",
    Ending.HORIZON: "still moving at the longest time an automatic run takes",
    Ending.STEP_TOO_SMALL: "the step size became smaller than the spacing of numbers",
    Ending.TOO_MANY_STEPS: "more steps than a run may take",
    Ending.NOT_FINITE: "a value is not finite",
    Ending.NEGATIVE: "an amount went negative beyond what the tolerance explains",
    Ending.SINGULAR: "the equations of a step could not be solved, even with pivoting",
    Ending.DRIFTED: "an element was not conserved",
    Ending.RESTLESS: "still moving after the most steps an automatic run takes",
    Ending.UNBOUNDED: "the amount of gas grew 1e+09 times, and nothing in the case ends that",
}
