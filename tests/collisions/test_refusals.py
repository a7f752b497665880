"""Every refusal of the room, by its whole text."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from meanfree.collisions import (
    encounters,
    line_of_centres,
    mixtures,
    plane,
    speeds,
    walls,
)

POSITIVE, NOT_NEGATIVE, FINITE = "a finite number above 0", "a finite number not below 0", None

TWO = np.array([1.0, 2.0])

# Function, good arguments, and for each argument its unit and what it has to be.
Row = tuple[Callable[..., Any], dict[str, Any], dict[str, tuple[str, str | None]]]

MASS = ("kg/mol", POSITIVE)
KELVIN = ("K", POSITIVE)
SIZE = ("m", POSITIVE)
SPEED = ("m/s", POSITIVE)
AREA = ("m^2", POSITIVE)
JOULE = ("J/mol", NOT_NEGATIVE)
RATE = ("m^3/mol/s", POSITIVE)


def _speeds(room: Any) -> list[Row]:
    one = {"molar_mass": MASS, "temperature": KELVIN}
    two = {"molar_mass_a": MASS, "molar_mass_b": MASS, "temperature": KELVIN}
    single = [room.mean_speed, room.root_mean_square_speed, room.most_probable_speed]
    return [(function, dict.fromkeys(one, 1.0), one) for function in single] + [
        (room.mean_relative_speed, dict.fromkeys(two, 1.0), two)
    ]


def _encounters(room: Any, target: str, target_unit: str, amount: str) -> list[Row]:
    aim = {target: (target_unit, POSITIVE), "relative_speed": SPEED}
    partner = {**aim, "partner_concentration": (amount, NOT_NEGATIVE)}
    unlike = {
        **aim,
        "concentration_a": (amount, NOT_NEGATIVE),
        "concentration_b": (amount, NOT_NEGATIVE),
    }
    like = {**aim, "concentration": (amount, NOT_NEGATIVE)}
    path = {target: (target_unit, POSITIVE), "concentration": (amount, POSITIVE)}
    return [
        (room.collision_rate_constant, {**dict.fromkeys(aim, 1.0), "like": True}, aim),
        (room.collision_frequency, dict.fromkeys(partner, 1.0), partner),
        (room.collision_density_unlike, dict.fromkeys(unlike, 1.0), unlike),
        (room.collision_density_like, dict.fromkeys(like, 1.0), like),
        (room.mean_free_path, dict.fromkeys(path, 1.0), path),
    ]


def _row(function: Callable[..., Any], **wanted: tuple[str, str | None]) -> Row:
    return function, dict.fromkeys(wanted, 1.0), wanted


ROWS: list[Row] = [
    *_speeds(speeds),
    *_speeds(plane),
    _row(speeds.reduced_molar_mass, molar_mass_a=MASS, molar_mass_b=MASS),
    _row(speeds.speed_density, speed=("m/s", NOT_NEGATIVE), molar_mass=MASS, temperature=KELVIN),
    _row(encounters.pair_diameter, diameter_a=SIZE, diameter_b=SIZE),
    _row(encounters.cross_section_from_diameters, diameter_a=SIZE, diameter_b=SIZE),
    _row(encounters.cross_section_from_radii, radius_a=SIZE, radius_b=SIZE),
    _row(plane.swept_width, diameter_a=SIZE, diameter_b=SIZE),
    *_encounters(encounters, "cross_section", "m^2", "mol/m^3"),
    *_encounters(plane, "swept_width", "m", "mol/m^2"),
    _row(walls.impingement_flux, concentration=("mol/m^3", NOT_NEGATIVE), mean_speed=SPEED),
    _row(walls.wall_collisions, flux=("mol/m^2/s", NOT_NEGATIVE), area=("m^2", NOT_NEGATIVE)),
    _row(
        walls.effusion_rate,
        pressure_difference=("Pa", FINITE),
        molar_mass=MASS,
        temperature=KELVIN,
        area=("m^2", NOT_NEGATIVE),
        transmission=("1", NOT_NEGATIVE),
    ),
    _row(walls.effusion_time_constant, volume=("m^3", POSITIVE), area=AREA, mean_speed=SPEED),
    _row(line_of_centres.fraction_above, threshold=JOULE, temperature=KELVIN),
    _row(line_of_centres.reactive_cross_section, energy=JOULE, threshold=JOULE, cross_section=AREA),
    _row(line_of_centres.reactive_width, energy=JOULE, threshold=JOULE, swept_width=SIZE),
    _row(
        line_of_centres.rate_constant,
        collision_rate_constant=RATE,
        threshold=JOULE,
        temperature=KELVIN,
        steric=("1", NOT_NEGATIVE),
    ),
    _row(line_of_centres.activation_energy, threshold=JOULE, temperature=KELVIN),
    _row(
        line_of_centres.threshold_from_activation_energy,
        activation_energy=("J/mol", FINITE),
        temperature=KELVIN,
    ),
    _row(
        line_of_centres.steric_factors,
        rate_constant=RATE,
        collision_rate_constant=RATE,
        activation_energy=("J/mol", FINITE),
        temperature=KELVIN,
    ),
    _row(
        line_of_centres.steric_from_a_over_z,
        a_over_z=("1", NOT_NEGATIVE),
        activation_energy=("J/mol", FINITE),
        temperature=KELVIN,
    ),
]

CASES = [
    pytest.param(
        function, good, name, unit, kind, id=f"{function.__module__}.{function.__name__}-{name}"
    )
    for function, good, wanted in ROWS
    for name, (unit, kind) in wanted.items()
]


def _refused(function: Callable[..., Any], arguments: dict[str, Any], text: str) -> None:
    with pytest.raises(ValueError, match=f"^{re.escape(text)}$"):
        function(**arguments)


@pytest.mark.parametrize(("function", "good", "name", "unit", "kind"), CASES)
def test_an_impossible_argument_is_named_with_what_would_be_right(
    function: Callable[..., Any], good: dict[str, Any], name: str, unit: str, kind: str | None
) -> None:
    function(**good)
    wrong: list[tuple[Any, str]] = [
        (float("nan"), "nan"),
        (float("inf"), "inf"),
        (np.array([1.0, np.nan]), "nan at index 1"),
        ("1", "'1'"),
        (None, "None"),
        (True, "True"),
        (1j, "1j"),
    ]
    if kind is not None:
        wrong += [(-0.5, "-0.5"), (np.array([[1.0], [-2.0]]), "-2 at index 1, 0")]
    if kind == POSITIVE:
        wrong += [(0.0, "0"), (0, "0")]
    else:
        function(**{**good, name: 0})
    expected = f"{kind or 'a finite number'} [{unit}]"
    for value, found in wrong:
        text = f"{name}: found {found}; expected {expected}"
        _refused(function, {**good, name: value}, text)


@pytest.mark.parametrize(
    "function", [encounters.collision_rate_constant, plane.collision_rate_constant]
)
def test_whether_partners_are_alike_has_to_be_said(function: Callable[..., Any]) -> None:
    with pytest.raises(TypeError, match="missing 1 required keyword-only argument: 'like'"):
        function(1.0, 1.0)


def test_a_hole_lets_no_more_through_than_enters() -> None:
    text = "transmission: found 1.5; expected a share from 0 to 1 [1]"
    good = {"pressure_difference": 1.0, "molar_mass": 1.0, "temperature": 1.0, "area": 1.0}
    _refused(walls.effusion_rate, {**good, "transmission": np.array([0.5, 1.5])}, text)


FREQUENCIES = [mixtures.mixture_collision_frequencies, mixtures.plane_mixture_collision_frequencies]
PATHS = [mixtures.mixture_mean_free_paths, mixtures.plane_mixture_mean_free_paths]


@pytest.mark.parametrize("function", FREQUENCIES + PATHS)
def test_a_mixture_of_impossible_gases(function: Callable[..., Any]) -> None:
    amount = "mol/m^2" if "plane" in function.__name__ else "mol/m^3"
    good: dict[str, Any] = {"molar_masses": TWO, "diameters": TWO, "concentrations": TWO}
    if function in FREQUENCIES:
        good["temperature"] = 300.0
        text = "temperature: found -1; expected a finite number above 0 [K]"
        _refused(function, {**good, "temperature": -1.0}, text)
    function(**good)
    bad = np.array([1.0, -3.0])
    for name, what, unit in (
        ("molar_masses", "above 0", "kg/mol"),
        ("diameters", "above 0", "m"),
        ("concentrations", "not below 0", amount),
    ):
        text = f"{name}: found -3 at index 1; expected a finite number {what} [{unit}]"
        _refused(function, {**good, name: bad}, text)
    three = np.ones((4, 3))
    text = (
        "molar_masses, diameters, concentrations: found shapes (2,), (2,), (4, 3); "
        "expected (n_gases,), (n_gases,), (..., n_gases)"
    )
    _refused(function, {**good, "concentrations": three}, text)
    text = text.replace("(2,), (2,), (4, 3)", "(2,), (3,), (2,)")
    _refused(function, {**good, "diameters": np.ones(3)}, text)
    text = text.replace("(2,), (3,), (2,)", "(), (2,), (2,)")
    _refused(function, {**good, "molar_masses": 1.0}, text)


@pytest.mark.parametrize("function", FREQUENCIES)
def test_a_mixture_has_one_temperature(function: Callable[..., Any]) -> None:
    text = "temperature: found an array of shape (2,); expected one number [K]"
    arguments = {"molar_masses": TWO, "diameters": TWO, "concentrations": TWO, "temperature": TWO}
    _refused(function, arguments, text)


@pytest.mark.parametrize("function", PATHS)
def test_no_gas_has_no_free_path(function: Callable[..., Any]) -> None:
    text = "concentrations: found no gas at all; expected at least one above 0"
    amounts = np.array([[1.0, 0.0], [0.0, 0.0]])
    arguments = {"molar_masses": TWO, "diameters": TWO, "concentrations": amounts}
    _refused(function, arguments, text)
