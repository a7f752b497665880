"""All that kinetic theory says about one pair of gases, gathered in one record.

The command that answers "how often do these two meet, and how fast could they react" shows
this record; nothing is worked out anywhere but in the functions of this room.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from meanfree import constants
from meanfree.collisions import encounters, line_of_centres, mixtures, plane, speeds
from meanfree.collisions._checks import Numbers, not_negative, one_temperature, positive

Both: TypeAlias = tuple[float, float]
"""A value of gas A and the same value of gas B; the two are equal where A is B."""


@dataclass(frozen=True, slots=True)
class Crowd:
    """What needs to know how much gas there is; units of a plane in brackets after "or"."""

    mole_fractions: Both
    """Of A and B [1]; (1, 1) where they are the same gas."""
    concentrations: Both
    """Of A and B [mol/m^3 or mol/m^2]."""
    frequencies_with_partner: Both
    """Collisions of one A with B, and of one B with A [1/s]."""
    frequencies: Both
    """Collisions of one A, and of one B, with any molecule [1/s]."""
    mean_free_paths: Both
    """Of A and B among both [m]."""
    collision_density: float
    """Encounters of A with B, each counted once [mol/m^3/s or mol/m^2/s]."""
    filled_fraction: float
    """Share of the room that the molecules fill [1]. The formulas hold for a dilute gas;
    at 0.01 encounters of spheres are about 2.5 % more frequent."""


@dataclass(frozen=True, slots=True)
class PairCollisions:
    """Speeds, target, collision and rate constants of two gases (units of a plane after "or")."""

    in_plane: bool
    """True for discs in a plane."""
    same_gas: bool
    """True where both partners are one gas; Z and k then carry the half."""
    temperature: float
    """[K]"""
    molar_masses: Both
    """[kg/mol]"""
    diameters: Both
    """[m]"""
    mean_speeds: Both
    """[m/s]"""
    root_mean_square_speeds: Both
    """[m/s]"""
    most_probable_speeds: Both
    """[m/s]"""
    reduced_molar_mass: float
    """[kg/mol]"""
    mean_relative_speed: float
    """[m/s]"""
    pair_diameter: float
    """Distance of the centres at contact [m]."""
    target: float
    """Cross-section [m^2], or swept width [m]."""
    ceiling: float
    """Z, the rate constant if every encounter reacts [m^3/mol/s or m^2/mol/s]."""
    threshold: float
    """E0 along the line of centres [J/mol]; 0 unless one was given."""
    fraction_above: float
    """Share of encounters above the threshold [1]."""
    rate_constant: float
    """k = Z exp(-E0 / R T), steric factor 1 [m^3/mol/s or m^2/mol/s]."""
    activation_energy: float
    """Ea = E0 + R T / 2 [J/mol]."""
    crowd: Crowd | None
    """Frequencies, densities, free paths; None where no amount was given."""


def collide(
    molar_masses: Both,
    diameters: Both,
    temperature: float,
    *,
    same_gas: bool,
    in_plane: bool = False,
    pressure: float | None = None,
    surface_concentration: float | None = None,
    mole_fractions: Both | None = None,
    threshold: float = 0.0,
) -> PairCollisions:
    """Everything about the encounters of gas A with gas B.

    Parameters
    ----------
    molar_masses : of A and B [kg/mol]
    diameters : of A and B [m]
    temperature : [K]
    same_gas : whether A and B are one gas; Z and k then carry the half
    in_plane : discs in a plane instead of spheres in space
    pressure : total pressure of the ideal gas [Pa], in space only
    surface_concentration : of both together [mol/m^2], in a plane only
    mole_fractions : of A and B [1], adding up to 1; half and half unless given
    threshold : E0 along the line of centres [J/mol]

    Returns
    -------
    PairCollisions; its ``crowd`` is None where neither amount was given

    Raises
    ------
    ValueError : a value that no gas can have, several temperatures; one gas with two masses or
        two diameters; a pressure in a plane, a surface concentration in space; mole fractions
        that do not add up to 1, or given without an amount or for one gas

    >>> pair = collide((0.0320, 0.0320), (3.61e-10, 3.61e-10), 298.15, same_gas=True)
    >>> f"{pair.mean_relative_speed:.1f} m/s, {pair.ceiling:.3e} m3/mol/s"
    '628.1 m/s, 7.743e+07 m3/mol/s'
    """
    temperature = one_temperature(temperature)
    _one_gas("molar_masses", molar_masses, "kg/mol", same_gas)
    _one_gas("diameters", diameters, "m", same_gas)
    room = plane if in_plane else speeds
    relative = float(room.mean_relative_speed(*molar_masses, temperature))
    target, ceiling = _target_and_ceiling(diameters, relative, same_gas, in_plane)
    fractions = _mole_fractions(mole_fractions, same_gas)
    total = _total_concentration(temperature, in_plane, pressure, surface_concentration)
    if total is None and mole_fractions is not None:
        raise ValueError(
            f"mole_fractions: found {mole_fractions} without an amount; "
            "expected pressure or surface_concentration with them"
        )

    def both(speed: Callable[[float, float], Numbers]) -> Both:
        return float(speed(molar_masses[0], temperature)), float(
            speed(molar_masses[1], temperature)
        )

    return PairCollisions(
        in_plane=in_plane,
        same_gas=same_gas,
        temperature=temperature,
        molar_masses=molar_masses,
        diameters=diameters,
        mean_speeds=both(room.mean_speed),
        root_mean_square_speeds=both(room.root_mean_square_speed),
        most_probable_speeds=both(room.most_probable_speed),
        reduced_molar_mass=float(speeds.reduced_molar_mass(*molar_masses)),
        mean_relative_speed=relative,
        pair_diameter=float(encounters.pair_diameter(*diameters)),
        target=target,
        ceiling=ceiling,
        threshold=float(threshold),
        fraction_above=float(line_of_centres.fraction_above(threshold, temperature)),
        rate_constant=float(line_of_centres.rate_constant(ceiling, threshold, temperature)),
        activation_energy=float(line_of_centres.activation_energy(threshold, temperature)),
        crowd=None
        if total is None
        else _crowd(
            molar_masses, diameters, temperature, fractions, total, ceiling, same_gas, in_plane
        ),
    )


def _target_and_ceiling(
    diameters: Both, relative: float, same_gas: bool, in_plane: bool
) -> tuple[float, float]:
    """Cross-section [m^2] or swept width [m], and Z [m^3/mol/s or m^2/mol/s]."""
    if in_plane:
        width = plane.swept_width(*diameters)
        return float(width), float(plane.collision_rate_constant(width, relative, like=same_gas))
    area = encounters.cross_section_from_diameters(*diameters)
    return float(area), float(encounters.collision_rate_constant(area, relative, like=same_gas))


def _one_gas(name: str, values: Both, unit: str, same_gas: bool) -> None:
    """Raise ValueError where one gas is given two values."""
    first, second = np.asarray(positive(name, np.asarray(values), unit))
    if same_gas and first != second:
        raise ValueError(
            f"{name}: found {first:g} and {second:g} [{unit}] with same_gas; "
            "expected the same value twice"
        )


def _mole_fractions(given: Both | None, same_gas: bool) -> Both:
    """Shares of A and B, half and half unless given; raises ValueError where they cannot be."""
    if same_gas:
        if given is not None:
            raise ValueError(
                f"mole_fractions: found {given} with same_gas; expected none, the gas is pure"
            )
        return (1.0, 1.0)
    if given is None:
        return (0.5, 0.5)
    first, second = not_negative("mole_fractions", np.asarray(given), "1")
    if not math.isclose(first + second, 1.0, rel_tol=0.0, abs_tol=1e-9):
        raise ValueError(
            f"mole_fractions: found {first:g} and {second:g}; expected two numbers that add up to 1"
        )
    return (float(first), float(second))


def _total_concentration(
    temperature: float,
    in_plane: bool,
    pressure: float | None,
    surface_concentration: float | None,
) -> float | None:
    """Concentration of both gases together [mol/m^3 or mol/m^2], None where none was given."""
    if in_plane:
        if pressure is not None:
            raise ValueError(
                f"pressure: found {pressure:g} in a plane; expected surface_concentration [mol/m^2]"
            )
        if surface_concentration is None:
            return None
        return float(positive("surface_concentration", surface_concentration, "mol/m^2"))
    if surface_concentration is not None:
        raise ValueError(
            f"surface_concentration: found {surface_concentration:g} in space; "
            "expected pressure [Pa], or in_plane"
        )
    if pressure is None:
        return None
    return float(positive("pressure", pressure, "Pa")) / (constants.R * temperature)


def _crowd(
    molar_masses: Both,
    diameters: Both,
    temperature: float,
    fractions: Both,
    total: float,
    ceiling: float,
    same_gas: bool,
    in_plane: bool,
) -> Crowd:
    """The part of the record that needs concentrations."""
    kinds = slice(0, 1) if same_gas else slice(0, 2)
    masses = np.asarray(molar_masses, dtype=np.float64)[kinds]
    sizes = np.asarray(diameters, dtype=np.float64)[kinds]
    amounts = total * np.asarray(fractions)[kinds]
    if in_plane:
        rates = mixtures.plane_mixture_collision_frequencies(masses, sizes, amounts, temperature)
        paths = mixtures.plane_mixture_mean_free_paths(masses, sizes, amounts)
        room_of_one = 0.25 * np.pi * sizes**2
    else:
        rates = mixtures.mixture_collision_frequencies(masses, sizes, amounts, temperature)
        paths = mixtures.mixture_mean_free_paths(masses, sizes, amounts)
        room_of_one = np.pi / 6.0 * sizes**3
    return Crowd(
        mole_fractions=fractions,
        concentrations=(float(amounts[0]), float(amounts[-1])),
        frequencies_with_partner=(float(rates[0, -1]), float(rates[-1, 0])),
        frequencies=(float(rates[0].sum()), float(rates[-1].sum())),
        mean_free_paths=(float(paths[0]), float(paths[-1])),
        # Z is halved already for like partners, so the half is not taken twice.
        collision_density=ceiling * float(amounts[0]) * float(amounts[-1]),
        filled_fraction=float(constants.N_A * np.sum(amounts * room_of_one)),
    )
