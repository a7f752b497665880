"""Rate constants written in pressures (``1/torr/min``): of an ideal gas c = p/RT, so that a rate in
concentrations needs k times (RT)^(order - 1), which is another number at another temperature.
"""

from __future__ import annotations

from dataclasses import dataclass

from meanfree.constants import R
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, rate_constant, rate_constant_in_pressures, read
from meanfree.units.dimensions import named
from meanfree.units.gate import quoted

IN_CONCENTRATIONS = (
    "the same in concentrations: times (RT)^(order - 1) at the temperature where it was found. "
    "Only k of a fixed law in a run at one temperature, a source and the points of a table are "
    "converted here; A hides that factor of T, and would belong to another n and Ea"
)


@dataclass(frozen=True)
class InPressures:
    """A rate constant of some ``order`` by pressures, ``value`` [Pa^(1-order)/s]."""

    value: float
    order: float

    def at(self, T: float, source: str) -> Sourced:
        """The rate constant by concentrations at T [K], in SI."""
        dimension = rate_constant(self.order)
        value = self.value * (R * T) ** (self.order - 1)
        return Sourced(value, self.unit, source, dimension)

    @property
    def unit(self) -> str:
        """The unit in which it is shown and addressed from here on."""
        return named(rate_constant(self.order)).example.partition(" ")[2]

    def words(self, raw: object, T: float) -> str:
        """What was done, for a note."""
        from meanfree.units import from_si

        shown = from_si(self.at(T, "").value, self.unit, rate_constant(self.order))
        return (
            f"{quoted(raw)} counts pressures; times (RT)^{self.order - 1:g} at {T:g} K it is "
            f"{shown:.4g} {self.unit}, and is held at that. At another temperature it is another "
            "number, unless it is written in concentrations."
        )


def in_pressures(raw: object, order: float) -> InPressures | None:
    """What a text writes in pressures; None for anything else, and to first order."""
    if order == 1:
        return None
    try:
        return InPressures(read(raw, rate_constant_in_pressures(order)).value, order)
    except QuantityError:
        return None
