"""``law = "falloff"``: between the low- and the high-pressure limit of a step with M."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Field, Strict

from meanfree.case.schema.base import (
    Inner,
    Later,
    Length,
    Line,
    MolarEnergy,
    Number,
    Table,
    Temperature,
    shape,
)
from meanfree.case.schema.steps import StepTable
from meanfree.rates.falloff import Centre, CentreTerm, Falloff
from meanfree.rates.limits import Limit, PowerLaw, StrongCollisions
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, read_number
from meanfree.units.reading import described

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading

Weighted = Annotated[tuple[Annotated[Sourced, Number(-10, 10)], Temperature], Strict(False)]


class PowerLawTable(Table):
    """A limiting rate constant A (T/T_ref)^n exp(-Ea/RT)."""

    A: Annotated[Any, Later("2e-30 cm^6/s", "1.7e-12 cm^3/s")] = Field(
        description="the factor before the exponential; k0 has one order more than kinf"
    )
    n: Annotated[Sourced, Number(-50, 50)] | None = Field(None, description="power of T")
    T_ref: Temperature | None = Field(None, description="temperature at which A (T/T_ref)^n is A")
    Ea: MolarEnergy | None = Field(None, description="the energy in the exponential; default 0")


class StrongCollisionsTable(Table):
    """k0 of a unimolecular step estimated: every collision takes a hot molecule's energy."""

    threshold: MolarEnergy = Field(description="energy above which the molecule reacts")
    oscillators: Annotated[Sourced, Number(1, 300)] = Field(
        description="effective number of classical oscillators"
    )
    partner: Line = Field(description="the gas whose collisions are counted")
    collision_efficiency: Annotated[Sourced, Number(0, 1, above=True)] | None = Field(
        None, description="share of the collisions that take the energy; default 1"
    )
    diameter: Length | None = Field(None, description="distance of the centres at contact")


class CentreTable(Table):
    """Fc as a sum: constant + sum a exp(-T/b) + sum a exp(-b/T)."""

    constant: Annotated[Sourced, Number(0, 1)] | None = Field(None, description="the constant")
    falling: list[Weighted] = Field(
        default_factory=list, description='terms a exp(-T/b), such as [[0.9, "430 K"]]'
    )
    rising: list[Weighted] = Field(
        default_factory=list, description='terms a exp(-b/T), such as [[2.5, "1950 K"]]'
    )


class FalloffStep(StepTable):
    """k = k0 [M]/(1 + Pr) F, Pr = k0 [M]/kinf."""

    law: Literal["falloff"]
    k0: Annotated[Any, Inner(PowerLawTable, StrongCollisionsTable)] = Field(
        description='a table with A, n, T_ref, Ea, such as { A = "2e-30 cm^6/s", n = -3, T_ref = '
        '"300 K" }; or, of one molecule, an estimate by strong collisions: a table with threshold, '
        "oscillators, partner, collision_efficiency, diameter"
    )
    kinf: Annotated[Any, Inner(PowerLawTable)] = Field(
        description='a table with A, n, T_ref, Ea, such as { A = "1.7e-12 cm^3/s" }'
    )
    broadening: Literal["none", "unit width", "width from Fc"] = Field(
        description='"none" (Lindemann), "unit width" (N = 1) or "width from Fc" '
        "(N = 0.75 - 1.27 log10 Fc)"
    )
    Fc: Annotated[Any, Inner(CentreTable, number=True)] = Field(
        None,
        description="broadening at k0 [M] = kinf: a number, or the sum of constant, falling = "
        '[[a, "b K"]] (a exp(-T/b)) and rising = [[a, "b K"]] (a exp(-b/T))',
    )

    def to_law(self, reading: StepReading) -> Falloff | None:
        """`Falloff` with both limits per event."""
        before = reading.count
        low = None if self.is_wrong("k0") else _limit(self.k0, "k0", reading)
        high = None if self.is_wrong("kinf") else _power_law(self.kinf, "kinf", False, reading)
        centre = None if self.Fc is None else _centre(self.Fc, reading)
        if reading.count > before or self._wrong or low is None or high is None:
            return None
        return Falloff(low, high, self.broadening, centre)


def _limit(raw: Any, key: str, reading: StepReading) -> Limit | None:
    if isinstance(raw, dict) and ("oscillators" in raw or "threshold" in raw):
        return _strong_collisions(raw, key, reading)
    return _power_law(raw, key, True, reading)


def _power_law(raw: Any, key: str, bath: bool, reading: StepReading) -> PowerLaw | None:
    table = shape(PowerLawTable, raw, f"{reading.address}.{key}", reading.findings)
    if table is None or table.is_wrong("A"):
        return None
    A = reading.rate_constant_of(table.A, f"{key}.A", bath=bath)
    if A is None or table._wrong:
        return None
    given = {name: getattr(table, name) for name in ("n", "T_ref", "Ea")}
    return PowerLaw(A, **{k: reading.sourced(v) for k, v in given.items() if v is not None})


def _strong_collisions(raw: Any, key: str, reading: StepReading) -> StrongCollisions | None:
    table = shape(StrongCollisionsTable, raw, f"{reading.address}.{key}", reading.findings)
    if table is None or table._wrong:
        return None
    law = StrongCollisions(
        reading.sourced(table.threshold), reading.sourced(table.oscillators), table.partner
    )
    from dataclasses import replace

    if table.collision_efficiency is not None:
        law = replace(law, collision_efficiency=reading.sourced(table.collision_efficiency))
    return law if table.diameter is None else replace(law, diameter=reading.sourced(table.diameter))


def _centre(raw: Any, reading: StepReading) -> Centre | None:
    if not isinstance(raw, dict):
        try:
            return Centre(reading.sourced(read_number(raw)))
        except QuantityError:
            expected = "a number such as 0.6, or a table with constant, falling, rising"
            reading.wrong("Fc", described(raw), expected)
            return None
    table = shape(CentreTable, raw, f"{reading.address}.Fc", reading.findings)
    if table is None or table._wrong:
        return None
    terms = [
        CentreTerm(reading.sourced(weight), reading.sourced(scale), rises)
        for rises, pairs in ((False, table.falling), (True, table.rising))
        for weight, scale in pairs
    ]
    if table.constant is None:
        return Centre(terms=tuple(terms))
    return Centre(reading.sourced(table.constant), tuple(terms))
