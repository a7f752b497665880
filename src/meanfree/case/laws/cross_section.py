"""``law = "cross-section"``: the reactive cross-section against collision energy."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Literal

from pydantic import Field, Strict

from meanfree.case.schema.base import MolarEnergy, Quantity
from meanfree.case.schema.steps import StepTable
from meanfree.rates.cross_section import CrossSection, EnergyPoint
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading

CrossSectionSize = Annotated[Sourced, Quantity("cross-section")]
Pair = Annotated[tuple[MolarEnergy, CrossSectionSize], Strict(False)]
_ONLY = {"points": ("cross_section", "threshold"), "form": ("points", "beyond")}


class CrossSectionStep(StepTable):
    """The average of cross-section times relative speed."""

    law: Literal["cross-section"]
    shape: Literal["line of centres", "constant above threshold", "points"] = Field(
        description="how the cross-section depends on the energy"
    )
    cross_section: CrossSectionSize | None = Field(
        None, description="its largest value, of the two forms"
    )
    threshold: MolarEnergy | None = Field(None, description="energy below which it is zero")
    points: list[Pair] | None = Field(
        None, description='points such as [["40 kJ/mol", "0 nm^2"], ["90 kJ/mol", "0.12 nm^2"]]'
    )
    beyond: Literal["constant", "zero", "linear", "falling as 1/E"] | None = Field(
        None, description="how it goes on after the last point"
    )

    def to_law(self, reading: StepReading) -> CrossSection | None:
        """`CrossSection`, if the step is an encounter of two molecules with masses."""
        before = reading.count
        reading.needs_pair(diameters=False)
        reading.counts_events()
        if self.shape is not None:
            for key in _ONLY["points" if self.shape == "points" else "form"]:
                if self.has(key):
                    expected = "what this shape takes, or another shape"
                    reading.wrong(key, f'{key} with shape = "{self.shape}"', expected)
        if reading.count > before or self._wrong:
            return None
        points = tuple(
            EnergyPoint(reading.sourced(energy), reading.sourced(area))
            for energy, area in self.points or ()
        )
        size, threshold = self.cross_section, self.threshold
        return CrossSection(
            self.shape,
            None if size is None else reading.sourced(size),
            None if threshold is None else reading.sourced(threshold),
            points,
            self.beyond,
        )
