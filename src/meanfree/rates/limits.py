"""The two limits of a falloff step: a power law with an exponential, or strong collisions.

The strong-collision estimate of k0 is a power law too, so both give the same four numbers.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Protocol

from meanfree.constants import N_A, R, k_B
from meanfree.errors import Problem
from meanfree.gases.gas import Gas
from meanfree.rates.law import StepContext
from meanfree.sourced import Sourced

T_REFERENCE = 300.0
"""Temperature at which the estimate's factor is worked out [K]; any one gives the same k0(T)."""


class Limit(Protocol):
    """A limiting rate constant A (T/T_ref)^n exp(-E/RT), however its numbers are found."""

    def numbers(self, context: StepContext) -> tuple[float, float, float, float]:
        """(A [SI], n, T_ref [K], E [J/mol])"""
        ...

    def problems(self, key: str, context: StepContext) -> Iterator[Problem]:
        """What is impossible, under that key."""
        ...

    def cautions(self, context: StepContext) -> Iterator[str]:
        """What a reader should know."""
        ...


@dataclass(frozen=True)
class PowerLaw:
    """A (T/T_ref)^n exp(-Ea/RT); ``Ea`` 0 and ``n`` 0 where not given."""

    A: Sourced
    n: Sourced = Sourced(0.0, default=True)
    T_ref: Sourced = Sourced(1.0, "K", dimension="temperature", default=True)
    Ea: Sourced = Sourced(0.0, "J/mol", dimension="molar energy", default=True)

    def numbers(self, context: StepContext) -> tuple[float, float, float, float]:
        """(A [SI], n, T_ref [K], Ea [J/mol])"""
        return (self.A.value, self.n.value, self.T_ref.value, self.Ea.value)

    def problems(self, key: str, context: StepContext) -> Iterator[Problem]:
        """A factor below zero; a power without its reference temperature."""
        if self.A.value < 0:
            yield Problem(f"{key}.A", f"{self.A.value:g}", "a factor of at least 0")
        if self.n.value != 0 and self.T_ref.default:
            expected = 'T_ref = "298 K" or "1 K", say'
            yield Problem(f"{key}.T_ref", "nothing, though n is not 0", expected)

    def cautions(self, context: StepContext) -> Iterator[str]:
        """Nothing."""
        yield from ()


@dataclass(frozen=True)
class StrongCollisions:
    """k0 of a unimolecular step: every collision with ``partner`` takes a hot molecule's energy.

    k0 = beta_c Z (E0/RT)^(s-1)/(s-1)! exp(-E0/RT), with Z = pi d^2 v_rel N_A. Z carries no half,
    also where the partner is the reactant itself: either of the two may be energised.
    ``threshold`` E0 [J/mol], ``oscillators`` s [1], ``collision_efficiency`` beta_c [1];
    ``partner`` is the gas whose efficiency is 1, ``diameter`` [m] overrides the pair's mean.

    Source: C. N. Hinshelwood, Proc. Roy. Soc. A 113, 230 (1926); P. J. Robinson and
    K. A. Holbrook, Unimolecular Reactions, 1972, chapter 1 (both from memory).
    """

    threshold: Sourced
    oscillators: Sourced
    partner: str
    collision_efficiency: Sourced = Sourced(1.0, default=True)
    diameter: Sourced | None = None

    def numbers(self, context: StepContext) -> tuple[float, float, float, float]:
        """Z goes as T^(1/2) and the rest as T^(1-s), so k0 is a power law with n = 3/2 - s."""
        s, E0 = self.oscillators.value, self.threshold.value
        Z = self.collision_rate(context)
        levels = (E0 / (R * T_REFERENCE)) ** (s - 1) / math.gamma(s)
        A = self.collision_efficiency.value * Z * levels
        return (A, 1.5 - s, T_REFERENCE, E0)

    def collision_rate(self, context: StepContext) -> float:
        """Z at `T_REFERENCE` [m^3/mol/s], without the half for like molecules."""
        reactant, partner = self._pair(context)
        assert reactant.molar_mass is not None and partner.molar_mass is not None
        m1, m2 = reactant.molar_mass.value, partner.molar_mass.value
        mu = m1 * m2 / (m1 + m2) / N_A
        speed = math.sqrt(8 * k_B * T_REFERENCE / (math.pi * mu))
        return N_A * math.pi * self._contact(reactant, partner) ** 2 * speed

    def _contact(self, reactant: Gas, partner: Gas) -> float:
        if self.diameter is not None:
            return self.diameter.value
        assert reactant.diameter is not None and partner.diameter is not None
        return 0.5 * (reactant.diameter.value + partner.diameter.value)

    def _pair(self, context: StepContext) -> tuple[Gas, Gas]:
        assert context.gases is not None
        return context.reactants[0], context.gases[self.partner]

    def problems(self, key: str, context: StepContext) -> Iterator[Problem]:
        """Not one molecule, an unknown partner, no mass or size, numbers out of range."""
        if len(context.reactants) != 1:
            found = f"{len(context.reactants)} molecules on the left"
            yield Problem("reaction", found, "one molecule that is energised by M")
            return
        if context.gases is None or self.partner not in context.gases:
            yield Problem(f"{key}.partner", f'"{self.partner}"', "a gas of the case")
            return
        for gas in dict.fromkeys(self._pair(context)):
            if gas.molar_mass is None:
                found = f"the label {gas.name}, which has no mass"
                yield Problem(key, found, "a k0 of its own, with A and Ea")
            elif self.diameter is None and gas.diameter is None:
                expected = f"a diameter under [gases.{gas.name}], or one here"
                yield Problem(f"{key}.diameter", f"no known diameter of {gas.name}", expected)
        if not self.threshold.value > 0:
            yield Problem(f"{key}.threshold", f"{self.threshold.value:g} J/mol", "one above 0")
        if not self.oscillators.value >= 1:
            expected = "a number of oscillators of at least 1"
            yield Problem(f"{key}.oscillators", f"{self.oscillators.value:g}", expected)
        if not 0 < self.collision_efficiency.value <= 1:
            found = f"{self.collision_efficiency.value:g}"
            yield Problem(f"{key}.collision_efficiency", found, "a fraction above 0, at most 1")

    def cautions(self, context: StepContext) -> Iterator[str]:
        """That k0 is an estimate."""
        yield (
            f"k0 is estimated from {self.oscillators.value:g} classical oscillators that every "
            f"collision with {self.partner} empties with probability "
            f"{self.collision_efficiency.value:g}: good to an order of magnitude at best."
        )
