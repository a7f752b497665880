"""The closed reactor: what it holds constant, its size, its shape and its dead space."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from meanfree.rates.law import Interior
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Shape:
    """The inside of a vessel: a sphere, a cylinder, or only its surface.

    ``diameter`` and ``length`` [m], ``surface`` [m^2]; for a sphere the diameter may be
    left out: the volume gives it.
    """

    form: Literal["sphere", "cylinder", "stated"]
    diameter: Sourced | None = None
    length: Sourced | None = None
    surface: Sourced | None = None

    def area(self, volume: float) -> float:
        """Inner surface [m^2] of a vessel of that volume [m^3]."""
        if self.form == "stated":
            assert self.surface is not None
            return self.surface.value
        if self.form == "sphere":
            return math.pi * self.width(volume) ** 2
        assert self.length is not None
        d = self.width(volume)
        return math.pi * d * self.length.value + 0.5 * math.pi * d**2

    def width(self, volume: float) -> float:
        """Diameter [m]; of the sphere with that volume where none is given."""
        if self.diameter is not None:
            return self.diameter.value
        if self.form == "cylinder":
            assert self.length is not None
            return math.sqrt(4 * volume / (math.pi * self.length.value))
        return math.cbrt(6 * volume / math.pi)


@dataclass(frozen=True)
class DeadSpace:
    """Gauge and lines: a volume [m^3] at its own temperature [K] and the common pressure."""

    volume: Sourced
    temperature: Sourced


@dataclass(frozen=True)
class Vessel:
    """A rigid vessel (``holds = "volume"``) or a piston or bag (``holds = "pressure"``).

    ``volume`` [m^3] is that at filling; ``pressure`` [Pa] is what a piston holds, by default
    the sum of the filled partial pressures; ``gauge_resolution`` [Pa] the smallest change that its
    gauge shows.
    """

    holds: Literal["volume", "pressure"]
    volume: Sourced
    pressure: Sourced | None = None
    rated_pressure: Sourced | None = None
    shape: Shape | None = None
    dead_space: DeadSpace | None = None
    gauge_resolution: Sourced | None = None

    @property
    def is_rigid(self) -> bool:
        """True where the volume is held."""
        return self.holds == "volume"

    @property
    def surface_to_volume(self) -> float | None:
        """S/V at filling [1/m], None where no shape is stated."""
        if self.shape is None:
            return None
        return self.shape.area(self.volume.value) / self.volume.value

    @property
    def interior(self) -> Interior | None:
        """Form and sizes of the inside; None where only the surface, or nothing, is stated."""
        if self.shape is None or self.shape.form == "stated":
            return None
        radius = 0.5 * self.shape.width(self.volume.value)
        length = None if self.shape.length is None else self.shape.length.value
        return Interior(self.shape.form, radius, length)

    @property
    def filling_volume(self) -> float:
        """Volume at filling [m^3]."""
        return self.volume.value
