"""`summary.json` of `size`: keys end in their unit; null means "not reached" or "not asked"."""

from __future__ import annotations

from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from meanfree.report.planning.spread import SensitivityAnswer, UncertaintyAnswer


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class GoalAnswer(_Record):
    """What is to be reached; ``basis`` is the gas that a yield counts by."""

    kind: Literal["conversion", "yield"]
    gas: str
    level: float
    basis: str | None


class RootAnswer(_Record):
    """A value that reaches the goal within the time, in ``unit`` of the case."""

    value: float
    unit: str
    time_s: float
    easier_with_more: bool
    initial_pressure_Pa: float
    highest_pressure_Pa: float
    equilibrium: float | None


class ReasonAnswer(_Record):
    """Why there is none, at the end of the range that comes nearest."""

    why: str
    at: float
    unit: str
    reached_within: float
    reached_ever: float
    time_s: float | None
    in_the_way: str | None
    time_at_collision_limit_s: float | None
    sentence: str


class PeakAnswer(_Record):
    """When to stop for the most of a gas."""

    gas: str
    time_s: float
    amount_mol: float
    end_mol: float


class SizeSummary(_Record):
    """Everything that `meanfree size` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-size-1"] = Field(
        default="meanfree-size-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    goal: GoalAnswer
    time_s: float | None
    most: float
    most_at_s: float
    equilibrium: float | None
    within_s: float | None
    varied: str | None
    low: float | None
    high: float | None
    unit: str | None
    roots: list[RootAnswer]
    reason: ReasonAnswer | None
    intermediates: list[PeakAnswer]
    sensitivities: list[SensitivityAnswer]
    uncertainty: UncertaintyAnswer | None

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"
