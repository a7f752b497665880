"""``law = "arrhenius"``: A (T/T_ref)^n exp(-Ea/RT)."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import Field

from meanfree.case.schema.base import Later, MolarEnergy, Number, Temperature
from meanfree.case.schema.steps import StepTable
from meanfree.rates.arrhenius import Arrhenius
from meanfree.sourced import Sourced

if TYPE_CHECKING:
    from meanfree.case.step_reading import StepReading


class ArrheniusStep(StepTable):
    """k = A (T/T_ref)^n exp(-Ea/RT)."""

    law: Literal["arrhenius"]
    A: Annotated[Any, Later("9.4e9 L/mol/s", "1e13 1/s")] = Field(
        description='the factor before the exponential, such as "9.4e9 L/mol/s"'
    )
    Ea: MolarEnergy = Field(description="the energy in the exponential")
    n: Annotated[Sourced, Number(-50, 50)] | None = Field(
        None, description="power of the temperature; needs T_ref"
    )
    T_ref: Temperature | None = Field(None, description="temperature at which A (T/T_ref)^n is A")

    def to_law(self, reading: StepReading) -> Arrhenius | None:
        """`Arrhenius` with A per event."""
        A = reading.rate_constant("A")
        powered = self.n is not None and self.n.value != 0
        if powered and not self.has("T_ref"):
            reading.wrong("T_ref", "nothing, though n is not 0", 'T_ref = "298 K" or "1 K", say')
        if self.T_ref is not None and self.n is None and not self.is_wrong("n"):
            reading.wrong("T_ref", "a reference temperature without n", "n beside it, or no T_ref")
        if A is None or self._wrong:
            return None
        law = Arrhenius(A=A, Ea=reading.sourced(self.Ea))
        if self.n is None or self.T_ref is None:
            return law
        return Arrhenius(
            A=A, Ea=law.Ea, n=reading.sourced(self.n), T_ref=reading.sourced(self.T_ref)
        )
