"""How the temperature of the gas is set: held, free, exchanging heat, or programmed."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Isothermal:
    """The gas stays at ``value`` [K]."""

    value: Sourced
    mode: ClassVar[str] = "isothermal"

    @property
    def initial(self) -> float:
        """Temperature at time zero [K]."""
        return self.value.value


@dataclass(frozen=True)
class Adiabatic:
    """The gas starts at ``value`` [K] and keeps its energy to itself."""

    value: Sourced
    mode: ClassVar[str] = "adiabatic"

    @property
    def initial(self) -> float:
        """Temperature at time zero [K]."""
        return self.value.value


@dataclass(frozen=True)
class Exchange:
    """The gas starts at ``value`` [K] and gives G (T - T_s) [W] to its surroundings.

    ``wall_heat_capacity`` [J/K], where given, is at the temperature of the gas.
    """

    value: Sourced
    surroundings: Sourced
    conductance: Sourced
    wall_heat_capacity: Sourced | None = None
    mode: ClassVar[str] = "exchange"

    @property
    def initial(self) -> float:
        """Temperature at time zero [K]."""
        return self.value.value


@dataclass(frozen=True)
class Program:
    """The gas follows (time [s], temperature [K]) points, linear between them, constant after."""

    points: tuple[tuple[Sourced, Sourced], ...]
    mode: ClassVar[str] = "program"

    @property
    def initial(self) -> float:
        """Temperature at time zero [K]."""
        return self.points[0][1].value

    @property
    def breaks(self) -> tuple[float, ...]:
        """Times at which the slope changes [s], zero left out."""
        return tuple(t.value for t, _ in self.points if t.value > 0)


Temperature = Isothermal | Adiabatic | Exchange | Program


def is_constant(temperature: Temperature) -> bool:
    """True where the gas has one temperature for the whole run."""
    if isinstance(temperature, Program):
        return len({T.value for _, T in temperature.points}) == 1
    return isinstance(temperature, Isothermal)


def has_energy_balance(temperature: Temperature) -> bool:
    """True where the temperature follows from an energy balance."""
    return isinstance(temperature, Adiabatic | Exchange)


def known_range(temperature: Temperature) -> tuple[float, float]:
    """Lowest and highest temperature known before the run [K]."""
    if isinstance(temperature, Program):
        values = [T.value for _, T in temperature.points]
        return min(values), max(values)
    return temperature.initial, temperature.initial
