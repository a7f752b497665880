"""The shape of a run's `summary.json`.

Keys end in their unit; null means "not reached" or "not known".
"""

from __future__ import annotations

from typing import Literal

from pydantic import BaseModel, ConfigDict, Field


class _Record(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class ReactionTime(_Record):
    """The first time at which a conversion is reached."""

    conversion: float
    time_s: float | None


class GasAnswer(_Record):
    """What became of one filled gas that a step consumes.

    Its highest conversion is above that at the end where conversion goes back.
    """

    gas: str
    time_to_10_percent_s: float | None
    time_to_50_percent_s: float | None
    time_to_90_percent_s: float | None
    reaction_times: list[ReactionTime]
    half_lives_s: list[float | None]
    filled_mol: float
    conversion_at_end: float
    highest_conversion: float
    equilibrium_conversion: float | None
    time_to_half_of_equilibrium_s: float | None
    time_to_90_percent_of_equilibrium_s: float | None


class GasAmount(_Record):
    """How much there is of one gas at the start, at the end, at most, and at equilibrium."""

    gas: str
    start_mol: float
    end_mol: float
    end_mol_per_m3: float
    end_Pa: float
    peak_mol: float
    peak_time_s: float
    equilibrium_mol: float | None


class VesselAnswer(_Record):
    """What the gauge, the piston and the thermometer show.

    The slope of the pressure is that at time zero, null for a piston; a gauge first shows a change
    where the pressure has moved by its resolution, null: never, or no resolution is stated.
    """

    filling_pressure_Pa: float
    initial_pressure_Pa: float
    final_pressure_Pa: float
    highest_pressure_Pa: float
    initial_volume_m3: float
    final_volume_m3: float
    initial_temperature_K: float
    final_temperature_K: float
    lowest_temperature_K: float
    highest_temperature_K: float
    initial_pressure_slope_Pa_per_s: float | None
    gauge_resolution_Pa: float | None
    gauge_first_shows_it_s: float | None


class EquilibriumAnswer(_Record):
    """Where the vessel must end, found without integrating; or why that cannot be said."""

    pressure_Pa: float | None
    volume_m3: float | None
    temperature_K: float | None
    why_none: str | None


class StepAnswer(_Record):
    """One rate constant against its collision limit.

    ``k`` counts events, in SI; ``k_in_case`` is the same as the case counts and writes it;
    ``k_by_pressure`` is k for partial pressures at ``T_K``, null for a first order.
    """

    step: str
    reaction: str
    law: str
    T_K: float
    counts: Literal["events"]
    k: float
    k_unit: str
    counts_in_case: str
    k_in_case: float
    k_in_case_unit: str
    k_by_pressure: float | None
    k_by_pressure_unit: str
    Ea_J_per_mol: float | None
    Z_m3_per_mol_s: float | None
    E0_J_per_mol: float | None
    steric_factor: float | None
    A_over_Z: float | None
    verdict: str
    source: str


class SolverWork(_Record):
    """The integrator, its tolerance and the work it did."""

    method: str
    rtol: float
    steps: int
    nfev: int
    njev: int
    nlu: int


class Drift(_Record):
    """How well the run kept what it must keep; relative, null: does not apply."""

    elements: dict[str, float]
    energy: float | None
    volume: float | None
    most_negative: float
    closed_form: str | None
    closed_form_difference: float | None


class VerificationAnswer(_Record):
    """The same run by a second method at a tenth of the tolerance.

    ``largest_difference`` is over the most that was ever there of ``gas``.
    """

    method: str
    rtol: float
    largest_difference: float
    gas: str
    time_s: float


class RunSummary(_Record):
    """Everything that `meanfree run` answers."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)

    schema_: Literal["meanfree-run-1"] = Field(
        default="meanfree-run-1", validation_alias="schema", serialization_alias="schema"
    )
    case: str
    case_sha256: str
    version: str
    title: str
    purpose: str
    status: str
    message: str
    watched_gas: str | None
    length_s: float
    gases: list[GasAnswer]
    vessel: VesselAnswer
    equilibrium: EquilibriumAnswer
    amounts: list[GasAmount]
    rate_constants: list[StepAnswer]
    cautions: list[str]
    notes: list[str]
    solver: SolverWork
    drift: Drift
    verification: VerificationAnswer | None = None

    def to_json(self) -> str:
        """The text of `summary.json`."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"

    def gas(self, name: str) -> GasAnswer | None:
        """The answers about one gas."""
        return next((answer for answer in self.gases if answer.gas == name), None)
