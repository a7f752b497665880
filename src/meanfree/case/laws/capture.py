"""``law = "capture"``: every pair that a long-range attraction brings together reacts."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Literal

from pydantic import Field

from meanfree.case.schema.base import MolarEnergy, Number, Quantity
from meanfree.case.schema.steps import StepTable
from meanfree.rates.capture import Capture
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading

_MAPS = ("polarisability", "ionisation_energy", "electron_affinity")


class CaptureStep(StepTable):
    """Capture by one of four attractions."""

    law: Literal["capture"]
    attraction: Literal[
        "dispersion", "ion and induced dipole", "ion and permanent dipole", "electron jump"
    ] = Field(description="what brings the two together")
    C6: Annotated[Sourced, Quantity("dispersion coefficient")] | None = Field(
        None, description='of a potential -C6/r^6, such as "60 hartree*bohr^6"'
    )
    polarisability: dict[str, Annotated[Sourced, Quantity("polarisability")]] | None = Field(
        None,
        description='volumes by gas, such as { N2 = "1.74 angstrom^3" }; default: those of the '
        "gases",
    )
    ionisation_energy: dict[str, MolarEnergy] | None = Field(
        None, description='by gas, such as { K = "4.34 eV" }; default: those of the gases'
    )
    electron_affinity: dict[str, MolarEnergy] | None = Field(
        None, description='by gas, such as { Br2 = "2.55 eV" }'
    )
    dipole: Annotated[Sourced, Quantity("dipole moment")] | None = Field(
        None,
        description='dipole moment of the neutral, such as "1.47 D"; default: that of the gas',
    )
    rotational_constant: MolarEnergy | None = Field(
        None, description="of the neutral: lets the range of the ion-dipole fit be checked"
    )
    electronic_factor: Annotated[Sourced, Number(0, 1, above=True)] | None = Field(
        None, description="share of the encounters on an attractive electronic surface"
    )

    def to_law(self, reading: StepReading) -> Capture | None:
        """`Capture`, if the step is an encounter of two molecules with masses."""
        before = reading.count
        reading.needs_pair(diameters=False)
        reading.counts_events()
        if reading.count > before or self._wrong:
            return None
        single = {
            key: reading.sourced(value)
            for key in ("C6", "dipole", "rotational_constant", "electronic_factor")
            if (value := getattr(self, key)) is not None
        }
        by_gas = {
            key: {gas: reading.sourced(value) for gas, value in (getattr(self, key) or {}).items()}
            for key in _MAPS
        }
        return Capture(self.attraction, **single, **by_gas)  # type: ignore[arg-type]
