"""``law = "fixed"``: a rate constant as a number."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, ClassVar, Literal

from pydantic import Field

from meanfree.case.schema.base import Later
from meanfree.case.schema.steps import StepTable
from meanfree.rates.fixed import Fixed

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading


class FixedStep(StepTable):
    """r = k times the concentrations."""

    may_go_to_nothing: ClassVar[bool] = True
    law: Literal["fixed"]
    k: Annotated[Any, Later("1.6e-18 cm^3/molecule/s", "9.4e9 L/mol/s", "1e-3 1/s")] = Field(
        description='the rate constant, such as "9.4e9 L/mol/s"'
    )

    def to_law(self, reading: StepReading) -> Fixed | None:
        """`Fixed` with k per event."""
        k = reading.rate_constant("k")
        return None if k is None else Fixed(k=k)
