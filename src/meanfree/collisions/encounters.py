"""Encounters of hard spheres in space: cross-sections, collision rates, mean free paths.

An encounter is counted once. Between unlike molecules there are c_A c_B pairs, between
like ones half of c_A squared: the half is asked for by name wherever it matters, because
leaving it out is the commonest factor of two in the trade.

Sources: P. Atkins and J. de Paula, Physical Chemistry, 8th ed. (2006), sections 21.1 and
24.1.
"""

from __future__ import annotations

import numpy as np

from meanfree import constants
from meanfree.collisions._checks import Numbers, not_negative, plain, positive


def pair_diameter(diameter_a: Numbers, diameter_b: Numbers) -> Numbers:
    """Distance of the centres of A and B at contact, (d_A + d_B) / 2.

    Parameters
    ----------
    diameter_a, diameter_b : [m], shapes that broadcast

    Returns
    -------
    [m], the broadcast shape

    Raises
    ------
    ValueError : a diameter that is not finite and above zero

    >>> f"{pair_diameter(2.25e-10, 5.59e-10):.3e}"
    '3.920e-10'
    """
    first = positive("diameter_a", diameter_a, "m")
    second = positive("diameter_b", diameter_b, "m")
    return plain(0.5 * (first + second))


def cross_section_from_diameters(diameter_a: Numbers, diameter_b: Numbers) -> Numbers:
    """Collision cross-section of two spheres, pi ((d_A + d_B) / 2)^2.

    Parameters
    ----------
    diameter_a, diameter_b : [m], shapes that broadcast

    Returns
    -------
    [m^2], the broadcast shape

    Raises
    ------
    ValueError : a diameter that is not finite and above zero

    Source: Atkins and de Paula (2006), section 24.1.

    >>> f"{cross_section_from_diameters(3.61e-10, 3.61e-10):.3e}"  # oxygen
    '4.094e-19'
    """
    contact = np.asarray(pair_diameter(diameter_a, diameter_b))
    return plain(np.pi * contact**2)


def cross_section_from_radii(radius_a: Numbers, radius_b: Numbers) -> Numbers:
    """Collision cross-section of two spheres, pi (r_A + r_B)^2.

    Parameters
    ----------
    radius_a, radius_b : [m], shapes that broadcast

    Returns
    -------
    [m^2], the broadcast shape

    Raises
    ------
    ValueError : a radius that is not finite and above zero

    Source: Atkins and de Paula (2006), section 24.1.

    >>> f"{cross_section_from_radii(78e-12, 265e-12):.3e}"  # O and benzene
    '3.696e-19'
    """
    first = positive("radius_a", radius_a, "m")
    second = positive("radius_b", radius_b, "m")
    return plain(np.pi * (first + second) ** 2)


def collision_rate_constant(
    cross_section: Numbers, relative_speed: Numbers, *, like: bool
) -> Numbers:
    """Collision rate constant Z = sigma v_rel N_A, halved for like partners.

    Z times the product of the two concentrations is the number of encounters; it is the
    rate constant that a step would have if every encounter reacted. ``like`` says whether
    the partners are molecules of one gas and has no default on purpose.

    Parameters
    ----------
    cross_section : [m^2], any shape
    relative_speed : mean relative speed [m/s], a shape that broadcasts with it
    like : True where both partners are the same gas

    Returns
    -------
    [m^3/mol/s], the broadcast shape

    Raises
    ------
    ValueError : a cross-section or speed that is not finite and above zero

    Source: Atkins and de Paula (2006), section 24.1.

    >>> f"{collision_rate_constant(4.0942e-19, 628.14, like=True):.4e}"  # oxygen, 298 K
    '7.7437e+07'
    """
    target = positive("cross_section", cross_section, "m^2")
    speed = positive("relative_speed", relative_speed, "m/s")
    counted = 0.5 if like else 1.0
    return plain(counted * constants.N_A * target * speed)


def collision_frequency(
    cross_section: Numbers, relative_speed: Numbers, partner_concentration: Numbers
) -> Numbers:
    """Collisions per second that one molecule has with the molecules of one gas.

    sigma v_rel n, n the number density of the partners. In a pure gas this is the collision
    frequency of every molecule (v_rel = sqrt(2) v); there is no half, since the molecule
    that is followed is only one of the two.

    Parameters
    ----------
    cross_section : [m^2], any shape
    relative_speed : mean relative speed [m/s], a shape that broadcasts with it
    partner_concentration : [mol/m^3], a shape that broadcasts with it

    Returns
    -------
    [1/s], the broadcast shape

    Raises
    ------
    ValueError : a cross-section or speed not above zero, a negative concentration

    Source: Atkins and de Paula (2006), section 21.1.

    >>> f"{collision_frequency(4.1854e-19, 649.04, 42.29):.3e}"  # air, sea level
    '6.918e+09'
    """
    target = positive("cross_section", cross_section, "m^2")
    speed = positive("relative_speed", relative_speed, "m/s")
    partners = not_negative("partner_concentration", partner_concentration, "mol/m^3")
    return plain(constants.N_A * target * speed * partners)


def collision_density_unlike(
    cross_section: Numbers,
    relative_speed: Numbers,
    concentration_a: Numbers,
    concentration_b: Numbers,
) -> Numbers:
    """Encounters of A with B in a volume in a time, sigma v_rel N_A c_A c_B.

    Times Avogadro's constant it is Z_AB of the textbooks, in 1/m^3/s.

    Parameters
    ----------
    cross_section : [m^2], any shape
    relative_speed : mean relative speed of A and B [m/s], a shape that broadcasts with it
    concentration_a, concentration_b : [mol/m^3], shapes that broadcast with it

    Returns
    -------
    moles of encounters [mol/m^3/s], the broadcast shape

    Raises
    ------
    ValueError : a cross-section or speed not above zero, a negative concentration

    Source: Atkins and de Paula (2006), section 24.1.

    >>> f"{collision_density_unlike(4e-19, 600.0, 2.0, 3.0):.4e}"
    '8.6720e+08'
    """
    rate = np.asarray(collision_rate_constant(cross_section, relative_speed, like=False))
    first = not_negative("concentration_a", concentration_a, "mol/m^3")
    second = not_negative("concentration_b", concentration_b, "mol/m^3")
    return plain(rate * first * second)


def collision_density_like(
    cross_section: Numbers, relative_speed: Numbers, concentration: Numbers
) -> Numbers:
    """Encounters between molecules of one gas, 1/2 sigma v_rel N_A c^2, each counted once.

    ``relative_speed`` is sqrt(2) times the mean speed. Times Avogadro's constant this is
    Z_AA of the textbooks, in 1/m^3/s.

    Parameters
    ----------
    cross_section : [m^2], any shape
    relative_speed : mean relative speed of two molecules [m/s], a shape that broadcasts with it
    concentration : [mol/m^3], a shape that broadcasts with it

    Returns
    -------
    moles of encounters [mol/m^3/s], the broadcast shape

    Raises
    ------
    ValueError : a cross-section or speed not above zero, a negative concentration

    Source: Atkins and de Paula (2006), section 24.1.

    >>> f"{collision_density_like(4e-19, 600.0, 2.0):.4e}"
    '2.8907e+08'
    """
    rate = np.asarray(collision_rate_constant(cross_section, relative_speed, like=True))
    amount = not_negative("concentration", concentration, "mol/m^3")
    return plain(rate * amount**2)


def mean_free_path(cross_section: Numbers, concentration: Numbers) -> Numbers:
    """Mean free path in a pure gas, 1 / (sqrt(2) n sigma).

    Parameters
    ----------
    cross_section : [m^2], any shape
    concentration : [mol/m^3], a shape that broadcasts with it

    Returns
    -------
    [m], the broadcast shape

    Raises
    ------
    ValueError : a cross-section or concentration that is not finite and above zero

    Source: Atkins and de Paula (2006), section 21.1.

    >>> f"{mean_free_path(4.1169e-19, 40.895):.3e}"  # argon, 1 atm, 298 K
    '6.974e-08'
    """
    target = positive("cross_section", cross_section, "m^2")
    amount = positive("concentration", concentration, "mol/m^3")
    return plain(1.0 / (np.sqrt(2.0) * constants.N_A * amount * target))
