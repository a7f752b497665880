"""The tables of a case file other than its steps: vessel, temperature, fill, run, gases."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, Strict

from meanfree.case.schema.base import (
    Area,
    Later,
    Length,
    Line,
    MolarEnergy,
    Number,
    Pressure,
    Prose,
    Quantity,
    Table,
    Temperature,
    Time,
    Volume,
)
from meanfree.sourced import Sourced


class ShapeTable(Table):
    """The inside of the vessel: a sphere, a cylinder, or only its surface."""

    form: Literal["sphere", "cylinder"] | None = Field(None, description="sphere or cylinder")
    diameter: Length | None = Field(None, description="inner diameter")
    length: Length | None = Field(None, description="inner length of a cylinder")
    surface: Area | None = Field(None, description="inner surface, where no form is given")


class DeadSpaceTable(Table):
    """Gauge and lines: they share the pressure, hold gas, and do not react."""

    volume: Volume = Field(description="volume of gauge and lines")
    temperature: Temperature = Field(description="temperature of gauge and lines")


class VesselTable(Table):
    """The closed reactor."""

    holds: Literal["volume", "pressure"] = Field(
        description='"volume" (a rigid vessel) or "pressure" (a piston or a bag)'
    )
    volume: Volume = Field(description="inner volume; of a piston, that at filling")
    pressure: Pressure | None = Field(
        None, description="pressure that a piston holds; default: the sum of the filled ones"
    )
    rated_pressure: Pressure | None = Field(None, description="what the vessel is rated for")
    gauge_resolution: Pressure | None = Field(
        None, description="smallest change of pressure that its gauge shows"
    )
    shape: ShapeTable | None = Field(None, description="form and inner surface")
    dead_space: DeadSpaceTable | None = Field(None, description="gauge and lines")


class IsothermalTable(Table):
    """The gas stays at one temperature."""

    mode: Literal["isothermal"]
    value: Temperature = Field(description="temperature of the gas")


class AdiabaticTable(Table):
    """The gas keeps its energy to itself."""

    mode: Literal["adiabatic"]
    value: Temperature = Field(description="temperature of the gas at time zero")


class ExchangeTable(Table):
    """The gas exchanges heat with its surroundings."""

    mode: Literal["exchange"]
    value: Temperature = Field(description="temperature of the gas at time zero")
    surroundings: Temperature = Field(description="temperature of the surroundings")
    conductance: Annotated[Sourced, Quantity("conductance")] = Field(
        description="heat flow to the surroundings per kelvin"
    )
    wall_heat_capacity: Annotated[Sourced, Quantity("heat capacity")] | None = Field(
        None, description="heat capacity of the wall, which is at the temperature of the gas"
    )


class ProgramTable(Table):
    """The gas follows a temperature program, linear between its points, constant after."""

    mode: Literal["program"]
    points: list[Annotated[tuple[Time, Temperature], Strict(False)]] = Field(
        description='points such as [["0 s", "296 K"], ["4 min", "480 K"]]', min_length=1
    )


TEMPERATURES: dict[str, type[Table]] = {
    "isothermal": IsothermalTable,
    "adiabatic": AdiabaticTable,
    "exchange": ExchangeTable,
    "program": ProgramTable,
}


_PORTION = Later("50 torr", "27 %", "balance", kinds=("string", "number"))


class FillTable(Table):
    """What is put in before time zero."""

    gases: dict[str, Annotated[Any, _PORTION]] = Field(
        description='gases with how much of each, such as { NOCl = "50 torr", Ar = "135 torr" }; '
        'fractions of the total as 0.27, "27 %", "5 ppm"; one may be "balance"'
    )
    total: (
        Annotated[Sourced, Quantity("pressure", "amount", "number density", "concentration")] | None
    ) = Field(None, description="all gases together, where fractions are given")
    at: Temperature | None = Field(
        None, description="temperature at which those were read; default: the run's at time zero"
    )


class SolverTable(Table):
    """The integrator and its tolerances."""

    method: Literal["Radau", "BDF", "LSODA"] = Field("Radau", description="the integrator")
    rtol: Annotated[Sourced, Number(1e-13, 1e-2)] = Field(
        Sourced(1e-8, default=True), description="relative tolerance"
    )
    atol: Annotated[Sourced, Number(0, 1e-3, above=True)] = Field(
        Sourced(1e-20, default=True),
        description="absolute tolerance as a fraction of the initial concentration",
    )


class RunTable(Table):
    """How long, watching what, reported when."""

    until: Annotated[Any, Later("auto", "2 h")] = Field(
        "auto", description='"auto", or a time such as "2 h"'
    )
    watch: Line | None = Field(None, description="the gas whose conversion counts")
    report_at: list[Time] = Field(default_factory=list, description="times of extra rows")
    solver: SolverTable | None = Field(None, description="integrator and tolerances")


class SampleTable(Table):
    """Gas drawn from the running vessel, at once."""

    at: Time = Field(description="when it is drawn")
    fraction: Annotated[Sourced, Number(0, 1, above=True)] | None = Field(
        None, description="share of all the gas that is drawn; or volume"
    )
    volume: Volume | None = Field(
        None, description="volume that is drawn, at the conditions of the vessel"
    )


_HEAT_CAPACITY = Later("29 J/mol/K", kinds=("string", "array"))


class GasTable(Table):
    """Who a gas is, and values that replace the library's."""

    hints: ClassVar[dict[str, str]] = {
        "mass": "formula, from which the mass follows",
        "molar_mass": "formula, from which the mass follows",
        "sigma": 'diameter, such as "4.1 angstrom"',
    }
    formula: Line | None = Field(None, description='chemical formula, such as "NOCl"')
    cas: Line | None = Field(None, description='CAS number, such as "2696-92-6"')
    diameter: Length | None = Field(None, description="diameter of the molecule as a hard sphere")
    polarisability: Annotated[Sourced, Quantity("polarisability")] | None = Field(
        None, description="polarisability as a volume: for the long-range ceiling of its steps"
    )
    ionisation_energy: MolarEnergy | None = Field(
        None, description="ionisation energy: for the long-range ceiling of two neutral gases"
    )
    dipole: Annotated[Sourced, Quantity("dipole moment")] | None = Field(
        None, description="permanent dipole moment: for the long-range ceiling with an ion"
    )
    enthalpy: MolarEnergy | None = Field(
        None, description="enthalpy of formation at 298.15 K; with entropy and heat_capacity"
    )
    entropy: Annotated[Sourced, Quantity("molar heat capacity")] | None = Field(
        None, description="standard entropy at 298.15 K and 1 bar"
    )
    heat_capacity: Annotated[Any, _HEAT_CAPACITY] = Field(
        None, description="Cp: one value, or a list of [temperature, Cp]"
    )
    extrapolate: bool = Field(
        False, description="true allows temperatures outside the range of the thermochemistry"
    )
    source: Prose = Field("", description="where the values of this table come from")


class CaseTable(Table):
    """The top of a case file."""

    title: Line = Field(description="a title in one line")
    purpose: Prose = Field("", description="what the case is to tell")
    labels: list[Line] = Field(
        default_factory=list, description="names that are no real gas: no mass, no elements"
    )
    vessel: Any = Field(None, description="the table [vessel]")
    temperature: Any = Field(None, description="the table [temperature]")
    fill: Any = Field(None, description="the table [fill]")
    run: Any = Field(None, description="the table [run]")
    gases: Any = Field(None, description="tables [gases.NAME]")
    steps: Any = Field(None, description="tables [[steps]]")
    samples: Any = Field(None, description="tables [[samples]]")
    flows: Any = Field(None, description="tables [[flows]]")
    data: Any = Field(None, description="tables [[data]]")
    fit: Any = Field(None, description="the table [fit]")
    plan: Any = Field(None, description="the table [plan]")
    sweep: Any = Field(None, description="the table [sweep]")
