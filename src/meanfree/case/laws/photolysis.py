"""``law = "photolysis"``: first order while the lamp is on."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, ClassVar, Literal

from pydantic import Field

from meanfree.case.schema.base import Later, Length, Quantity, Time
from meanfree.case.schema.steps import StepTable
from meanfree.rates.photolysis import Photolysis
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading


class PhotolysisStep(StepTable):
    """J times the concentration."""

    needs_light: ClassVar[bool] = True
    law: Literal["photolysis"]
    J: Annotated[Any, Later("8e-3 1/s")] = Field(description='such as "8e-3 1/s"')
    on: list[Time] = Field(
        default_factory=list, description='times at which the lamp goes on, such as ["1 min"]'
    )
    off: list[Time] = Field(
        default_factory=list, description="times at which it goes off; on from the start by default"
    )
    absorption: Annotated[Sourced, Quantity("cross-section")] | None = Field(
        None, description="absorption cross-section of a molecule, to base e; with path"
    )
    path: Length | None = Field(None, description="length of the light's way through the gas")

    def to_law(self, reading: StepReading) -> Photolysis | None:
        """`Photolysis` with J per event."""
        before = reading.count
        J = reading.rate_constant("J")
        reading.one_way("a step that light drives")
        if J is None or reading.count > before or self._wrong:
            return None
        return Photolysis(
            J,
            tuple(reading.sourced(t) for t in self.on),
            tuple(reading.sourced(t) for t in self.off),
            _sourced(self.absorption, reading),
            _sourced(self.path, reading),
        )


def _sourced(value: Sourced | None, reading: StepReading) -> Sourced | None:
    return None if value is None else reading.sourced(value)
