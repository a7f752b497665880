"""``law = "termolecular"``: three bodies, A (T/T_ref)^n exp(-Ea/RT)."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Field

from meanfree.case.schema.base import Later, MolarEnergy, Number, Temperature
from meanfree.case.schema.steps import StepTable
from meanfree.rates.termolecular import Termolecular
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading


class TermolecularStep(StepTable):
    """Third order: two and M (the gas as a whole), or three molecules as written."""

    law: Literal["termolecular"]
    A: Annotated[Any, Later("6e-34 cm^6/s")] = Field(description='such as "6e-34 cm^6/s"')
    n: Annotated[Sourced, Number(-50, 50)] | None = Field(
        None, description="power of the temperature; needs T_ref"
    )
    T_ref: Temperature | None = Field(None, description="temperature at which A (T/T_ref)^n is A")
    Ea: MolarEnergy | None = Field(None, description="the energy in the exponential; default 0")

    def to_law(self, reading: StepReading) -> Termolecular | None:
        """`Termolecular` with A per event."""
        before = reading.count
        A = reading.rate_constant("A")
        if self.n is not None and self.n.value != 0 and not self.has("T_ref"):
            reading.wrong("T_ref", "nothing, though n is not 0", 'T_ref = "298 K" or "1 K", say')
        if A is None or reading.count > before or self._wrong:
            return None
        given = {key: getattr(self, key) for key in ("n", "T_ref", "Ea")}
        return Termolecular(A, **{k: reading.sourced(v) for k, v in given.items() if v is not None})
