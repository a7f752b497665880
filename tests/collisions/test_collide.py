"""The record of a pair against hand calculation, and what it refuses."""

from __future__ import annotations

import dataclasses
import math
import re
from typing import Any

import numpy as np
import pytest
from scipy import constants

from meanfree.collisions import PairCollisions, collide, encounters, mixtures, plane, speeds

R, N_A = constants.R, constants.N_A

ARGON, NITROGEN = (39.948e-3, 3.40e-10), (28.0134e-3, 3.64e-10)


def _pair(**changes: Any) -> PairCollisions:
    arguments: dict[str, Any] = {
        "molar_masses": (ARGON[0], NITROGEN[0]),
        "diameters": (ARGON[1], NITROGEN[1]),
        "temperature": 400.0,
        "same_gas": False,
    }
    return collide(**(arguments | changes))


def test_two_gases_in_space_by_hand() -> None:
    # Every number from the formula with k_B and single molecules, where the room uses R and
    # moles; what separates the two is rounding.
    pair = _pair(pressure=20e3, mole_fractions=(0.2, 0.8), threshold=50e3)
    kT = constants.k * 400.0
    m_a, m_b = ARGON[0] / N_A, NITROGEN[0] / N_A
    mu = m_a * m_b / (m_a + m_b)
    contact = 3.52e-10
    v_rel = math.sqrt(8 * kT / (math.pi * mu))
    same: dict[str, float] = {"rel": 1e-13, "abs": 0.0}
    assert pair.pair_diameter == pytest.approx(contact, **same)
    assert pair.target == pytest.approx(math.pi * contact**2, **same)
    assert pair.reduced_molar_mass == pytest.approx(mu * N_A, **same)
    assert pair.mean_relative_speed == pytest.approx(v_rel, **same)
    assert pair.mean_speeds == pytest.approx(
        [math.sqrt(8 * kT / (math.pi * m)) for m in (m_a, m_b)], **same
    )
    assert pair.root_mean_square_speeds == pytest.approx(
        [math.sqrt(3 * kT / m) for m in (m_a, m_b)], **same
    )
    assert pair.most_probable_speeds == pytest.approx(
        [math.sqrt(2 * kT / m) for m in (m_a, m_b)], **same
    )
    ceiling = math.pi * contact**2 * v_rel * N_A
    assert pair.ceiling == pytest.approx(ceiling, **same)
    share = math.exp(-50e3 / (R * 400.0))
    assert pair.fraction_above == pytest.approx(share, **same)
    assert pair.rate_constant == pytest.approx(ceiling * share, **same)
    assert pair.activation_energy == pytest.approx(50e3 + 0.5 * R * 400.0, **same)
    crowd = pair.crowd
    assert crowd is not None
    number = 20e3 / kT
    n_a, n_b = 0.2 * number, 0.8 * number
    assert crowd.mole_fractions == (0.2, 0.8)
    assert crowd.concentrations == pytest.approx([n_a / N_A, n_b / N_A], **same)
    ab = math.pi * contact**2 * v_rel
    aa = math.pi * ARGON[1] ** 2 * math.sqrt(16 * kT / (math.pi * m_a))
    bb = math.pi * NITROGEN[1] ** 2 * math.sqrt(16 * kT / (math.pi * m_b))
    assert crowd.frequencies_with_partner == pytest.approx([ab * n_b, ab * n_a], **same)
    each = [aa * n_a + ab * n_b, bb * n_b + ab * n_a]
    assert crowd.frequencies == pytest.approx(each, **same)
    paths = [v / z for v, z in zip(pair.mean_speeds, each, strict=True)]
    assert crowd.mean_free_paths == pytest.approx(paths, **same)
    assert crowd.collision_density == pytest.approx(ab * n_a * n_b / N_A, **same)
    filled = math.pi / 6 * (n_a * ARGON[1] ** 3 + n_b * NITROGEN[1] ** 3)
    assert crowd.filled_fraction == pytest.approx(filled, **same)


def test_one_gas_carries_the_half_in_ceiling_and_density() -> None:
    pair = _pair(
        molar_masses=(ARGON[0], ARGON[0]),
        diameters=(ARGON[1], ARGON[1]),
        same_gas=True,
        pressure=101325.0,
    )
    twins = _pair(
        molar_masses=(ARGON[0], ARGON[0]), diameters=(ARGON[1], ARGON[1]), pressure=101325.0
    )
    assert pair.mean_relative_speed == pytest.approx(
        math.sqrt(2) * pair.mean_speeds[0], rel=1e-14, abs=0.0
    )
    assert pair.ceiling == pytest.approx(0.5 * twins.ceiling, rel=1e-15, abs=0.0)
    assert pair.rate_constant == pair.ceiling  # no threshold: every encounter
    crowd, split = pair.crowd, twins.crowd
    assert crowd is not None
    assert split is not None
    assert crowd.mole_fractions == (1.0, 1.0)
    assert split.mole_fractions == (0.5, 0.5)
    # A gas called by two names collides as often: AA + AB + BB of the halves.
    halves = 2 * 0.25 * crowd.collision_density + split.collision_density
    assert halves == pytest.approx(crowd.collision_density, rel=1e-14, abs=0.0)
    assert split.frequencies == pytest.approx(crowd.frequencies, rel=1e-14, abs=0.0)
    assert split.mean_free_paths == pytest.approx(crowd.mean_free_paths, rel=1e-14, abs=0.0)
    assert split.filled_fraction == pytest.approx(crowd.filled_fraction, rel=1e-14, abs=0.0)
    amount = crowd.concentrations[0]
    assert crowd.mean_free_paths[0] == pytest.approx(
        float(encounters.mean_free_path(pair.target, amount)), rel=1e-14, abs=0.0
    )
    # a molecule meets z others a second, and each encounter takes two
    assert crowd.collision_density == pytest.approx(
        0.5 * crowd.frequencies[0] * amount, rel=1e-14, abs=0.0
    )
    assert crowd.frequencies_with_partner == crowd.frequencies


def test_two_gases_in_a_plane_by_hand() -> None:
    pair = _pair(in_plane=True, surface_concentration=2e-7, threshold=20e3)
    kT = constants.k * 400.0
    m_a, m_b = ARGON[0] / N_A, NITROGEN[0] / N_A
    v_rel = math.sqrt(math.pi * kT * (m_a + m_b) / (2 * m_a * m_b))
    width = 7.04e-10
    same: dict[str, float] = {"rel": 1e-13, "abs": 0.0}
    assert pair.in_plane
    assert pair.target == pytest.approx(width, **same)
    assert pair.mean_relative_speed == pytest.approx(v_rel, **same)
    assert pair.mean_speeds == pytest.approx(
        [math.sqrt(math.pi * kT / (2 * m)) for m in (m_a, m_b)], **same
    )
    assert pair.root_mean_square_speeds == pytest.approx(
        [math.sqrt(2 * kT / m) for m in (m_a, m_b)], **same
    )
    assert pair.ceiling == pytest.approx(width * v_rel * N_A, **same)
    assert pair.rate_constant == pytest.approx(
        width * v_rel * N_A * math.exp(-20e3 / (R * 400.0)), **same
    )
    crowd = pair.crowd
    assert crowd is not None
    n = 1e-7 * N_A  # half and half
    assert crowd.frequencies_with_partner == pytest.approx([width * v_rel * n] * 2, **same)
    assert crowd.collision_density == pytest.approx(width * v_rel * n * n / N_A, **same)
    aa = 2 * ARGON[1] * math.sqrt(math.pi * kT / m_a)
    assert crowd.frequencies[0] == pytest.approx((aa + width * v_rel) * n, **same)
    filled = math.pi / 4 * n * (ARGON[1] ** 2 + NITROGEN[1] ** 2)
    assert crowd.filled_fraction == pytest.approx(filled, **same)
    one = _pair(
        molar_masses=(ARGON[0], ARGON[0]),
        diameters=(ARGON[1], ARGON[1]),
        same_gas=True,
        in_plane=True,
        surface_concentration=2e-7,
    )
    assert one.crowd is not None
    assert one.crowd.mean_free_paths[1] == pytest.approx(
        float(plane.mean_free_path(2 * ARGON[1], 2e-7)), rel=1e-14, abs=0.0
    )
    relative = plane.mean_relative_speed(ARGON[0], ARGON[0], 400.0)
    assert one.ceiling == plane.collision_rate_constant(2 * ARGON[1], relative, like=True)
    density = plane.collision_density_like(2 * ARGON[1], relative, 2e-7)
    assert one.crowd.collision_density == pytest.approx(float(density), rel=1e-14, abs=0.0)


def test_without_an_amount_there_is_no_crowd() -> None:
    assert _pair().crowd is None
    assert _pair(in_plane=True).crowd is None


def test_a_trace_of_nothing_still_has_a_free_path() -> None:
    crowd = _pair(pressure=1e3, mole_fractions=(0.0, 1.0)).crowd
    assert crowd is not None
    assert crowd.collision_density == 0.0
    assert crowd.frequencies_with_partner[1] == 0.0
    assert 0.0 < crowd.mean_free_paths[0] < 1e-3


def test_the_record_is_frozen_and_plain() -> None:
    pair = _pair(pressure=1e5)
    with pytest.raises(dataclasses.FrozenInstanceError):
        pair.ceiling = 1.0  # type: ignore[misc]
    values = dataclasses.asdict(pair)
    flat = [*values.values(), *values["crowd"].values()]
    for value in flat:
        for item in value if isinstance(value, tuple) else (value,):
            assert type(item) in (float, bool, dict)


@pytest.mark.parametrize(
    ("changes", "text"),
    [
        (
            {"molar_masses": (0.04, -0.028)},
            "molar_masses: found -0.028 at index 1; expected a finite number above 0 [kg/mol]",
        ),
        (
            {"diameters": (0.0, 3e-10)},
            "diameters: found 0 at index 0; expected a finite number above 0 [m]",
        ),
        (
            {"temperature": -10.0},
            "temperature: found -10; expected a finite number above 0 [K]",
        ),
        (
            {"threshold": -1.0},
            "threshold: found -1; expected a finite number not below 0 [J/mol]",
        ),
        (
            {"same_gas": True},
            "molar_masses: found 0.039948 and 0.0280134 [kg/mol] with same_gas; "
            "expected the same value twice",
        ),
        (
            {"same_gas": True, "molar_masses": (0.04, 0.04)},
            "diameters: found 3.4e-10 and 3.64e-10 [m] with same_gas; "
            "expected the same value twice",
        ),
        (
            {"pressure": 0.0},
            "pressure: found 0; expected a finite number above 0 [Pa]",
        ),
        (
            {"in_plane": True, "surface_concentration": -1.0},
            "surface_concentration: found -1; expected a finite number above 0 [mol/m^2]",
        ),
        (
            {"temperature": np.array([300.0, 400.0])},
            "temperature: found an array of shape (2,); expected one number [K]",
        ),
        (
            {"in_plane": True, "pressure": 1e5},
            "pressure: found 100000 in a plane; expected surface_concentration [mol/m^2]",
        ),
        (
            {"surface_concentration": 1e-7},
            "surface_concentration: found 1e-07 in space; expected pressure [Pa], or in_plane",
        ),
        (
            {"mole_fractions": (0.5, 0.5)},
            "mole_fractions: found (0.5, 0.5) without an amount; "
            "expected pressure or surface_concentration with them",
        ),
        (
            {"pressure": 1e5, "mole_fractions": (0.5, 0.6)},
            "mole_fractions: found 0.5 and 0.6; expected two numbers that add up to 1",
        ),
        (
            {"pressure": 1e5, "mole_fractions": (1.2, -0.2)},
            "mole_fractions: found -0.2 at index 1; expected a finite number not below 0 [1]",
        ),
        (
            {
                "same_gas": True,
                "molar_masses": (0.04, 0.04),
                "diameters": (3e-10, 3e-10),
                "pressure": 1e5,
                "mole_fractions": (0.5, 0.5),
            },
            "mole_fractions: found (0.5, 0.5) with same_gas; expected none, the gas is pure",
        ),
    ],
)
def test_refusals(changes: dict[str, Any], text: str) -> None:
    with pytest.raises(ValueError, match=f"^{re.escape(text)}$"):
        _pair(**changes)


def test_names_of_the_room_are_those_it_declares() -> None:
    import meanfree.collisions as room

    held = {name for name in vars(room) if not name.startswith("_")} - {"annotations", "summary"}
    assert held == set(room.__all__)
    assert list(room.__all__) == sorted(room.__all__)
    for module in (encounters, mixtures, plane, speeds):
        assert all(function.__doc__ for function in vars(module).values() if callable(function))
