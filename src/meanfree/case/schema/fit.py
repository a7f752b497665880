"""The table ``[fit]``: what shall be found from the data, and how."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Field

from meanfree.case.schema.base import Later, Line, Number, Table, Time
from meanfree.sourced import Sourced

_BOUNDS = Later('["1e-3 1/s", "1 1/s"]', kinds=("array",))
_VALUE = Later("102 kJ/mol", kinds=("string", "number"))


class PriorTable(Table):
    """What is known of a parameter beforehand."""

    value: Annotated[Any, _VALUE] = Field(description="the value, with its unit")
    sd: Annotated[Any, _VALUE] = Field(None, description="its standard deviation")
    factor: Annotated[Sourced, Number(1, 1e6, above=True)] | None = Field(
        None, description="good to x/÷ this at one standard deviation, in place of sd"
    )


class OrderTable(Table):
    """A test of the order of a step in one gas."""

    step: Line = Field(description="the step whose order is in question")
    gas: Line | None = Field(None, description="the gas; default: its only reactant")
    orders: list[Annotated[Sourced, Number(0, 4)]] = Field(
        default_factory=list, description="orders to rank; default: 0, 1/2, 1, 3/2, 2 and 3"
    )


class AnalysisTable(Table):
    """A further analysis of the runs."""

    kind: Literal[
        "initial rates", "pseudo-first-order", "relative rate", "temperature series", "wall"
    ] = Field(description="which analysis")
    gas: Line | None = Field(None, description="the gas whose loss is followed")
    partner: Line | None = Field(None, description="pseudo-first-order: the gas in excess")
    reference: Line | None = Field(None, description="relative rate: the reference gas")
    reference_k: Annotated[Any, Later("6.9e-15 cm^3/s")] = Field(
        None, description="relative rate: the rate constant of the reference"
    )
    reference_factor: Annotated[Sourced, Number(1, 100)] | None = Field(
        None, description="relative rate: that constant is good to x/÷ this factor"
    )
    step: Line | None = Field(None, description="temperature series, wall: the step")
    until: Time | None = Field(
        None, description="initial rates: readings up to this time; default: the first quarter"
    )
    base_line: bool = Field(
        False, description="pseudo-first-order: true where the signal does not end at zero"
    )
    diameter_factor: Annotated[Sourced, Number(1, 3)] | None = Field(
        None,
        description="temperature series: the diameter of the pair is good to x/÷ this factor; "
        "default 1.1",
    )


class FitTable(Table):
    """What `fit` finds."""

    parameters: list[Line] = Field(
        default_factory=list,
        description='addresses of the numbers to find, such as "steps.d.A"; also "time_offset", '
        '"signal_offset", and "data.RUN.ADDRESS" for one run',
    )
    bounds: dict[str, Annotated[Any, _BOUNDS]] = Field(
        default_factory=dict, description="lowest and highest value of a parameter, by address"
    )
    priors: dict[str, PriorTable] = Field(
        default_factory=dict, description="what is known of a parameter beforehand, by address"
    )
    weighting: Literal["signal", "integrated-law line"] = Field(
        "signal",
        description='"signal": the readings as they are; "integrated-law line": the textbook\'s '
        "straight line as well, to match old values",
    )
    loss: Literal["linear", "soft_l1", "huber", "cauchy"] = Field(
        "linear", description="linear: least squares; the others make far readings count less"
    )
    starts: Annotated[Sourced, Number(1, 200)] = Field(
        Sourced(1.0, default=True), description="starting points of the search"
    )
    order: OrderTable | None = Field(None, description="a test of the order of a step")
    analyses: list[AnalysisTable] = Field(
        default_factory=list, description="further analyses, as tables [[fit.analyses]]"
    )
