"""``[[flows]]``: leaks, pumping and dilution of a vessel that is not quite closed."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field

from meanfree.case.schema.base import Area, Number, Prose, Quantity, Table
from meanfree.sourced import Sourced


class FlowTable(Table):
    """One flow in or out, kept apart from the conversion by reaction."""

    kind: Literal["effusion", "pumping", "dilution", "leak-up"] = Field(
        description='"effusion" (each gas through a pinhole into vacuum), "pumping" (all gases '
        'alike), "dilution" (pumping, and as much of another gas takes its place) or "leak-up" '
        "(gas that comes in)"
    )
    hole: Area | None = Field(None, description='area of the pinhole, such as "100 um^2"')
    transmission: Annotated[Sourced, Number(0, 1, above=True)] | None = Field(
        None, description="share of the molecules entering the hole that come out; default 1"
    )
    rate: Annotated[Sourced, Quantity("frequency")] | None = Field(
        None, description="share of the gas that leaves in a time"
    )
    rise: Annotated[Sourced, Quantity("pressure rise")] | None = Field(
        None, description="how fast the pressure rose in the closed, empty vessel"
    )
    entering: dict[str, Annotated[Sourced, Number(0, 1, above=True)]] | None = Field(
        None, description="what comes in, as fractions, such as { N2 = 0.79, O2 = 0.21 }"
    )
    source: Prose = Field("", description="where the numbers come from")
