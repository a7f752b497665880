"""Capture by long-range attraction: every pair that passes the centrifugal barrier reacts.

Four attractions: dispersion, an ion with the dipole it induces, an ion with a permanent
dipole, and the electron jump of a harpoon reaction.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import ClassVar, Literal

from meanfree.constants import N_A, e, eps0, h, k_B
from meanfree.errors import Problem
from meanfree.gases.gas import Gas
from meanfree.rates.encounter import masses_known, reduced_mass, symmetry
from meanfree.rates.law import Formula, Law, StepContext
from meanfree.rates.long_range import ELECTRIC, FORMULAS, capture_ratio
from meanfree.sourced import Sourced

Attraction = Literal[
    "dispersion", "ion and induced dipole", "ion and permanent dipole", "electron jump"
]

LARGEST_X = 60.0
"""Reduced dipole up to which the trajectory fit is used unremarked; common practice, no source."""


@dataclass(frozen=True)
class Capture(Law):
    """``law = "capture"``: the capture rate constant of one of four long-range attractions.

    ``polarisability`` [m^3] (as a volume), ``ionisation_energy`` and ``electron_affinity`` [J/mol]
    are given by gas. "dispersion" takes ``C6`` [J m^6], or polarisabilities and ionisation
    energies of both for London's formula; the two "ion" attractions take the polarisability of
    the neutral, the second its ``dipole`` [C m] too (``rotational_constant`` [J/mol] lets the
    range of the fit be checked); "electron jump" takes the ionisation energy of the one and the
    electron affinity of the other. ``electronic_factor`` [1] is the share of encounters on an
    attractive electronic surface. Like partners carry the 1/2. What a step does not give is taken
    from its gases: polarisability, ionisation energy and dipole.
    """

    attraction: Attraction
    C6: Sourced | None = None
    polarisability: Mapping[str, Sourced] = field(default_factory=dict)
    ionisation_energy: Mapping[str, Sourced] = field(default_factory=dict)
    electron_affinity: Mapping[str, Sourced] = field(default_factory=dict)
    dipole: Sourced | None = None
    rotational_constant: Sourced | None = None
    electronic_factor: Sourced = Sourced(1.0, default=True)
    word: ClassVar[str] = "capture"
    pair_needed: ClassVar[bool] = True

    def template(self, context: StepContext) -> Formula:
        """The formula of this attraction."""
        return FORMULAS[self.attraction]

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(g s, mu [kg]) and then what the attraction takes; see `long_range`."""
        share = symmetry(context) * self.electronic_factor.value
        pair = (share, reduced_mass(context))
        if self.attraction == "dispersion":
            return (*pair, self.dispersion_coefficient(context))
        if self.attraction == "electron jump":
            return (*pair, self.jump_distance(context))
        ion, neutral = _ion_and_neutral(context)
        alpha = self._known("polarisability", neutral)
        pull = ion.charge**2 * ELECTRIC * alpha
        if self.attraction == "ion and induced dipole":
            return (*pair, pull)
        return (*pair, pull, self._dipole(neutral) ** 2 / (4 * math.pi * eps0) / alpha)

    def _of(self, key: str, gas: Gas) -> Sourced | None:
        """What the step gives of a gas, else what the gas has; None without either."""
        given: Sourced | None = getattr(self, key).get(gas.name)
        own: Sourced | None = getattr(gas, key, None)
        return own if given is None else given

    def _known(self, key: str, gas: Gas) -> float:
        found = self._of(key, gas)
        assert found is not None, "problems() has looked"
        return found.value

    def _dipole(self, neutral: Gas) -> float:
        found = neutral.dipole if self.dipole is None else self.dipole
        assert found is not None, "problems() has looked"
        return found.value

    def dispersion_coefficient(self, context: StepContext) -> float:
        """C6 [J m^6]: given, or 3/2 a1 a2 I1 I2/(I1 + I2).

        Source: F. London, Trans. Faraday Soc. 33, 8 (1937).
        """
        if self.C6 is not None:
            return self.C6.value
        first, second = context.partners
        a = self._known("polarisability", first) * self._known("polarisability", second)
        I1, I2 = (self._known("ionisation_energy", gas) / N_A for gas in (first, second))
        return 1.5 * a * I1 * I2 / (I1 + I2)

    def jump_distance(self, context: StepContext) -> float:
        """R = e^2/(4 pi eps0 (I - EA)) [m], where the ionic curve crosses the neutral one.

        Source: Atkins and de Paula, Physical Chemistry, 8th ed. (2006), section 24.1; M. Polanyi,
        Atomic Reactions, 1932.
        """
        donor = self._donor(context)
        assert donor is not None, "problems() has looked"
        (affinity,) = self.electron_affinity.values()
        return ELECTRIC * N_A / (self._known("ionisation_energy", donor) - affinity.value)

    def _donor(self, context: StepContext) -> Gas | None:
        """The gas that gives the electron: whose ionisation energy is given, else the partner of
        the one whose electron affinity is, if it has one itself."""
        for gas in context.partners:
            if gas.name in self.ionisation_energy:
                return gas
        others = [gas for gas in context.partners if gas.name not in self.electron_affinity]
        return next((gas for gas in others if gas.ionisation_energy is not None), None)

    # What is impossible

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """No encounter, no masses, quantities missing, wrong charges, a factor out of range."""
        before = list(super().problems(context))
        yield from before
        yield from masses_known(context)
        if not 0 < self.electronic_factor.value <= 1:
            found = f"{self.electronic_factor.value:g}"
            yield Problem("electronic_factor", found, "a share above 0, at most 1")
        if before:
            return
        names = {gas.name for gas in context.partners}
        for key in ("polarisability", "ionisation_energy", "electron_affinity"):
            for name in getattr(self, key):
                if name not in names:
                    expected = " or ".join(sorted(names))
                    yield Problem(f"{key}.{name}", "a gas that does not collide here", expected)
        if self.attraction == "dispersion":
            yield from self._dispersion_problems(context)
        elif self.attraction == "electron jump":
            yield from self._jump_problems(context)
        else:
            yield from self._ion_problems(context)

    def _dispersion_problems(self, context: StepContext) -> Iterator[Problem]:
        if self.C6 is not None:
            return
        gases = {gas.name: gas for gas in context.partners}
        for key in ("polarisability", "ionisation_energy"):
            for name in sorted(gases):
                if self._of(key, gases[name]) is None:
                    yield Problem(f"{key}.{name}", "nothing", "one for each partner, or C6")

    def _jump_problems(self, context: StepContext) -> Iterator[Problem]:
        donor = self._donor(context)
        counts = {
            "ionisation_energy": max(len(self.ionisation_energy), 0 if donor is None else 1),
            "electron_affinity": len(self.electron_affinity),
        }
        for key, count in counts.items():
            if count != 1:
                expected = "that of one partner: the other takes or gives the electron"
                yield Problem(key, f"{count} gases", expected)
                return
        assert donor is not None, "there is one"
        acceptor = next(iter(self.electron_affinity))
        ionisation = self._known("ionisation_energy", donor)
        if ionisation <= self.electron_affinity[acceptor].value:
            found = f"an electron affinity of {acceptor} at or above that ionisation energy"
            expected = "an ionisation energy above it: else the electron jumps at any distance"
            yield Problem(f"ionisation_energy.{donor.name}", found, expected)

    def _ion_problems(self, context: StepContext) -> Iterator[Problem]:
        charges = [gas.charge for gas in context.partners]
        if sorted(charge != 0 for charge in charges) != [False, True]:
            found = "charges " + " and ".join(f"{charge:+d}" for charge in charges)
            yield Problem("reaction", found, "one ion and one neutral molecule")
            return
        _, neutral = _ion_and_neutral(context)
        if self._of("polarisability", neutral) is None:
            expected = f"the polarisability of {neutral.name}, which is the neutral"
            yield Problem(f"polarisability.{neutral.name}", "nothing", expected)
        lacking = self.dipole is None and neutral.dipole is None
        if self.attraction == "ion and permanent dipole" and lacking:
            yield Problem("dipole", "nothing", f'the dipole of {neutral.name}, such as "1.5 D"')

    # What is worth knowing

    def cautions(self, context: StepContext) -> Iterator[str]:
        """Where the fit of the ion-dipole trajectories is stretched."""
        if self.attraction != "ion and permanent dipole" or context.temperatures is None:
            return
        cold = context.temperatures[0]
        x = self.reduced_dipole(context, cold)
        if x > LARGEST_X:
            yield (
                f"at {cold:g} K the reduced dipole x is {x:.3g}, beyond the {LARGEST_X:g} up to "
                "which the fit of ion-dipole trajectories is commonly used."
            )
        if self.rotational_constant is not None:
            yield from self._rotation_cautions(context, cold, x)

    def _rotation_cautions(self, context: StepContext, cold: float, x: float) -> Iterator[str]:
        """Source: T. Su and W. J. Chesnavich, J. Chem. Phys. 76, 5183 (1982) (from memory)."""
        assert self.rotational_constant is not None
        B = self.rotational_constant.value / N_A
        inertia = h**2 / (8 * math.pi**2 * B)
        ion, neutral = _ion_and_neutral(context)
        alpha = self._known("polarisability", neutral)
        length = self._dipole(neutral) / (abs(ion.charge) * e)
        reduced = length * inertia / (alpha * reduced_mass(context))
        if reduced >= (0.7 + x * x) / (2 + 0.6 * x):
            yield (
                f"the reduced moment of inertia is {reduced:.3g} at {cold:g} K: {neutral.name} "
                "turns too slowly for the fit of ion-dipole trajectories, which gives too much."
            )
        quantum = B / k_B
        if cold < quantum:
            yield (
                f"{cold:g} K is below the rotational constant of {neutral.name} ({quantum:.3g} K): "
                "the classical ion-dipole trajectories do not hold."
            )

    def reduced_dipole(self, context: StepContext, T: float) -> float:
        """x = mu_D/sqrt(2 alpha k_B T), dipole and polarisability in electrostatic units [1]."""
        _, _, _, dipole_energy = self.numbers(context)
        return math.sqrt(dipole_energy / (2 * k_B * T))

    def enhancement(self, context: StepContext, T: float) -> float:
        """K, the factor over the capture by the induced dipole alone, at T [K]."""
        return float(capture_ratio(self.reduced_dipole(context, T)))


def _ion_and_neutral(context: StepContext) -> tuple[Gas, Gas]:
    first, second = context.partners
    return (first, second) if first.charge else (second, first)
