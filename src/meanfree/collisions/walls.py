"""Collisions with walls and the flow through a small hole in one.

Both follow from one flux, a quarter of the concentration times the mean speed. Sources:
P. Atkins and J. de Paula, Physical Chemistry, 8th ed. (2006), section 21.2; M. Knudsen,
Annalen der Physik 28 (1909) 999 (effusion).
"""

from __future__ import annotations

import numpy as np

from meanfree import constants
from meanfree.collisions._checks import Numbers, finite, not_negative, plain, positive


def impingement_flux(concentration: Numbers, mean_speed: Numbers) -> Numbers:
    """Molecules that strike a wall, c v / 4.

    Parameters
    ----------
    concentration : [mol/m^3], any shape
    mean_speed : mean molecular speed [m/s], a shape that broadcasts with it

    Returns
    -------
    [mol/m^2/s], the broadcast shape

    Raises
    ------
    ValueError : a negative concentration, a speed that is not finite and above zero

    Source: Atkins and de Paula (2006), section 21.2.

    >>> round(impingement_flux(40.0, 476.0), 3)
    4760.0
    """
    amount = not_negative("concentration", concentration, "mol/m^3")
    speed = positive("mean_speed", mean_speed, "m/s")
    return plain(0.25 * amount * speed)


def wall_collisions(flux: Numbers, area: Numbers) -> Numbers:
    """Number of molecular collisions in a second on an area.

    Parameters
    ----------
    flux : [mol/m^2/s], any shape
    area : [m^2], a shape that broadcasts with it

    Returns
    -------
    a count of single molecules [1/s], the broadcast shape

    Raises
    ------
    ValueError : a negative flux or area

    >>> f"{wall_collisions(4760.0, 1e-4):.3e}"
    '2.867e+23'
    """
    stream = not_negative("flux", flux, "mol/m^2/s")
    surface = not_negative("area", area, "m^2")
    return plain(constants.N_A * stream * surface)


def effusion_rate(
    pressure_difference: Numbers,
    molar_mass: Numbers,
    temperature: Numbers,
    area: Numbers,
    transmission: Numbers = 1.0,
) -> Numbers:
    """Flow through a hole that is small against the mean free path, A dp / sqrt(2 pi M R T).

    Holds for one gas at one temperature on both sides; a negative difference flows inwards.

    Parameters
    ----------
    pressure_difference : partial pressure inside less that outside [Pa], any shape
    molar_mass : [kg/mol], a shape that broadcasts with it
    temperature : [K], a shape that broadcasts with it
    area : of the hole [m^2], a shape that broadcasts with it
    transmission : share of entering molecules that come out [1], 1 for a thin edge

    Returns
    -------
    [mol/s], the broadcast shape

    Raises
    ------
    ValueError : a pressure that is not finite, a mass or temperature not above zero,
        a negative area, a transmission outside 0 to 1

    Source: Knudsen (1909); Atkins and de Paula (2006), section 21.2.

    >>> f"{effusion_rate(100.0, 0.028, 300.0, 1e-8):.3e}"
    '4.774e-08'
    """
    drive = finite("pressure_difference", pressure_difference, "Pa")
    mass = positive("molar_mass", molar_mass, "kg/mol")
    kelvin = positive("temperature", temperature, "K")
    hole = not_negative("area", area, "m^2")
    share = not_negative("transmission", transmission, "1")
    if np.any(share > 1.0):
        raise ValueError(
            f"transmission: found {float(np.max(share)):g}; expected a share from 0 to 1 [1]"
        )
    return plain(share * hole * drive / np.sqrt(2.0 * np.pi * mass * constants.R * kelvin))


def effusion_time_constant(volume: Numbers, area: Numbers, mean_speed: Numbers) -> Numbers:
    """Time in which effusion into vacuum leaves 1/e of a gas in a vessel, 4 V / (A v).

    Parameters
    ----------
    volume : [m^3], any shape
    area : of the hole [m^2], a shape that broadcasts with it
    mean_speed : [m/s], a shape that broadcasts with it

    Returns
    -------
    [s], the broadcast shape

    Raises
    ------
    ValueError : a volume, area or speed that is not finite and above zero

    >>> round(effusion_time_constant(1e-3, 1e-8, 400.0), 6)
    1000.0
    """
    room = positive("volume", volume, "m^3")
    hole = positive("area", area, "m^2")
    speed = positive("mean_speed", mean_speed, "m/s")
    return plain(4.0 * room / (hole * speed))
