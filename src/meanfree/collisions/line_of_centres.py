"""The line-of-centres model: encounters react if they press hard enough along the centres.

Only the part of the relative kinetic energy that lies along the line of centres at contact
counts against the threshold E0. Sources: W. C. McC. Lewis, J. Chem. Soc. Trans. 113 (1918)
471; R. D. Present, Proc. Natl. Acad. Sci. 41 (1955) 415; P. Atkins and J. de Paula,
Physical Chemistry, 8th ed. (2006), section 24.1.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from meanfree import constants
from meanfree.collisions._checks import Numbers, finite, not_negative, plain, positive


@dataclass(frozen=True, slots=True)
class Threshold:
    """A threshold that was read off an activation energy.

    ``energy`` [J/mol] is E0 = Ea - R T / 2, or 0 where that is negative; ``below_half_rt``
    flags where it was: the line of centres then cannot give so small an activation energy.
    """

    energy: Numbers
    below_half_rt: bool | NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class StericFactors:
    """The two numbers that are called steric factor, which differ by exp(1/2) or less.

    ``steric`` [1] is P = k / (Z exp(-E0 / R T)); ``a_over_z`` [1] is k exp(Ea / R T) / Z,
    what textbooks tabulate; ``threshold`` is the E0 that goes with P, with its flag.
    """

    steric: Numbers
    a_over_z: Numbers
    threshold: Threshold


def fraction_above(threshold: Numbers, temperature: Numbers) -> Numbers:
    """Share of collisions with more than the threshold along the line of centres.

    exp(-E0 / (R T)), of spheres in space and of discs in a plane alike: the velocity along
    the line of centres has one dimension in both, and collisions pick it in proportion.

    Parameters
    ----------
    threshold : E0 [J/mol], any shape
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [1], the broadcast shape

    Raises
    ------
    ValueError : a negative threshold, a temperature that is not finite and above zero

    Source: Present (1955); Atkins and de Paula (2006), section 24.1.

    >>> f"{fraction_above(167e3, 700.0):.3e}"
    '3.456e-13'
    """
    barrier = not_negative("threshold", threshold, "J/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.exp(-barrier / (constants.R * kelvin)))


def reactive_cross_section(energy: Numbers, threshold: Numbers, cross_section: Numbers) -> Numbers:
    """Reactive cross-section at a relative kinetic energy E: sigma (1 - E0 / E) above E0, else 0.

    Parameters
    ----------
    energy : relative kinetic energy E [J/mol], any shape
    threshold : E0 [J/mol], a shape that broadcasts with it
    cross_section : of the spheres [m^2], a shape that broadcasts with it

    Returns
    -------
    [m^2], the broadcast shape

    Raises
    ------
    ValueError : a negative energy or threshold, a cross-section not above zero

    Source: Present (1955); Atkins and de Paula (2006), section 24.1.

    >>> f"{reactive_cross_section(80e3, 60e3, 4e-19):.2e}"
    '1.00e-19'
    """
    kinetic = not_negative("energy", energy, "J/mol")
    barrier = not_negative("threshold", threshold, "J/mol")
    target = positive("cross_section", cross_section, "m^2")
    return plain(target * _share_at_energy(kinetic, barrier))


def _share_at_energy(
    kinetic: NDArray[np.float64], barrier: NDArray[np.float64]
) -> NDArray[np.float64]:
    """1 - E0 / E above the threshold, else 0, without dividing by zero at E = 0."""
    # At E = 0 every division gives a share of zero, save without a barrier: there it is one.
    excess = np.where(barrier > 0.0, np.maximum(kinetic - barrier, 0.0), 1.0)
    divisor = np.where((barrier > 0.0) & (kinetic > 0.0), kinetic, 1.0)
    return np.asarray(excess / divisor)


def rate_constant(
    collision_rate_constant: Numbers,
    threshold: Numbers,
    temperature: Numbers,
    steric: Numbers = 1.0,
) -> Numbers:
    """Rate constant P Z exp(-E0 / (R T)) of the step as written.

    Z of like partners carries the half already, so this k counts encounters that react, not
    molecules lost. In a plane Z and k are in m^2/mol/s.

    Parameters
    ----------
    collision_rate_constant : Z [m^3/mol/s], any shape
    threshold : E0 [J/mol], a shape that broadcasts with it
    temperature : [K], a shape that broadcasts with it
    steric : steric factor P [1]

    Returns
    -------
    [m^3/mol/s], the broadcast shape

    Raises
    ------
    ValueError : Z or a temperature not above zero, a negative threshold or steric factor

    Source: Atkins and de Paula (2006), section 24.1.

    >>> f"{rate_constant(7.9e8, 167e3, 700.0):.2e}"
    '2.73e-04'
    """
    ceiling = positive("collision_rate_constant", collision_rate_constant, "m^3/mol/s")
    factor = not_negative("steric", steric, "1")
    return plain(factor * ceiling * np.asarray(fraction_above(threshold, temperature)))


def activation_energy(threshold: Numbers, temperature: Numbers) -> Numbers:
    """Ea = R T^2 d ln k / dT = E0 + R T / 2, in space and in a plane.

    Parameters
    ----------
    threshold : E0 [J/mol], any shape
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [J/mol], the broadcast shape

    Raises
    ------
    ValueError : a negative threshold, a temperature that is not finite and above zero

    Source: Atkins and de Paula (2006), section 24.1.

    >>> round(activation_energy(100e3, 500.0))
    102079
    """
    barrier = not_negative("threshold", threshold, "J/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(barrier + 0.5 * constants.R * kelvin)


def threshold_from_activation_energy(activation_energy: Numbers, temperature: Numbers) -> Threshold:
    """E0 = Ea - R T / 2 at one temperature; 0 and flagged where Ea is below R T / 2.

    Parameters
    ----------
    activation_energy : Ea [J/mol], any shape, may be negative
    temperature : at which Ea was read [K], a shape that broadcasts with it

    Returns
    -------
    Threshold, its energy [J/mol] in the broadcast shape

    Raises
    ------
    ValueError : an Ea that is not finite, a temperature that is not finite and above zero

    >>> threshold_from_activation_energy(0.0, 300.0)
    Threshold(energy=0.0, below_half_rt=True)
    """
    slope = finite("activation_energy", activation_energy, "J/mol")
    kelvin = positive("temperature", temperature, "K")
    barrier = slope - 0.5 * constants.R * kelvin
    below = np.asarray(barrier < 0.0)
    return Threshold(plain(np.maximum(barrier, 0.0)), bool(below) if below.ndim == 0 else below)


def steric_factors(
    rate_constant: Numbers,
    collision_rate_constant: Numbers,
    activation_energy: Numbers,
    temperature: Numbers,
) -> StericFactors:
    """Steric factor P and A over Z of a measured rate constant with its activation energy.

    P = k / (Z exp(-E0 / R T)) with E0 = Ea - R T / 2; A over Z = k exp(Ea / R T) / Z. Where
    E0 > 0 the second is exp(1/2) = 1.65 times the first. Both may exceed 1. A number too
    large for a float comes back as infinity.

    Parameters
    ----------
    rate_constant : k of the step as written [m^3/mol/s], any shape
    collision_rate_constant : Z of the pair [m^3/mol/s], a shape that broadcasts with it
    activation_energy : Ea [J/mol], a shape that broadcasts with it
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    StericFactors, each [1] in the broadcast shape

    Raises
    ------
    ValueError : k, Z or a temperature not above zero, an Ea that is not finite

    Source: Atkins and de Paula (2006), section 24.1.

    >>> both = steric_factors(1.0e-3, 8.0e7, 102e3, 480.0)
    >>> round(both.a_over_z / both.steric, 4)
    1.6487
    """
    constant = positive("rate_constant", rate_constant, "m^3/mol/s")
    ceiling = positive("collision_rate_constant", collision_rate_constant, "m^3/mol/s")
    threshold = threshold_from_activation_energy(activation_energy, temperature)
    thermal = constants.R * positive("temperature", temperature, "K")
    share = np.log(constant) - np.log(ceiling)
    with np.errstate(over="ignore"):
        steric = np.exp(share + np.asarray(threshold.energy) / thermal)
        a_over_z = np.exp(share + np.asarray(activation_energy) / thermal)
    return StericFactors(plain(steric), plain(a_over_z), threshold)


def steric_from_a_over_z(
    a_over_z: Numbers, activation_energy: Numbers, temperature: Numbers
) -> Numbers:
    """Steric factor P that goes with a tabulated A over Z at one temperature.

    P = (A over Z) exp(-(Ea - E0) / (R T)): divided by exp(1/2) wherever E0 > 0.

    Parameters
    ----------
    a_over_z : [1], any shape
    activation_energy : Ea [J/mol], a shape that broadcasts with it
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [1], the broadcast shape

    Raises
    ------
    ValueError : a negative A over Z, an Ea that is not finite, a temperature not above zero

    >>> round(steric_from_a_over_z(0.16, 102e3, 480.0), 3)
    0.097
    """
    tabulated = not_negative("a_over_z", a_over_z, "1")
    threshold = threshold_from_activation_energy(activation_energy, temperature)
    thermal = constants.R * positive("temperature", temperature, "K")
    gap = np.asarray(activation_energy) - np.asarray(threshold.energy)
    return plain(tabulated * np.exp(-gap / thermal))


def reactive_width(energy: Numbers, threshold: Numbers, swept_width: Numbers) -> Numbers:
    """Part of the swept width in which discs react: w sqrt(1 - E0 / E) above E0, else 0.

    At an impact parameter b the velocity along the line of centres is v sqrt(1 - (2 b / w)^2).
    Its flux-weighted mean over energies is exp(-E0 / (R T)), as in space.

    Parameters
    ----------
    energy : relative kinetic energy E [J/mol], any shape
    threshold : E0 [J/mol], a shape that broadcasts with it
    swept_width : w [m], a shape that broadcasts with it

    Returns
    -------
    [m], the broadcast shape

    Raises
    ------
    ValueError : a negative energy or threshold, a width not above zero

    >>> f"{reactive_width(80e3, 60e3, 6e-10):.1e}"
    '3.0e-10'
    """
    kinetic = not_negative("energy", energy, "J/mol")
    barrier = not_negative("threshold", threshold, "J/mol")
    target = positive("swept_width", swept_width, "m")
    return plain(target * np.sqrt(_share_at_energy(kinetic, barrier)))
