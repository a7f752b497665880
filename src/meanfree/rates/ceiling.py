"""How fast two gases could react at most, and what a rate constant is against that.

The ceiling of a hard-sphere step is its collision rate constant Z: every encounter reacts. What a
supplied k is against it (steric factor P, A over Z, a verdict in words) is worked out here,
once, for every table that shows it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from enum import Enum

from meanfree.collisions import encounters, line_of_centres, speeds
from meanfree.constants import R
from meanfree.gases.gas import Gas

_RAISED = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")
OVER = 1e-9
"""How far, relatively, P or k/Z must lie above 1 to count: rounding lies below."""


NEAR = 0.1
"""From this share of all encounters on a step is called limited by them; common practice, no
source. The same share divides what a barrier takes from what a steric factor takes."""


class Standing(Enum):
    """How a rate constant stands to its ceilings. There are no others."""

    NONE = "no reaction"
    SUSPECT = "above hard spheres and above long-range capture: suspect"
    ABOVE = "above hard spheres: long-range attraction, or suspect"
    STEEP = "above hard spheres with that barrier: long-range attraction, or suspect"
    LONG_RANGE = "above hard spheres, within long-range capture"
    LIMITED = "collision-limited"
    ACTIVATED = "activated: a barrier holds it"
    HINDERED = "hindered: most encounters with the energy fail"
    BOTH = "activated and hindered"
    UNKNOWN = "below the collision limit; no activation energy is stated"
    OVER_CAPTURE = "above long-range capture: suspect"
    CAPTURED = "capture-limited"
    BELOW_CAPTURE = "below long-range capture"

    @property
    def is_above(self) -> bool:
        """True where hard spheres cannot give it."""
        return self.may_be_wrong or self is Standing.LONG_RANGE

    @property
    def may_be_wrong(self) -> bool:
        """True where nothing that is known explains it."""
        return self in (
            Standing.SUSPECT,
            Standing.ABOVE,
            Standing.STEEP,
            Standing.OVER_CAPTURE,
        )


@dataclass(frozen=True, slots=True)
class Ceiling:
    """The encounters of two gases at one temperature.

    ``Z`` [m^3/mol/s], halved for like partners; ``pair_diameter`` [m]; ``cross_section`` [m^2];
    ``relative_speed`` [m/s], the mean.
    """

    Z: float
    pair_diameter: float
    cross_section: float
    relative_speed: float
    like: bool
    temperature: float


@dataclass(frozen=True, slots=True)
class Judgement:
    """A rate constant against its ceiling.

    ``k`` and ``Z`` [m^3/mol/s] count encounters; ``Ea`` and ``threshold`` [J/mol]; ``steric`` and
    ``A_over_Z`` [1]. The last four are None where no activation energy is known.
    ``below_half_rt`` flags Ea < RT/2, where the line of centres has no threshold to give.
    """

    k: float
    Z: float
    Ea: float | None
    threshold: float | None
    steric: float | None
    A_over_Z: float | None
    below_half_rt: bool

    @property
    def exceeds_ceiling(self) -> bool:
        """True where more than every encounter would have to react."""
        return self.k > self.Z * (1 + OVER)

    @property
    def exceeds_barrier(self) -> bool:
        """True where more than every encounter above the threshold would have to react."""
        return self.steric is not None and self.steric > 1 + OVER

    @property
    def is_suspect(self) -> bool:
        """True where hard spheres cannot give this rate constant."""
        return self.exceeds_ceiling or self.exceeds_barrier

    def standing(self, long_range: float | None = None) -> Standing:
        """Where k stands to Z and to a long-range ceiling [m^3/mol/s], None where not known."""
        if self.k == 0:
            return Standing.NONE
        demanded = max(self.k, 0.0 if self.steric is None else self.steric * self.Z)
        if self.is_suspect:
            if long_range is None:
                return Standing.ABOVE if self.exceeds_ceiling else Standing.STEEP
            within = demanded <= long_range * (1 + OVER)
            return Standing.LONG_RANGE if within else Standing.SUSPECT
        return self._below()

    def _below(self) -> Standing:
        if self.k >= NEAR * self.Z:
            return Standing.LIMITED
        if self.steric is None:
            return Standing.UNKNOWN
        barrier = self.k / (self.steric * self.Z)
        if self.steric < NEAR and barrier < NEAR:
            return Standing.BOTH
        return Standing.HINDERED if self.steric < barrier else Standing.ACTIVATED

    @property
    def verdict(self) -> str:
        """What that means, in words."""
        if self.exceeds_ceiling:
            return f"above the collision limit: {_count(self.k / self.Z)} times Z, so suspect"
        if self.k == 0:
            return "no reaction"
        if self.steric is None:
            return (
                f"below the collision limit: {_one_in(self.k / self.Z)} reacts; "
                "no activation energy is stated, so no steric factor"
            )
        if self.exceeds_barrier:
            return (
                f"above the limit for its barrier: {_count(self.steric)} times the encounters "
                "that have the energy, so suspect"
            )
        flag = "; Ea is below RT/2, so E0 = 0" if self.below_half_rt else ""
        which = "encounters" if self.below_half_rt else "encounters with the energy"
        if self.steric > 1 - 1e-6:
            return f"at the collision limit: all {which} react{flag}"
        return f"below the collision limit: {_one_in(self.steric, which)} reacts{flag}"


def _one_in(share: float, which: str = "encounters") -> str:
    if share > 0.1:
        return f"a share of {share:.2g} of the {which}"
    return f"one in {_count(1 / share)} {which}"


def _count(value: float) -> str:
    if value < 1e5:
        return f"{value:.3g}" if value < 1e3 else f"{value:.0f}"
    mantissa, power = f"{value:.2e}".split("e")
    return f"{mantissa} × 10{str(int(power)).translate(_RAISED)}"


def ceiling(
    partners: tuple[Gas, ...], temperature: float, diameter: float | None = None
) -> Ceiling | None:
    """The collision ceiling of two gases, None where a mass or a diameter is not known.

    Parameters
    ----------
    partners : the two colliding gases; the same gas twice for like partners
    temperature : [K]
    diameter : mean diameter of the pair [m], where a step overrides that of its gases

    Returns
    -------
    Ceiling, or None: not two partners, or nothing known of one of them

    Raises
    ------
    ValueError : a temperature or a diameter that is not finite and above zero

    Source: P. Atkins and J. de Paula, Physical Chemistry, 8th ed. (2006), section 24.1.
    """
    if len(partners) != 2:
        return None
    first, second = partners
    if first.molar_mass is None or second.molar_mass is None:
        return None
    if diameter is None:
        if first.diameter is None or second.diameter is None:
            return None
        pair = encounters.pair_diameter(first.diameter.value, second.diameter.value)
        diameter = float(pair)
    like = first.name == second.name
    masses = (first.molar_mass.value, second.molar_mass.value)
    speed = float(speeds.mean_relative_speed(*masses, temperature))
    area = float(encounters.cross_section_from_diameters(diameter, diameter))
    Z = float(encounters.collision_rate_constant(area, speed, like=like))
    return Ceiling(Z, diameter, area, speed, like, temperature)


def activation_energy(rate_constant: Callable[[float], float], temperature: float) -> float:
    """Ea = R T^2 d ln k / dT at one temperature [J/mol], by five points in 1/T.

    ``rate_constant`` maps T [K] to k, in any unit. In 1/T ln k is straight for an Arrhenius
    law, so that the difference is exact but for rounding (about 1e-11 of Ea).

    Raises ValueError where k is not above zero.
    """
    x, h = 1.0 / temperature, 1e-3 / temperature
    ln = []
    for places in (-2, -1, 1, 2):
        k = float(rate_constant(1.0 / (x + places * h)))
        if not k > 0:
            raise ValueError(f"rate_constant: found {k:g} near {temperature:g} K; expected above 0")
        ln.append(math.log(k))
    slope = (ln[0] - 8 * ln[1] + 8 * ln[2] - ln[3]) / (12 * h)
    return -R * slope


def judge(k: float, Ea: float | None, limit: Ceiling) -> Judgement:
    """Steric factor and A over Z of ``k`` [m^3/mol/s per event] with its Ea [J/mol].

    ``Ea`` is that at the ceiling's temperature, None where it is not known.

    Raises ValueError for a negative k.
    """
    if k < 0:
        raise ValueError(f"k: found {k:g}; expected at least 0")
    if Ea is None or k == 0:
        return Judgement(k, limit.Z, Ea, None, None, None, False)
    factors = line_of_centres.steric_factors(k, limit.Z, Ea, limit.temperature)
    return Judgement(
        k,
        limit.Z,
        Ea,
        float(factors.threshold.energy),
        float(factors.steric),
        float(factors.a_over_z),
        bool(factors.threshold.below_half_rt),
    )


def against_capture(k: float, long_range: float) -> Standing:
    """Where ``k`` stands to a long-range ceiling [m^3/mol/s] where no diameter gives another.

    Raises ValueError for a negative k.
    """
    if k < 0:
        raise ValueError(f"k: found {k:g}; expected at least 0")
    if k == 0:
        return Standing.NONE
    if k > long_range * (1 + OVER):
        return Standing.OVER_CAPTURE
    return Standing.CAPTURED if k >= NEAR * long_range else Standing.BELOW_CAPTURE
