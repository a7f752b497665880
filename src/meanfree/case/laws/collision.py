"""``law = "collision"``: hard spheres with a threshold along the line of centres."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, ClassVar, Literal

from pydantic import Field

from meanfree.case.schema.base import Length, MolarEnergy, Number, Temperature
from meanfree.case.schema.steps import StepTable
from meanfree.rates.collision import Collision
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading

_FACTOR = Number(0, 1e6, above=True)


class CollisionStep(StepTable):
    """k = P Z exp(-E0/RT)."""

    hints: ClassVar[dict[str, str]] = {
        **StepTable.hints,
        "P": "steric, the steric factor P; or A_over_Z",
        "p": "steric, the steric factor P; or A_over_Z",
        "E0": "threshold",
        "A": "A_over_Z or steric, and Ea or threshold",
    }
    law: Literal["collision"]
    threshold: MolarEnergy | None = Field(
        None, description="minimum energy along the line of centres E0; or Ea"
    )
    Ea: MolarEnergy | None = Field(
        None, description="activation energy at Ea_at (default: the run's temperature)"
    )
    Ea_at: Temperature | None = Field(None, description="temperature at which Ea holds")
    steric: Annotated[Sourced, _FACTOR] | None = Field(None, description="steric factor P")
    A_over_Z: Annotated[Sourced, _FACTOR] | None = Field(
        None, description="k exp(Ea/RT)/Z, what textbooks tabulate as the steric factor"
    )
    diameter: Length | None = Field(
        None, description="distance of the centres at contact, instead of the gases' diameters"
    )

    def to_law(self, reading: StepReading) -> Collision | None:
        """`Collision`, if the step is an encounter of two molecules that are known well enough."""
        before = reading.count
        reading.needs_pair(diameters=not self.has("diameter"))
        reading.counts_events()
        self._energies(reading)
        if self.has("steric") and self.has("A_over_Z"):
            reading.wrong("steric", "both steric and A_over_Z", "one of them")
        if reading.count > before or self._wrong:
            return None
        named = {
            key: reading.sourced(value)
            for key in ("threshold", "Ea", "Ea_at", "steric", "A_over_Z", "diameter")
            if (value := getattr(self, key)) is not None
        }
        return Collision(**named)

    def _energies(self, reading: StepReading) -> None:
        if self.has("threshold") and self.has("Ea"):
            reading.wrong("threshold", "both threshold and Ea", "one of them")
        elif not self.has("threshold") and not self.has("Ea"):
            reading.wrong(
                "threshold",
                "neither threshold nor Ea",
                'one of them, such as Ea = "102 kJ/mol"; threshold = "0 J/mol" if there is none',
            )
        if self.threshold is not None and self.threshold.value < 0:
            reading.wrong("threshold", "an energy below 0", "a threshold of at least 0 J/mol")
        if self.has("Ea_at") and not self.has("Ea"):
            reading.wrong("Ea_at", "Ea_at without Ea", "Ea beside it, or no Ea_at")
        if self.has("Ea") and not self.has("Ea_at") and reading.temperature_varies:
            reading.wrong(
                "Ea_at",
                "nothing, though the temperature varies",
                'the temperature at which Ea holds, such as Ea_at = "480 K"',
            )
