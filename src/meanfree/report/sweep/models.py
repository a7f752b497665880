"""`summary.json` of a sweep; nothing in it depends on when or where the parts were made."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class ConditionAnswer(_Record):
    """One address that is varied, in the unit of the case."""

    address: str
    column: str
    unit: str
    low: float
    high: float


class ObservableAnswer(_Record):
    """One observable over all conditions, in the unit that ends its name.

    Quantiles are good to 0.05 %; null: no run reached it.
    """

    column: str
    reached: int
    lowest: float | None
    quantile_0_16: float | None
    median: float | None
    quantile_0_84: float | None
    highest: float | None


class EndingAnswer(_Record):
    """How runs ended, and how many did."""

    ending: str
    conditions: int
    failed: bool


class SweepSummary(_Record):
    """Everything that `meanfree sweep` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-sweep-1"] = Field(
        default="meanfree-sweep-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    experiment_sha256: str
    campaign_sha256: str
    design: dict[str, Any]
    conditions: int
    parts: int
    failed: int
    varied: list[ConditionAnswer]
    observables: list[ObservableAnswer]
    endings: list[EndingAnswer]

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"
