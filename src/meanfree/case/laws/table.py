"""``law = "table"``: k at several temperatures, ln k linear in 1/T between them."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Field, Strict

from meanfree.case.schema.base import Later, Temperature
from meanfree.case.schema.steps import StepTable
from meanfree.rates.table import Table, TablePoint

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading

Pair = Annotated[tuple[Temperature, Annotated[Any, Later("9.4e9 L/mol/s")]], Strict(False)]


class TableStep(StepTable):
    """k against T, in rising order."""

    law: Literal["table"]
    points: list[Pair] = Field(
        description='points such as [["300 K", "1.2e9 L/mol/s"], ["400 K", "3.1e9 L/mol/s"]]',
        min_length=2,
    )
    extrapolate: bool = Field(
        False, description="true continues the outer Arrhenius lines outside the table"
    )

    def to_law(self, reading: StepReading) -> Table | None:
        """`Table` with every k per event."""
        if self._wrong:
            return None
        points = []
        for place, (T, raw) in enumerate(self.points):
            k = reading.rate_constant_of(raw, f"points.{place}", at=T.value)
            if k is not None:
                points.append(TablePoint(reading.sourced(T), k))
        return Table(tuple(points), self.extrapolate) if len(points) == len(self.points) else None
