"""The closed formulas against the distributions they are means of, integrated or sampled."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import constants, integrate
from validation import Checked

from meanfree.collisions import encounters, line_of_centres, mixtures, plane, speeds, walls

R, N_A = constants.R, constants.N_A
MASS, KELVIN = 0.0399, 412.0

# Adaptive Gauss-Kronrod on these smooth integrands reaches 1e-12 and better; asked is 1e-10.
RTOL = 1e-10


def _moment(power: int) -> float:
    """Mean of v^power over the speed density."""
    top = float(speeds.most_probable_speed(MASS, KELVIN))
    value, _ = integrate.quad(
        lambda x: (x * top) ** power * float(speeds.speed_density(x * top, MASS, KELVIN)) * top,
        0.0,
        12.0,  # exp(-144) of the distribution lies beyond
        epsabs=0.0,
        epsrel=1e-12,
    )
    return float(value)


def test_speed_density_integrates_to_one_and_gives_the_mean_speeds() -> None:
    assert _moment(0) == pytest.approx(1.0, rel=RTOL, abs=0.0)
    assert _moment(1) == pytest.approx(speeds.mean_speed(MASS, KELVIN), rel=RTOL, abs=0.0)
    root = math.sqrt(_moment(2))
    assert root == pytest.approx(speeds.root_mean_square_speed(MASS, KELVIN), rel=RTOL, abs=0.0)


def test_speed_density_is_highest_at_the_most_probable_speed() -> None:
    top = float(speeds.most_probable_speed(MASS, KELVIN))
    near = np.array([0.999, 1.0, 1.001]) * top
    density = np.asarray(speeds.speed_density(near, MASS, KELVIN))
    assert density[1] > density[0]
    assert density[1] > density[2]
    assert speeds.speed_density(0.0, MASS, KELVIN) == 0.0


def test_speed_density_equals_three_gaussian_components() -> None:
    # The product of three one-dimensional Maxwell distributions times the shell 4 pi v^2.
    v = 500.0
    one = math.sqrt(MASS / (2.0 * math.pi * R * KELVIN))
    product = one**3 * math.exp(-MASS * v**2 / (2.0 * R * KELVIN)) * 4.0 * math.pi * v**2
    assert speeds.speed_density(v, MASS, KELVIN) == pytest.approx(product, rel=1e-14, abs=0.0)


def test_speeds_in_a_plane_are_the_moments_of_two_components() -> None:
    def moment(power: int) -> float:
        thermal = R * KELVIN / MASS
        unit = math.sqrt(thermal)
        value, _ = integrate.quad(
            lambda x: (x * unit) ** power * x * math.exp(-0.5 * x * x), 0.0, 17.0, epsrel=1e-12
        )
        return float(value)

    assert plane.mean_speed(MASS, KELVIN) == pytest.approx(moment(1), rel=RTOL, abs=0.0)
    assert plane.root_mean_square_speed(MASS, KELVIN) == pytest.approx(
        math.sqrt(moment(2)), rel=RTOL, abs=0.0
    )
    # d/dv of v exp(-v^2 / 2 a^2) vanishes at v = a
    assert plane.most_probable_speed(MASS, KELVIN) == pytest.approx(
        math.sqrt(R * KELVIN / MASS), rel=1e-14, abs=0.0
    )


@pytest.mark.parametrize("dimensions", [3, 2])
def test_relative_speed_and_share_above_threshold_by_sampling(dimensions: int) -> None:
    # Velocities of A and B are drawn, pairs are weighted by their relative speed (a faster pair
    # meets more often), and the impact point is uniform over the disc or the strip.
    rng = np.random.default_rng(7)
    n = 400_000
    masses = (0.004, 0.0839)
    a, b = (rng.normal(size=(n, dimensions)) * math.sqrt(R * KELVIN / m) for m in masses)
    relative = np.sqrt(np.sum((a - b) ** 2, axis=1))
    room = speeds if dimensions == 3 else plane
    expected = float(room.mean_relative_speed(*masses, KELVIN))
    error = float(relative.std()) / math.sqrt(n)
    assert abs(float(relative.mean()) - expected) < 5.0 * error  # chance 6e-7; seed fixed

    draw = rng.uniform(size=n)
    cosine2 = 1.0 - draw if dimensions == 3 else 1.0 - draw**2  # 1 - (b / b_max)^2
    reduced = float(speeds.reduced_molar_mass(*masses))
    energy = 0.5 * reduced * relative**2 * cosine2
    for units in (0.3, 1.0, 3.0):
        threshold = units * R * KELVIN
        hit = energy > threshold
        share = float(np.sum(relative * hit) / np.sum(relative))
        error = math.sqrt(float(np.sum((relative * (hit - share)) ** 2))) / float(relative.sum())
        right = float(line_of_centres.fraction_above(threshold, KELVIN))
        assert abs(share - right) < 5.0 * error
        assert abs(share - right * (1.0 + units)) > 5.0 * error  # all of the energy: wrong


def test_thermal_mean_of_the_reactive_cross_section_is_the_rate_constant() -> None:
    # k = v_rel N_A times the integral of sigma(E) (E / RT) exp(-E / RT) dE / RT.
    threshold, sigma, thermal = 35e3, 3.1e-19, R * KELVIN
    relative = float(speeds.mean_relative_speed(0.028, 0.044, KELVIN))
    mean, _ = integrate.quad(
        lambda x: (
            float(line_of_centres.reactive_cross_section(x * thermal, threshold, sigma))
            * x
            * math.exp(-x)
        ),
        threshold / thermal,
        threshold / thermal + 60.0,
        epsabs=0.0,
        epsrel=1e-12,
    )
    ceiling = encounters.collision_rate_constant(sigma, relative, like=False)
    assert line_of_centres.rate_constant(ceiling, threshold, KELVIN) == pytest.approx(
        N_A * relative * mean, rel=RTOL, abs=0.0
    )


def test_thermal_mean_of_the_reactive_width_is_the_rate_constant_in_a_plane() -> None:
    # k = N_A times the integral of w(E) sqrt(2 E / mu) exp(-E / RT) dE / RT. With
    # E = E0 + RT y^2 the root at the threshold is smooth.
    threshold, width, thermal = 35e3, 7.2e-10, R * KELVIN
    reduced = float(speeds.reduced_molar_mass(0.028, 0.044))

    def integrand(y: float) -> float:
        energy = threshold + thermal * y * y
        reactive = float(line_of_centres.reactive_width(energy, threshold, width))
        return reactive * math.sqrt(2.0 * energy / reduced) * math.exp(-energy / thermal) * 2.0 * y

    mean, _ = integrate.quad(integrand, 0.0, 9.0, epsabs=0.0, epsrel=1e-12)
    relative = plane.mean_relative_speed(0.028, 0.044, KELVIN)
    ceiling = plane.collision_rate_constant(width, relative, like=False)
    assert line_of_centres.rate_constant(ceiling, threshold, KELVIN) == pytest.approx(
        N_A * mean, rel=RTOL, abs=0.0
    )


@pytest.mark.parametrize("room", [speeds, plane], ids=["space", "plane"])
def test_activation_energy_is_the_slope_of_the_rate_constant(
    room: type[speeds] | type[plane],
) -> None:
    threshold, step = 60e3, 0.01

    def log_k(kelvin: float) -> float:
        relative = room.mean_relative_speed(0.03, 0.05, kelvin)
        return math.log(float(line_of_centres.rate_constant(relative, threshold, kelvin)))

    slope = (log_k(KELVIN + step) - log_k(KELVIN - step)) / (2.0 * step)
    # The central difference is right to (step/T)^2 and to rounding over step, 1e-16 * 20 / 2e-5.
    assert R * KELVIN**2 * slope == pytest.approx(
        line_of_centres.activation_energy(threshold, KELVIN), rel=1e-8, abs=0.0
    )


def test_cross_section_at_and_below_the_threshold() -> None:
    energy = np.array([0.0, 10.0, 20.0, 40.0])
    area = line_of_centres.reactive_cross_section(energy, 20.0, 4e-19)
    np.testing.assert_array_equal(area, [0.0, 0.0, 0.0, 2e-19])
    width = line_of_centres.reactive_width(energy, 20.0, 8e-10)
    np.testing.assert_allclose(width, [0.0, 0.0, 0.0, 8e-10 / math.sqrt(2.0)], rtol=1e-15)
    # without a threshold all of it reacts, also at rest
    np.testing.assert_array_equal(
        line_of_centres.reactive_cross_section(energy, 0.0, 4e-19), np.full(4, 4e-19)
    )


def test_impingement_is_the_mean_of_the_normal_velocity() -> None:
    # c times the integral of v_x over v_x > 0 of a one-dimensional Maxwell distribution, which
    # is c sqrt(RT / 2 pi M); effusion of an ideal gas is that flux at p = c R T.
    concentration, area = 3.0, 2e-7
    unit = math.sqrt(R * KELVIN / MASS)
    flux, _ = integrate.quad(
        lambda x: x * unit * math.exp(-0.5 * x * x) / math.sqrt(2.0 * math.pi), 0.0, 12.0
    )
    ours = walls.impingement_flux(concentration, speeds.mean_speed(MASS, KELVIN))
    assert ours == pytest.approx(concentration * flux, rel=RTOL, abs=0.0)
    pressure = concentration * R * KELVIN
    leak = float(walls.effusion_rate(pressure, MASS, KELVIN, area))
    assert leak == pytest.approx(concentration * flux * area, rel=RTOL, abs=0.0)
    half = walls.effusion_rate(pressure, MASS, KELVIN, area, transmission=0.5)
    assert half == pytest.approx(0.5 * leak, rel=1e-15, abs=0.0)
    inwards = walls.effusion_rate(-pressure, MASS, KELVIN, area)
    assert inwards == pytest.approx(-leak, rel=1e-15, abs=0.0)
    # amount over flow is the time constant of dn/dt = -n / tau
    volume = 1.7e-3
    tau = walls.effusion_time_constant(volume, area, speeds.mean_speed(MASS, KELVIN))
    assert tau == pytest.approx(concentration * volume / leak, rel=1e-14, abs=0.0)


def test_graham_effusion_of_uranium_hexafluorides(checked: Checked) -> None:
    # Ideal separation factor of (235)UF6 and (238)UF6 by effusion, a textbook figure of 1.00429
    # (from memory): sqrt(352.04 / 349.03).
    fast = float(walls.effusion_rate(100.0, 349.034e-3, 340.0, 1e-8))
    slow = float(walls.effusion_rate(100.0, 352.041e-3, 340.0, 1e-8))
    source = "a textbook figure (from memory)"
    name = "effusion of the two UF₆"
    checked(
        name, fast / slow, "1.00429", "", source, within=1e-5
    )  # rounding of the printed figure and the masses


def test_free_path_in_a_mixture_is_mean_speed_over_collision_frequency() -> None:
    masses, sizes = np.array([0.002, 0.028, 0.254]), np.array([2.8e-10, 3.7e-10, 5.6e-10])
    amounts = np.array([[10.0, 20.0, 0.0], [1.0, 1e-3, 5.0]])
    for mean_speed, frequencies, free_paths in (
        (
            speeds.mean_speed,
            mixtures.mixture_collision_frequencies,
            mixtures.mixture_mean_free_paths,
        ),
        (
            plane.mean_speed,
            mixtures.plane_mixture_collision_frequencies,
            mixtures.plane_mixture_mean_free_paths,
        ),
    ):
        total = frequencies(masses, sizes, amounts, KELVIN).sum(axis=-1)
        expected = np.asarray(mean_speed(masses, KELVIN)) / total
        np.testing.assert_allclose(free_paths(masses, sizes, amounts), expected, rtol=1e-13)


def test_a_light_trace_among_heavy_molecules_flies_further_than_sqrt_two_says() -> None:
    # m_i << m_j: the heavy ones stand still, the root of 1 + m_i/m_j goes to 1 (electrons in a
    # gas: free path 1 / (n sigma)); a heavy trace among light ones has it large.
    masses, sizes = np.array([1e-6, 0.131]), np.array([2e-10, 4e-10])
    path = mixtures.mixture_mean_free_paths(masses, sizes, np.array([0.0, 40.0]))
    standing = 1.0 / (40.0 * N_A * math.pi * (3e-10) ** 2)
    assert path[0] == pytest.approx(standing, rel=1e-5, abs=0.0)  # m_i / m_j / 2 = 4e-6
    assert path[1] == pytest.approx(
        float(encounters.mean_free_path(math.pi * 16e-20, 40.0)), rel=1e-14, abs=0.0
    )
    heavy = mixtures.mixture_mean_free_paths(masses, sizes, np.array([40.0, 0.0]))
    assert heavy[1] == pytest.approx(standing / math.sqrt(1.0 + 0.131e6), rel=1e-12, abs=0.0)
