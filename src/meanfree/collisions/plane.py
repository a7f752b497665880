"""Discs that move freely in a plane: a mobile adsorbate as a gas of two dimensions.

The speeds follow the Maxwell distribution of two components, v m/(k T) exp(-m v^2 / (2 k T)).
A disc sweeps a strip of width 2 (r_A + r_B) for partners seen as points, so an encounter has
an impact parameter that is uniform across the strip.
"""

from __future__ import annotations

import numpy as np

from meanfree import constants
from meanfree.collisions._checks import Numbers, not_negative, plain, positive
from meanfree.collisions.speeds import reduced_molar_mass


def mean_speed(molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Mean speed in a plane, sqrt(pi R T / (2 M)).

    Parameters
    ----------
    molar_mass : [kg/mol], any shape
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: first moment of the distribution above, integral of v^2 m/(k T) exp(-m v^2/(2 k T)).

    >>> round(mean_speed(39.948e-3, 298.0), 1)
    312.1
    """
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(0.5 * np.pi * constants.R * kelvin / mass))


def root_mean_square_speed(molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Root of the mean squared speed in a plane, sqrt(2 R T / M).

    Parameters
    ----------
    molar_mass : [kg/mol], any shape
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: equipartition over two components.

    >>> round(root_mean_square_speed(39.948e-3, 298.0), 1)
    352.2
    """
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(2.0 * constants.R * kelvin / mass))


def most_probable_speed(molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Speed at the top of the distribution in a plane, sqrt(R T / M).

    Parameters
    ----------
    molar_mass : [kg/mol], any shape
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: maximum of the distribution above.

    >>> round(most_probable_speed(39.948e-3, 298.0), 1)
    249.0
    """
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(constants.R * kelvin / mass))


def mean_relative_speed(
    molar_mass_a: Numbers, molar_mass_b: Numbers, temperature: Numbers
) -> Numbers:
    """Mean speed of A seen from B in a plane, sqrt(pi R T / (2 mu)), mu the reduced mass.

    Parameters
    ----------
    molar_mass_a, molar_mass_b : [kg/mol], shapes that broadcast
    temperature : [K], a shape that broadcasts with them

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: the relative velocity of two Maxwell distributions is one with the reduced mass.

    >>> round(mean_relative_speed(0.004, 0.04, 300.0), 1)
    1038.1
    """
    reduced = np.asarray(reduced_molar_mass(molar_mass_a, molar_mass_b))
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(0.5 * np.pi * constants.R * kelvin / reduced))


def swept_width(diameter_a: Numbers, diameter_b: Numbers) -> Numbers:
    """Width of the strip that a disc sweeps, 2 (r_A + r_B) = d_A + d_B.

    Parameters
    ----------
    diameter_a, diameter_b : [m], shapes that broadcast

    Returns
    -------
    [m], the broadcast shape

    Raises
    ------
    ValueError : a diameter that is not finite and above zero

    >>> f"{swept_width(3.4e-10, 2.6e-10):.1e}"
    '6.0e-10'
    """
    first = positive("diameter_a", diameter_a, "m")
    second = positive("diameter_b", diameter_b, "m")
    return plain(first + second)


def collision_rate_constant(
    swept_width: Numbers, relative_speed: Numbers, *, like: bool
) -> Numbers:
    """Collision rate constant of discs, Z = w v_rel N_A, halved for like partners.

    Parameters
    ----------
    swept_width : w [m], any shape
    relative_speed : mean relative speed in the plane [m/s], a shape that broadcasts with it
    like : True where both partners are the same gas; no default on purpose

    Returns
    -------
    [m^2/mol/s], the broadcast shape

    Raises
    ------
    ValueError : a width or speed that is not finite and above zero

    >>> f"{collision_rate_constant(6.0e-10, 1038.1, like=False):.3e}"
    '3.751e+17'
    """
    target = positive("swept_width", swept_width, "m")
    speed = positive("relative_speed", relative_speed, "m/s")
    counted = 0.5 if like else 1.0
    return plain(counted * constants.N_A * target * speed)


def collision_frequency(
    swept_width: Numbers, relative_speed: Numbers, partner_concentration: Numbers
) -> Numbers:
    """Collisions per second that one disc has with the discs of one gas, w v_rel n.

    Parameters
    ----------
    swept_width : w [m], any shape
    relative_speed : mean relative speed in the plane [m/s], a shape that broadcasts with it
    partner_concentration : [mol/m^2], a shape that broadcasts with it

    Returns
    -------
    [1/s], the broadcast shape

    Raises
    ------
    ValueError : a width or speed not above zero, a negative concentration

    >>> f"{collision_frequency(6.0e-10, 1038.1, 1e-7):.3e}"
    '3.751e+10'
    """
    partners = not_negative("partner_concentration", partner_concentration, "mol/m^2")
    return plain(
        np.asarray(collision_rate_constant(swept_width, relative_speed, like=False)) * partners
    )


def collision_density_unlike(
    swept_width: Numbers,
    relative_speed: Numbers,
    concentration_a: Numbers,
    concentration_b: Numbers,
) -> Numbers:
    """Encounters of A with B on an area in a time, w v_rel N_A c_A c_B.

    Parameters
    ----------
    swept_width : w [m], any shape
    relative_speed : mean relative speed in the plane [m/s], a shape that broadcasts with it
    concentration_a, concentration_b : [mol/m^2], shapes that broadcast with it

    Returns
    -------
    moles of encounters [mol/m^2/s], the broadcast shape

    Raises
    ------
    ValueError : a width or speed not above zero, a negative concentration

    >>> f"{collision_density_unlike(6.0e-10, 1038.1, 1e-7, 2e-7):.3e}"
    '7.502e+03'
    """
    first = not_negative("concentration_a", concentration_a, "mol/m^2")
    second = not_negative("concentration_b", concentration_b, "mol/m^2")
    rate = np.asarray(collision_rate_constant(swept_width, relative_speed, like=False))
    return plain(rate * first * second)


def collision_density_like(
    swept_width: Numbers, relative_speed: Numbers, concentration: Numbers
) -> Numbers:
    """Encounters between discs of one gas, 1/2 w v_rel N_A c^2, each counted once.

    Parameters
    ----------
    swept_width : w [m], any shape
    relative_speed : mean relative speed in the plane [m/s], a shape that broadcasts with it
    concentration : [mol/m^2], a shape that broadcasts with it

    Returns
    -------
    moles of encounters [mol/m^2/s], the broadcast shape

    Raises
    ------
    ValueError : a width or speed not above zero, a negative concentration

    >>> f"{collision_density_like(6.8e-10, 441.4, 1e-7):.3e}"
    '9.038e+02'
    """
    amount = not_negative("concentration", concentration, "mol/m^2")
    rate = np.asarray(collision_rate_constant(swept_width, relative_speed, like=True))
    return plain(rate * amount**2)


def mean_free_path(swept_width: Numbers, concentration: Numbers) -> Numbers:
    """Mean free path of discs of one gas, 1 / (sqrt(2) n w).

    Parameters
    ----------
    swept_width : w [m], any shape
    concentration : [mol/m^2], a shape that broadcasts with it

    Returns
    -------
    [m], the broadcast shape

    Raises
    ------
    ValueError : a width or concentration that is not finite and above zero

    >>> f"{mean_free_path(6.8e-10, 1e-7):.3e}"
    '1.727e-08'
    """
    target = positive("swept_width", swept_width, "m")
    amount = positive("concentration", concentration, "mol/m^2")
    return plain(1.0 / (np.sqrt(2.0) * constants.N_A * amount * target))
