"""Speeds of the molecules of an ideal gas at rest, from the Maxwell distribution.

Every collision rate is a target times a mean relative speed; the speeds are here.
The formulas are those of P. Atkins and J. de Paula, Physical Chemistry, 8th ed.
(2006), section 21.1, and of S. Chapman and T. G. Cowling, The Mathematical Theory of
Non-uniform Gases, 3rd ed. (1970), chapter 4.
"""

from __future__ import annotations

import numpy as np

from meanfree import constants
from meanfree.collisions._checks import Numbers, not_negative, plain, positive


def mean_speed(molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Mean molecular speed, sqrt(8 R T / (pi M)).

    Parameters
    ----------
    molar_mass : [kg/mol], any shape
    temperature : [K], any shape that broadcasts with it

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: Atkins and de Paula (2006), section 21.1; Chapman and Cowling (1970), chapter 4.

    >>> round(mean_speed(39.948e-3, 298.0), 1)  # argon
    397.4
    """
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(8.0 * constants.R * kelvin / (np.pi * mass)))


def root_mean_square_speed(molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Root of the mean squared speed, sqrt(3 R T / M).

    Parameters
    ----------
    molar_mass : [kg/mol], any shape
    temperature : [K], any shape that broadcasts with it

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: Atkins and de Paula (2006), section 21.1.

    >>> round(root_mean_square_speed(39.948e-3, 298.0), 1)
    431.4
    """
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(3.0 * constants.R * kelvin / mass))


def most_probable_speed(molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Speed at the top of the Maxwell distribution, sqrt(2 R T / M).

    Parameters
    ----------
    molar_mass : [kg/mol], any shape
    temperature : [K], any shape that broadcasts with it

    Returns
    -------
    [m/s], the broadcast shape

    Raises
    ------
    ValueError : a mass or temperature that is not finite and above zero

    Source: Atkins and de Paula (2006), section 21.1.

    >>> round(most_probable_speed(39.948e-3, 298.0), 1)
    352.2
    """
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(2.0 * constants.R * kelvin / mass))


def reduced_molar_mass(molar_mass_a: Numbers, molar_mass_b: Numbers) -> Numbers:
    """Reduced mass of a pair for a mole of pairs, M_A M_B / (M_A + M_B).

    Parameters
    ----------
    molar_mass_a, molar_mass_b : [kg/mol], shapes that broadcast

    Returns
    -------
    [kg/mol], the broadcast shape; divided by Avogadro's constant it is that of one pair

    Raises
    ------
    ValueError : a mass that is not finite and above zero

    >>> reduced_molar_mass(0.028, 0.028)
    0.014
    """
    first = positive("molar_mass_a", molar_mass_a, "kg/mol")
    second = positive("molar_mass_b", molar_mass_b, "kg/mol")
    return plain(first * second / (first + second))


def mean_relative_speed(
    molar_mass_a: Numbers, molar_mass_b: Numbers, temperature: Numbers
) -> Numbers:
    """Mean speed of a molecule of A seen from a molecule of B, sqrt(8 R T / (pi mu)).

    mu is the reduced mass; for two molecules of one gas this is sqrt(2) times the mean speed.

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

    Source: Atkins and de Paula (2006), section 21.1; Chapman and Cowling (1970), chapter 5.

    >>> round(mean_relative_speed(31.998e-3, 31.998e-3, 298.15), 1)  # oxygen
    628.1
    """
    reduced = np.asarray(reduced_molar_mass(molar_mass_a, molar_mass_b))
    kelvin = positive("temperature", temperature, "K")
    return plain(np.sqrt(8.0 * constants.R * kelvin / (np.pi * reduced)))


def speed_density(speed: Numbers, molar_mass: Numbers, temperature: Numbers) -> Numbers:
    """Maxwell distribution of molecular speeds: share of molecules per interval of speed.

    4 pi (M / (2 pi R T))^(3/2) v^2 exp(-M v^2 / (2 R T)); its integral over all speeds is 1.

    Parameters
    ----------
    speed : [m/s], any shape
    molar_mass : [kg/mol], a shape that broadcasts with it
    temperature : [K], a shape that broadcasts with it

    Returns
    -------
    [s/m], the broadcast shape

    Raises
    ------
    ValueError : a negative speed, a mass or temperature that is not finite and above zero

    Source: Atkins and de Paula (2006), section 21.1.

    >>> round(speed_density(352.2, 39.948e-3, 298.0), 6)
    0.002357
    """
    velocity = not_negative("speed", speed, "m/s")
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    # In units of the most probable speed the density is 4/sqrt(pi) x^2 exp(-x^2), which
    # neither overflows nor loses digits for any mass.
    top = np.sqrt(2.0 * constants.R * kelvin / mass)
    ratio = velocity / top
    return plain(4.0 / np.sqrt(np.pi) * ratio**2 * np.exp(-(ratio**2)) / top)
