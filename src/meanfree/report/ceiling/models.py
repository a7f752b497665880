"""The shape of the `summary.json` of `ceiling`. Keys end in their unit; null means "not known"."""

from __future__ import annotations

from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from meanfree.planning.ceiling import CeilingTable, Level, StepCeiling
from meanfree.rates.attraction import Attraction
from meanfree.report.ceiling.naming import reaction
from meanfree.report.record import CaseRecord


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class LevelAnswer(_Record):
    """One encounter at one temperature; k and its ceilings count events."""

    T_K: float
    is_run: bool
    outside_valid: bool
    k_m3_per_mol_s: float
    Z_m3_per_mol_s: float | None
    long_range_m3_per_mol_s: float | None
    k_over_Z: float | None
    Ea_J_per_mol: float | None
    E0_J_per_mol: float | None
    Ea_below_half_RT: bool | None
    steric_factor: float | None
    A_over_Z: float | None
    verdict: str


class CrossingAnswer(_Record):
    """A temperature at which k equals a ceiling; above it beyond where ``k_rises_above``."""

    T_K: float
    ceiling: str
    k_rises_above: bool
    inside_range: bool


class EncounterAnswer(_Record):
    """One step, or the reverse that detailed balance makes of it."""

    step: str
    reaction: str
    law: str
    is_reverse: bool
    lowest_T_K: float
    highest_T_K: float
    range_basis: str
    pair_diameter_m: float | None
    long_range_attraction: str | None
    long_range_basis: str
    levels: list[LevelAnswer]
    crossings: list[CrossingAnswer]
    crossings_from_K: float
    crossings_to_K: float
    suspect: bool


class LeftOutAnswer(_Record):
    """A step without a ceiling."""

    step: str
    why: str


class CeilingSummary(_Record):
    """Everything that `meanfree ceiling` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-ceiling-1"] = Field(
        default="meanfree-ceiling-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    between_K: tuple[float, float] | None
    encounters: list[EncounterAnswer]
    left_out: list[LeftOutAnswer]

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"


def summarise(table: CeilingTable, record: CaseRecord) -> CeilingSummary:
    """The summary of a ceiling table."""
    return CeilingSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=table.experiment.title,
        between_K=table.between,
        encounters=[_encounter(one) for one in table.steps],
        left_out=[LeftOutAnswer(step=one.name, why=one.why) for one in table.left_out],
    )


def _encounter(one: StepCeiling) -> EncounterAnswer:
    limit, pull = one.levels[0].limit, one.attraction
    return EncounterAnswer(
        step=one.name,
        reaction=reaction(one),
        law="equilibrium" if one.back else one.step.law.word,
        is_reverse=one.back,
        lowest_T_K=one.span[0],
        highest_T_K=one.span[1],
        range_basis=one.span_basis,
        pair_diameter_m=None if limit is None else limit.pair_diameter,
        long_range_attraction=pull.word if isinstance(pull, Attraction) else None,
        long_range_basis=pull.basis if isinstance(pull, Attraction) else pull,
        levels=[_level(level) for level in one.levels],
        crossings=[
            CrossingAnswer(
                T_K=crossing.temperature,
                ceiling=crossing.ceiling,
                k_rises_above=crossing.rising,
                inside_range=crossing.inside,
            )
            for crossing in one.crossings
        ],
        crossings_from_K=one.searched[0],
        crossings_to_K=one.searched[1],
        suspect=any(level.standing.may_be_wrong for level in one.levels),
    )


def _level(level: Level) -> LevelAnswer:
    judged = level.judgement
    return LevelAnswer(
        T_K=level.temperature,
        is_run=level.is_run,
        outside_valid=level.outside,
        k_m3_per_mol_s=level.k,
        Z_m3_per_mol_s=None if level.limit is None else level.limit.Z,
        long_range_m3_per_mol_s=level.long_range,
        k_over_Z=None if level.limit is None else level.k / level.limit.Z,
        Ea_J_per_mol=level.Ea,
        E0_J_per_mol=None if judged is None else judged.threshold,
        Ea_below_half_RT=None if judged is None or judged.steric is None else judged.below_half_rt,
        steric_factor=None if judged is None else judged.steric,
        A_over_Z=None if judged is None else judged.A_over_Z,
        verdict=level.standing.value,
    )
