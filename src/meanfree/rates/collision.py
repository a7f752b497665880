"""The rate constant of hard-sphere collisions with a threshold along the line of centres."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

from meanfree.constants import R
from meanfree.rates.encounter import reduced_mass, speed_factor, symmetry
from meanfree.rates.law import Functions, Law, StepContext
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Collision(Law):
    """``law = "collision"``: k = P Z exp(-E0/RT), Z = sigma v_rel N_A, halved for like partners.

    Give ``threshold`` or ``Ea`` (which holds at ``Ea_at``, by default the run's
    temperature), and ``steric`` or ``A_over_Z`` (both absent: every collision above the threshold
    reacts). ``diameter`` [m] overrides the mean diameter of the two partners.

    Source: Levine, Molecular Reaction Dynamics, 2005, section 3.1 (line of centres).
    """

    threshold: Sourced | None = None
    Ea: Sourced | None = None
    Ea_at: Sourced | None = None
    steric: Sourced | None = None
    A_over_Z: Sourced | None = None
    diameter: Sourced | None = None
    word: ClassVar[str] = "collision"
    slots: ClassVar[tuple[str, ...]] = ("P", "s", "sigma", "mu", "E0")
    pair_needed: ClassVar[bool] = True

    @staticmethod
    def coefficient(fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """P s sigma sqrt(8 k_B T / pi mu) N_A exp(-E0/RT), s = 1/2 for like partners."""
        P, s, sigma, mu, E0 = numbers
        return P * s * sigma * speed_factor(fn, T, mu) * fn.exp(-E0 / (fn.R * T))

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(P, s, sigma [m^2], mu [kg], E0 [J/mol])"""
        sigma = math.pi * self.pair_diameter(context) ** 2
        return (
            self.steric_factor(context),
            symmetry(context),
            sigma,
            reduced_mass(context),
            self.threshold_energy(context),
        )

    def pair_diameter(self, context: StepContext) -> float:
        """Distance of the centres at contact [m]."""
        if self.diameter is not None:
            return self.diameter.value
        first, second = (gas.diameter for gas in context.partners)
        assert first is not None, "the loader asks for both diameters"
        assert second is not None, "the loader asks for both diameters"
        return 0.5 * (first.value + second.value)

    def threshold_energy(self, context: StepContext) -> float:
        """E0 [J/mol]; E0 = Ea - RT/2 at Ea's temperature, or 0 where that is negative."""
        if self.threshold is not None:
            return self.threshold.value
        if self.Ea is None:
            return 0.0
        return max(0.0, self.Ea.value - 0.5 * R * self._energy_temperature(context))

    def steric_factor(self, context: StepContext) -> float:
        """P; from A over Z by P = (A/Z) exp(-(Ea - E0)/RT) at Ea's temperature."""
        if self.steric is not None:
            return self.steric.value
        if self.A_over_Z is None:
            return 1.0
        if self.Ea is None:
            return self.A_over_Z.value * math.exp(-0.5)
        T = self._energy_temperature(context)
        excess = self.Ea.value - self.threshold_energy(context)
        return self.A_over_Z.value * math.exp(-excess / (R * T))

    def _energy_temperature(self, context: StepContext) -> float:
        T = self.Ea_at.value if self.Ea_at is not None else context.temperature
        assert T is not None, "the loader asks for Ea_at where the temperature varies"
        return T
