"""What must not change, or must change in a known way, whatever the gases."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants

from meanfree.collisions import collide, encounters, line_of_centres, mixtures, plane, speeds

MASSES = st.floats(1e-3, 0.5)
DIAMETERS = st.floats(1e-10, 2e-9)
KELVINS = st.floats(20.0, 3000.0)
SCALES = st.floats(1e-3, 1e3)
AMOUNTS = st.floats(1e-6, 100.0)

# The same examples every time, and no clock: machines are shared.
steady = settings(derandomize=True, deadline=None)

# Ten operations in another order: ten roundings at most.
SAME: dict[str, float] = {"rel": 1e-14, "abs": 0.0}


@steady
@given(MASSES, MASSES, DIAMETERS, DIAMETERS, KELVINS, st.floats(0.0, 1.0), st.booleans())
def test_the_two_partners_may_change_places(
    m_a: float, m_b: float, d_a: float, d_b: float, kelvin: float, share: float, flat: bool
) -> None:
    amount = {"surface_concentration": 1e-7} if flat else {"pressure": 1e4}
    common = {"same_gas": False, "in_plane": flat, "threshold": 1e4, **amount}
    one = collide((m_a, m_b), (d_a, d_b), kelvin, mole_fractions=(share, 1 - share), **common)
    two = collide((m_b, m_a), (d_b, d_a), kelvin, mole_fractions=(1 - share, share), **common)
    for name in ("mean_relative_speed", "target", "ceiling", "rate_constant", "pair_diameter"):
        assert getattr(one, name) == pytest.approx(getattr(two, name), **SAME), name
    assert one.mean_speeds == two.mean_speeds[::-1]
    assert one.crowd is not None
    assert two.crowd is not None
    for name in ("mean_free_paths", "frequencies", "frequencies_with_partner", "concentrations"):
        assert getattr(one.crowd, name) == pytest.approx(getattr(two.crowd, name)[::-1], **SAME)
    assert one.crowd.collision_density == pytest.approx(two.crowd.collision_density, **SAME)


@steady
@given(MASSES, DIAMETERS, KELVINS, AMOUNTS)
def test_like_is_half_of_unlike_with_the_same_properties(
    mass: float, size: float, kelvin: float, amount: float
) -> None:
    for room, fast, target in (
        (encounters, speeds, encounters.cross_section_from_diameters(size, size)),
        (plane, plane, plane.swept_width(size, size)),
    ):
        relative = fast.mean_relative_speed(mass, mass, kelvin)
        assert relative == pytest.approx(
            math.sqrt(2) * float(fast.mean_speed(mass, kelvin)), **SAME
        )
        like = room.collision_rate_constant(target, relative, like=True)
        unlike = room.collision_rate_constant(target, relative, like=False)
        assert 2.0 * float(like) == unlike
        density = room.collision_density_like(target, relative, amount)
        twins = room.collision_density_unlike(target, relative, amount, amount)
        assert 2.0 * float(density) == pytest.approx(float(twins), **SAME)
        # each molecule collides z times a second, and every encounter takes two of them
        frequency = room.collision_frequency(target, relative, amount)
        assert float(density) == pytest.approx(0.5 * float(frequency) * amount, **SAME)
        path = float(room.mean_free_path(target, amount))
        assert path * float(frequency) == pytest.approx(
            float(fast.mean_speed(mass, kelvin)), **SAME
        )


@steady
@given(MASSES, MASSES, DIAMETERS, DIAMETERS, KELVINS, SCALES, SCALES)
def test_units_of_length_and_mass_scale_out(
    m_a: float, m_b: float, d_a: float, d_b: float, kelvin: float, length: float, mass: float
) -> None:
    # In units of length L and mass M a speed goes as M^(-1/2) at fixed thermal energy in joule,
    # an area as L^2, a width as L.
    one = collide((m_a, m_b), (d_a, d_b), kelvin, same_gas=False)
    two = collide((mass * m_a, mass * m_b), (length * d_a, length * d_b), kelvin, same_gas=False)
    assert two.ceiling == pytest.approx(one.ceiling * length**2 / math.sqrt(mass), **SAME)
    one = collide((m_a, m_b), (d_a, d_b), kelvin, same_gas=False, in_plane=True)
    two = collide(
        (mass * m_a, mass * m_b),
        (length * d_a, length * d_b),
        kelvin,
        same_gas=False,
        in_plane=True,
    )
    assert two.ceiling == pytest.approx(one.ceiling * length / math.sqrt(mass), **SAME)


@steady
@given(MASSES, MASSES, KELVINS, SCALES)
def test_only_the_ratio_of_temperature_and_mass_matters_for_speeds(
    m_a: float, m_b: float, kelvin: float, scale: float
) -> None:
    for fast in (speeds, plane):
        for function in (fast.mean_speed, fast.root_mean_square_speed, fast.most_probable_speed):
            assert function(scale * m_a, scale * kelvin) == pytest.approx(
                float(function(m_a, kelvin)), **SAME
            )
        assert fast.mean_relative_speed(scale * m_a, scale * m_b, scale * kelvin) == pytest.approx(
            float(fast.mean_relative_speed(m_a, m_b, kelvin)), **SAME
        )
        # the squares of the mean relative speeds against a third body add up
        total = float(fast.mean_speed(m_a, kelvin)) ** 2 + float(fast.mean_speed(m_b, kelvin)) ** 2
        assert float(fast.mean_relative_speed(m_a, m_b, kelvin)) ** 2 == pytest.approx(
            total, **SAME
        )


@steady
@given(
    st.lists(st.tuples(MASSES, DIAMETERS, AMOUNTS), min_size=1, max_size=5),
    KELVINS,
    st.randoms(use_true_random=False),
)
def test_mixtures_ignore_order_and_names(
    gases: list[tuple[float, float, float]], kelvin: float, random: Any
) -> None:
    masses, sizes, amounts = (np.array(column) for column in zip(*gases, strict=True))
    order = np.array(random.sample(range(len(gases)), len(gases)))
    for frequencies, free_paths in (
        (mixtures.mixture_collision_frequencies, mixtures.mixture_mean_free_paths),
        (mixtures.plane_mixture_collision_frequencies, mixtures.plane_mixture_mean_free_paths),
    ):
        z = frequencies(masses, sizes, amounts, kelvin)
        mixed = frequencies(masses[order], sizes[order], amounts[order], kelvin)
        np.testing.assert_allclose(mixed, z[np.ix_(order, order)], rtol=1e-14)
        # A meets B as often as B meets A
        met = amounts[:, None] * z
        np.testing.assert_allclose(met, met.T, rtol=1e-14)
        path = free_paths(masses, sizes, amounts)
        np.testing.assert_allclose(
            free_paths(masses[order], sizes[order], amounts[order]), path[order], rtol=1e-14
        )
        # the first gas written as two of one kind
        split = np.concatenate([amounts, 0.3 * amounts[:1]])
        split[0] *= 0.7
        twice = free_paths(np.append(masses, masses[0]), np.append(sizes, sizes[0]), split)
        np.testing.assert_allclose(twice[:-1], path, rtol=1e-14)
        np.testing.assert_allclose(twice[-1], path[0], rtol=1e-14)


@steady
@given(st.floats(-2e5, 4e5), KELVINS, st.floats(1e-3, 1e3), st.floats(1e6, 1e10))
def test_steric_factors_and_activation_energies_go_there_and_back(
    Ea: float, kelvin: float, factor: float, ceiling: float
) -> None:
    thermal = constants.R * kelvin
    threshold = line_of_centres.threshold_from_activation_energy(Ea, kelvin)
    assert threshold.below_half_rt is (Ea < 0.5 * thermal)
    if threshold.below_half_rt:
        assert threshold.energy == 0.0
    else:
        back = line_of_centres.activation_energy(threshold.energy, kelvin)
        assert back == pytest.approx(Ea, abs=1e-10)  # rounding of a difference of some 1e5
    k = line_of_centres.rate_constant(ceiling, threshold.energy, kelvin, factor)
    if float(k) < 1e-290 or Ea < -600.0 * thermal:  # beyond what a float can hold
        return
    both = line_of_centres.steric_factors(k, ceiling, Ea, kelvin)
    # Rounding of E0 / RT in an exponent of up to a few hundred.
    assert both.steric == pytest.approx(factor, rel=1e-12, abs=0.0)
    assert both.threshold == threshold
    again = line_of_centres.steric_from_a_over_z(both.a_over_z, Ea, kelvin)
    assert again == pytest.approx(factor, rel=1e-12, abs=0.0)
    if not threshold.below_half_rt:
        assert float(both.a_over_z) == pytest.approx(math.sqrt(math.e) * factor, rel=1e-12, abs=0.0)


@steady
@given(KELVINS, st.lists(st.floats(0.0, 3e5), min_size=2, max_size=6))
def test_arrays_give_what_their_elements_give(kelvin: float, energies: list[float]) -> None:
    column = np.array(energies)[:, None]
    kelvins = np.array([kelvin, 2.0 * kelvin])
    table = np.asarray(line_of_centres.fraction_above(column, kelvins))
    assert table.shape == (len(energies), 2)
    width = np.asarray(line_of_centres.reactive_width(column, 1e5, np.array([1e-9, 2e-9])))
    floors = line_of_centres.threshold_from_activation_energy(column, kelvins)
    for i, energy in enumerate(energies):
        for j in range(2):
            one = line_of_centres.fraction_above(energy, float(kelvins[j]))
            assert isinstance(one, float)
            # numpy's exponential of many numbers may differ from that of one in the last
            # digit, and below 1e-300 digits are lost
            assert table[i, j] == pytest.approx(one, rel=1e-15, abs=1e-300)
            single = line_of_centres.threshold_from_activation_energy(energy, float(kelvins[j]))
            assert np.asarray(floors.energy)[i, j] == single.energy
            assert np.asarray(floors.below_half_rt)[i, j] == single.below_half_rt
        assert width[i, 1] == pytest.approx(
            float(line_of_centres.reactive_width(energy, 1e5, 2e-9)), rel=1e-15, abs=0.0
        )


def test_an_overflowing_a_over_z_is_infinite_and_says_no_warning() -> None:
    both = line_of_centres.steric_factors(1.0, 1e8, 5e5, 20.0)
    assert both.a_over_z == math.inf
    assert both.steric == math.inf


def test_an_activation_energy_of_exactly_half_rt_has_a_threshold_of_zero_and_no_flag() -> None:
    # RT/2 halves exactly in binary, so E0 is 0 and not a rounding beside it.
    threshold = line_of_centres.threshold_from_activation_energy(0.5 * constants.R * 300.0, 300.0)
    assert threshold == line_of_centres.Threshold(0.0, below_half_rt=False)
