"""What is asked about two gases: who they are, how warm, how much of them, which threshold.

Values keep the unit they were asked in and their source; kinetic theory gets plain numbers.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from meanfree.collisions import PairCollisions, collide, line_of_centres
from meanfree.gases.gas import Gas
from meanfree.gases.identity import are_same
from meanfree.sourced import Sourced

CLOSEST_SPHERES: Final[float] = 0.7404
"""Share of space that spheres fill at most, pi / sqrt(18): Hales, Ann. Math. 162, 1065 (2005)."""

CLOSEST_DISCS: Final[float] = 0.9069
"""Share of a plane that discs fill at most, pi / sqrt(12): Fejes Toth (1940)."""


@dataclass(frozen=True)
class PairQuestion:
    """Two gases whose masses and diameters are known, and the conditions.

    ``temperature`` [K]; ``pressure`` [Pa] of both together in space, or ``coverage``
    [mol/m^2] of both together in a plane, None where nothing was given; ``mole_fractions`` of
    the two, None for one gas and for half and half; ``threshold`` E0 or
    ``activation_energy`` Ea at that temperature [J/mol], at most one of them.
    """

    gases: tuple[Gas, Gas]
    temperature: Sourced
    in_plane: bool = False
    pressure: Sourced | None = None
    coverage: Sourced | None = None
    mole_fractions: tuple[float, float] | None = None
    threshold: Sourced | None = None
    activation_energy: Sourced | None = None

    @property
    def same_gas(self) -> bool:
        """Whether the two are one gas, by identity and never by equal masses."""
        return are_same(*self.gases)

    @property
    def has_threshold(self) -> bool:
        """Whether there is a k beside Z."""
        return self.threshold is not None or self.activation_energy is not None

    @property
    def barrier(self) -> line_of_centres.Threshold:
        """E0 [J/mol], 0 where none was given; flagged where Ea lies below RT/2."""
        if self.activation_energy is not None:
            return line_of_centres.threshold_from_activation_energy(
                self.activation_energy.value, self.temperature.value
            )
        return line_of_centres.Threshold(self.threshold.value if self.threshold else 0.0, False)

    @property
    def closest_packing(self) -> float:
        """Share of the room that molecules can fill at most [1]."""
        return CLOSEST_DISCS if self.in_plane else CLOSEST_SPHERES

    def collisions(self, temperature: float | None = None) -> PairCollisions:
        """What kinetic theory says, at another ``temperature`` [K] if one is given."""
        first, second = self.gases
        assert first.molar_mass is not None and second.molar_mass is not None
        assert first.diameter is not None and second.diameter is not None
        return collide(
            (first.molar_mass.value, second.molar_mass.value),
            (first.diameter.value, second.diameter.value),
            self.temperature.value if temperature is None else temperature,
            same_gas=self.same_gas,
            in_plane=self.in_plane,
            pressure=None if self.pressure is None else self.pressure.value,
            surface_concentration=None if self.coverage is None else self.coverage.value,
            mole_fractions=self.mole_fractions,
            threshold=float(self.barrier.energy),
        )
