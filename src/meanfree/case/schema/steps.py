"""The part of a ``[[steps]]`` table that all rate laws share."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, ClassVar

from pydantic import ConfigDict, Field, Strict

from meanfree.case.schema.base import (
    Later,
    Line,
    MolarEnergy,
    Number,
    Prose,
    Quantity,
    Table,
    Temperature,
)
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading
    from meanfree.rates.law import Law

Factor = Annotated[Sourced, Number(0, 1e6)]
Order = Annotated[Sourced, Number(0, 10)]


class ReverseTable(Table):
    """An equilibrium constant that the reader supplies."""

    Kp: Annotated[Any, Later("0.12 bar")] = Field(None, description="K in pressures")
    Kc: Annotated[Any, Later("0.02 mol/L")] = Field(None, description="K in concentrations")
    K: Annotated[Any, Later("0.12", kinds=("number", "string"))] = Field(
        None, description="K with the standard state of 1 bar"
    )
    at: Temperature = Field(description="temperature at which the constant holds")
    enthalpy: MolarEnergy | None = Field(
        None, description="enthalpy of reaction, which carries it to another temperature"
    )


class UncertaintyTable(Table):
    """k is good to within a factor."""

    factor: Annotated[Sourced, Number(1, 1e12)] = Field(description="k is good to x/÷ this")
    sigmas: Annotated[Sourced, Number(0, 10, above=True)] = Field(
        Sourced(1.0, default=True), description="at that many standard deviations"
    )


class StepTable(Table):
    """One reaction as written, one way.

    A rate law subclasses this with ``law`` and its own keys, and says in `to_law` what
    they mean.
    """

    hints: ClassVar[dict[str, str]] = {
        "rate": "k, A or what the law takes",
        "reversible": 'reverse = "thermochemistry", or a table with Kp, Kc or K',
    }
    may_come_from_nothing: ClassVar[bool] = False
    may_go_to_nothing: ClassVar[bool] = False
    needs_light: ClassVar[bool] = False
    name: Line = Field(description='a name of its own, such as "decomposition"')
    reaction: Line = Field(description='the reaction, such as "2 NOCl -> 2 NO + Cl2"')
    law: Any = Field(description="the rate law")
    k_counts: Line = Field(
        "events", description='"events", "loss of A" or "formation of X": what a quoted k counts'
    )
    orders: dict[str, Order] | None = Field(
        None, description="orders, where they are not the coefficients"
    )
    partners: dict[str, Factor] | None = Field(
        None, description="relative efficiencies of the bath gases; others = that of the rest"
    )
    reverse: Any = Field(None, description='"thermochemistry", or a table with Kp, Kc or K and at')
    heat: MolarEnergy | None = Field(
        None,
        description="heat that one mole of events releases, light included (positive: exothermic)",
    )
    photon: Annotated[Sourced, Quantity("photon energy")] | None = Field(
        None, description="energy or wavelength of the light that one event takes in"
    )
    uncertainty: UncertaintyTable | None = Field(None, description="how good k is")
    valid: Annotated[tuple[Temperature, Temperature], Strict(False)] | None = Field(
        None, description='range in which the law was found, such as ["400 K", "600 K"]'
    )
    source: Prose = Field("", description="where the numbers come from")

    @classmethod
    def hint(cls, key: str) -> str:
        """A key of another law is named as such."""
        from meanfree.case.laws.registry import LAW_SHAPES

        laws = [word for word, model in LAW_SHAPES.items() if key in model.model_fields]
        if laws:
            return f"a key of this law; {key} belongs to " + " and ".join(f'"{w}"' for w in laws)
        return super().hint(key)

    def to_law(self, reading: StepReading) -> Law | None:
        """The law with its numbers in SI, None where something is wrong with them.

        What is wrong goes to ``reading``.
        """
        raise NotImplementedError


class UnknownLawStep(StepTable):
    """A step whose law is missing or unknown: the keys that all laws share are checked."""

    model_config = ConfigDict(extra="ignore")

    def to_law(self, reading: StepReading) -> Law | None:
        """Nothing, and nothing to add: the law was refused already."""
        return None
