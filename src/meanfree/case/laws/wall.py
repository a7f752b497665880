"""``law = "wall"``: loss of one gas on the wall, to first order."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, ClassVar, Literal

from pydantic import Field

from meanfree.case.schema.base import Area, Number, Pressure, Quantity, Temperature
from meanfree.case.schema.steps import StepTable
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading

_KEYS = ("diffusion", "diffusion_at", "diffusion_pressure", "diffusion_power", "area")


class WallStep(StepTable):
    """Diffusion to the wall, and uptake there."""

    may_go_to_nothing: ClassVar[bool] = True
    law: Literal["wall"]
    uptake: Annotated[Sourced, Number(0, 1, above=True)] = Field(
        description="share of the molecules striking the wall that is lost"
    )
    form: Literal["exact", "quick", "uptake only"] | None = Field(
        None,
        description='"exact" (slowest mode of diffusion), "quick" (two resistances in a row) or '
        '"uptake only"; default: what suits the vessel',
    )
    diffusion: Annotated[Sourced, Quantity("diffusivity")] | None = Field(
        None, description="diffusion coefficient in the mixture; default: kinetic theory"
    )
    diffusion_at: Temperature | None = Field(None, description="temperature at which it holds")
    diffusion_pressure: Pressure | None = Field(None, description="pressure at which it holds")
    diffusion_power: Annotated[Sourced, Number(0, 4)] | None = Field(
        None, description="it goes as this power of T; default 1.75"
    )
    area: Area | None = Field(None, description="surface, where no shape of the vessel says it")

    def to_law(self, reading: StepReading) -> Wall | None:
        """`Wall`; k_counts has no meaning, for the uptake counts molecules."""
        before = reading.count
        reading.counts_events()
        reading.one_way("a loss on the wall")
        if reading.count > before or self._wrong:
            return None
        given = {key: getattr(self, key) for key in _KEYS}
        numbers = {key: reading.sourced(v) for key, v in given.items() if v is not None}
        return Wall(reading.sourced(self.uptake), self.form, **numbers)
