"""``law = "source"``: a gas let in at a constant rate, ``-> X``."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, ClassVar, Literal

from pydantic import Field

from meanfree.case.schema.base import Later
from meanfree.case.schema.steps import StepTable
from meanfree.rates.source import Source

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading


class SourceStep(StepTable):
    """Zero order, whatever is in the vessel."""

    may_come_from_nothing: ClassVar[bool] = True
    law: Literal["source"]
    rate: Annotated[Any, Later("1e-6 mol/L/s")] = Field(
        description='per volume of the vessel, such as "1e-6 mol/L/s"'
    )

    def to_law(self, reading: StepReading) -> Source | None:
        """`Source` with the rate per event."""
        before = reading.count
        rate = reading.rate_constant("rate")
        reading.one_way("a source")
        if rate is None or reading.count > before or self._wrong:
            return None
        return Source(rate)
