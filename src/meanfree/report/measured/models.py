"""`summary.json` of `fit`: what was found from the readings, for a program.

Numbers of parameters are in the unit and counting of the case file; keys of all others end in
their unit. null: not known, or an open end.
"""

from __future__ import annotations

from typing import Literal

from pydantic import BaseModel, ConfigDict, Field


class Record(BaseModel):
    """Base of the records."""

    model_config = ConfigDict(frozen=True, extra="forbid")


class ParameterAnswer(Record):
    """A fitted number: standard error and the ends of its 95 % interval."""

    value: float
    unit: str
    counts: str
    stderr: float | None
    low: float | None
    high: float | None
    at_bound: bool
    interval_from: Literal["profile likelihood", "standard error"]


class CountedConstant(Record):
    """A fitted rate constant in one way of counting, in the unit of the case."""

    address: str
    counts: str
    value: float
    stderr: float | None
    low: float | None
    high: float | None
    unit: str


class IntervalAnswer(Record):
    """A number with its standard error and 95 % interval."""

    value: float
    stderr: float | None
    low: float | None
    high: float | None


class RunAnswer(Record):
    """One run: what was read, and how its residuals behave."""

    name: str
    file: str
    signal: str
    unit: str
    readings: int
    conditions: dict[str, str]
    sd: float | None
    sd_estimated: bool
    runs_of_sign: int | None
    runs_expected: float | None
    runs_probability: float | None


class LineAnswer(Record):
    """The textbook's straight line of one run, k in the unit of the case."""

    run: str
    ordinate: str
    concentration_from: str
    k_per_event: float
    k_loss: float
    loss_of: str
    stderr_per_event: float
    unit: str
    r_squared: float


class CandidateAnswer(Record):
    """One description of the readings in the ranking by AICc."""

    name: str
    aicc: float | None
    difference: float
    weight: float


class OrderAnswer(Record):
    """The order of a step in a gas."""

    step: str
    gas: str
    order: float
    stderr: float | None
    low: float | None
    high: float | None
    candidates: list[CandidateAnswer]
    words: list[str]


class PointAnswer(Record):
    """k of a step, per event, at one temperature."""

    run: str
    T_K: float
    k_SI: float
    stderr_ln_k: float | None


class SeriesAnswer(Record):
    """Arrhenius' law and the line of centres through k(T), per event."""

    step: str
    k_unit: str
    points: list[PointAnswer]
    middle_temperature_K: float
    Ea_J_per_mol: IntervalAnswer
    A_SI: IntervalAnswer
    ln_A: IntervalAnswer
    correlation_ln_A_Ea: float
    curvature_probability: float | None
    power_n: IntervalAnswer | None
    E0_J_per_mol: IntervalAnswer | None
    steric_factor: IntervalAnswer | None
    A_over_Z: IntervalAnswer | None
    diameter_factor: float | None
    words: list[str]


class WallAnswer(Record):
    """k against surface to volume."""

    step: str
    k_gas_per_s: IntervalAnswer
    wall_m_per_s: IntervalAnswer
    wall_share: dict[str, float]
    probability: float
    words: str


class PseudoAnswer(Record):
    """k' against the partner's concentration; k for the loss of the gas."""

    gas: str
    partner: str
    k_loss_m3_per_mol_s: IntervalAnswer
    k_per_event_m3_per_mol_s: IntervalAnswer
    intercept_per_s: IntervalAnswer
    words: list[str]


class RelativeAnswer(Record):
    """A ratio of rate constants."""

    gas: str
    reference: str
    ratio: IntervalAnswer
    k: IntervalAnswer | None
    k_unit: str | None
    words: list[str]


class InitialAnswer(Record):
    """The order from initial rates."""

    gas: str
    order: IntervalAnswer
    words: list[str]


class CollisionAnswer(Record):
    """A fitted second-order step against its collision limit, per event."""

    step: str
    T_K: float
    k_m3_per_mol_s: float
    Z_m3_per_mol_s: float
    k_over_Z: float
    E0_J_per_mol: float | None
    steric_factor: IntervalAnswer | None
    A_over_Z: float | None
    verdict: str


class FitSummary(Record):
    """Everything that `meanfree fit` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-fit-1"] = Field(
        default="meanfree-fit-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    parameters: dict[str, ParameterAnswer]
    correlations: dict[str, dict[str, float | None]]
    rate_constants: list[CountedConstant]
    readings: int
    degrees_of_freedom: int
    chi_square: float | None
    reduced_chi_square: float | None
    aicc: float | None
    runs: list[RunAnswer]
    against_collisions: list[CollisionAnswer]
    lines: list[LineAnswer]
    order: OrderAnswer | None
    ranking: list[CandidateAnswer]
    temperature_series: list[SeriesAnswer]
    walls: list[WallAnswer]
    pseudo_first_order: list[PseudoAnswer]
    relative_rates: list[RelativeAnswer]
    initial_rates: list[InitialAnswer]
    findings: list[str]
    evaluations: int

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(indent=2, by_alias=True) + "\n"
