"""The table ``[plan]``: what planning asks for."""

from __future__ import annotations

from typing import Annotated, Any

from pydantic import Field

from meanfree.case.schema.base import Later, Length, Line, Number, Quantity, Table, Time
from meanfree.sourced import Sourced

_LEAST = Later("0.5 torr", "1e-6 mol/L", "10 ppm", kinds=("string", "number"))
_TOLERANCE = Later("1 %", "factor 1.5", "2 kJ/mol", kinds=("string", "number"))


class SamplesTable(Table):
    """How samples are drawn and measured, for `schedule`."""

    count: Annotated[Sourced, Number(1, 200)] | None = Field(None, description="how many samples")
    signal: Line | None = Field(
        None,
        description='"total pressure", "concentration of NO" or "partial pressure of NO"; '
        "default: the concentration of the watched gas",
    )
    sd: Annotated[Any, Later("0.5 torr")] = Field(
        None, description="standard deviation of one reading of the signal"
    )
    dead_time: Time | None = Field(None, description="shortest time from one sample to the next")
    takes: Annotated[Sourced, Number(0, 0.9)] | None = Field(
        None, description="fraction of the contents that each sample takes with it"
    )
    parameters: list[Line] = Field(
        default_factory=list,
        description='addresses of what the readings are to find, such as "steps.decomposition.A"',
    )
    until: Time | None = Field(None, description="end of the working time; default: of the run")
    clock: Line | None = Field(None, description='time of day at which the run starts: "09:00"')


class PlanTable(Table):
    """What planning asks for: patience, warm-up, detection, tolerances, samples."""

    warm_up: Time | None = Field(None, description="time the vessel takes to come to temperature")
    patience: Time | None = Field(None, description="longest run one would wait for")
    detection: dict[str, Annotated[Any, _LEAST]] = Field(
        default_factory=dict, description="the least of a gas that the instrument sees"
    )
    narrowest: Length | None = Field(None, description="width of the narrowest passage")
    conductance: Annotated[Sourced, Quantity("conductance")] | None = Field(
        None, description="heat flow from gas to surroundings per kelvin"
    )
    tolerances: dict[str, Annotated[Any, _TOLERANCE]] = Field(
        default_factory=dict,
        description='one standard deviation of a number by its address: "1 %" or "factor 1.5" '
        'of its logarithm, or "2 K" of itself',
    )
    correlations: list[list[Any]] = Field(
        default_factory=list,
        description="correlated tolerances as [address, address, correlation], such as "
        '["steps.decomposition.A", "steps.decomposition.Ea", 0.98]',
    )
    samples: SamplesTable | None = Field(None, description="how samples are drawn and measured")
