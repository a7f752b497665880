"""Collision counts of simulated hard particles against the formulas of the room.

The simulation knows nothing of kinetic theory: positions, velocities, elastic bounces. Two
known corrections stand between a dilute infinite gas and a box of eighty particles, and
neither is fitted:

* Crowding. Encounters at contact are more frequent by the contact value of the pair
  distribution. Spheres: T. Boublik, J. Chem. Phys. 53 (1970) 471, and G. A. Mansoori et al.,
  J. Chem. Phys. 54 (1971) 1523, for a mixture, which is N. F. Carnahan and K. E. Starling,
  J. Chem. Phys. 51 (1969) 635, for one kind. Discs: J. T. Jenkins and F. Mancini, J. Appl.
  Mech. 54 (1987) 27, for a mixture, which is D. Henderson, Mol. Phys. 30 (1975) 971, for one
  kind. (Formulas from memory; both reduce to the form for one kind, tested below.)
* A box at rest. N particles of one kind make N (N - 1) / 2 pairs, not N^2 / 2. Energy and
  momentum are fixed, so dim (N - 1) squares share 2 E evenly on a sphere and kT is 2 E over
  that number: means over that sphere replace Maxwell's (`_sphere` below).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from types import ModuleType
from typing import Any

import numpy as np
import pytest
from scipy import constants

from meanfree.collisions import encounters, line_of_centres, mixtures, plane, speeds

pytestmark = pytest.mark.slow

KELVIN = 1.0 / constants.k  # kT = 1 J

# Five standard errors: Student's t of 41 to 59 degrees of freedom is outside with a chance of
# 1e-5, some forty numbers are compared, and rounding makes every machine draw its own sample.
SIGMAS = 5.0

PAIRS = ((0, 0), (0, 1), (1, 1))


@pytest.fixture(scope="module", params=[3, 2], ids=["spheres", "discs"])
def counted(request: pytest.FixtureRequest, hard_particles: Callable[..., Any]) -> Any:
    """Two kinds that differ in mass and size, in space and in a plane."""
    return hard_particles(
        dimensions=request.param,
        numbers=(44, 36),
        masses=(1.0, 4.0),
        diameters=(1.0, 1.5),
        filled=0.02 if request.param == 3 else 0.04,
        block=1200.0,
        n_blocks=42 if request.param == 3 else 60,
        seed=20_251_201,
    )


def _contact_spheres(densities: np.ndarray, sizes: np.ndarray, a: int, b: int) -> float:
    """Boublik-Mansoori-Carnahan-Starling-Leland contact value [1]."""
    second, third = (math.pi / 6 * float(np.sum(densities * sizes**k)) for k in (2, 3))
    joint = sizes[a] * sizes[b] / (sizes[a] + sizes[b]) * second
    free = 1.0 - third
    return float(1 / free + 3 * joint / free**2 + 2 * joint**2 / free**3)


def _contact_discs(densities: np.ndarray, sizes: np.ndarray, a: int, b: int) -> float:
    """Jenkins-Mancini contact value [1]."""
    first, second = (math.pi / 4 * float(np.sum(densities * sizes**k)) for k in (1, 2))
    joint = sizes[a] * sizes[b] / (sizes[a] + sizes[b]) * first
    free = 1.0 - second
    return float(1 / free + 9 / 8 * joint / free**2)


def _contact(run: Any, a: int, b: int) -> float:
    densities = np.array(run.numbers) / run.box**run.dimensions
    formula = _contact_spheres if run.dimensions == 3 else _contact_discs
    return formula(densities, np.array(run.diameters), a, b)


def _sphere(freedom: int) -> float:
    """Mean speed on the energy sphere over Maxwell's: 1 + 1 / (4 f) and less, f squares."""
    half = 0.5 * freedom
    return math.sqrt(half) * math.exp(math.lgamma(half) - math.lgamma(half + 0.5))


def _molar(run: Any) -> tuple[np.ndarray, np.ndarray]:
    """Molar masses [kg/mol] and concentrations [mol/m^3 or mol/m^2] of the two kinds."""
    amounts = np.array(run.numbers) / (constants.N_A * run.box**run.dimensions)
    return constants.N_A * np.array(run.masses), amounts


def _formula(run: Any, a: int, b: int) -> float:
    """Encounters in a block that the room expects of an infinite dilute gas."""
    masses, amounts = _molar(run)
    fast: ModuleType = speeds if run.dimensions == 3 else plane
    dense: ModuleType = encounters if run.dimensions == 3 else plane
    sizes = run.diameters
    relative = fast.mean_relative_speed(masses[a], masses[b], KELVIN)
    if run.dimensions == 3:
        target = encounters.cross_section_from_diameters(sizes[a], sizes[b])
    else:
        target = plane.swept_width(sizes[a], sizes[b])
    if a == b:
        density = dense.collision_density_like(target, relative, amounts[a])
    else:
        density = dense.collision_density_unlike(target, relative, amounts[a], amounts[b])
    return float(constants.N_A * density * run.box**run.dimensions * run.block)


def _own_pairs(run: Any, a: int, b: int) -> float:
    """(N - 1) / N for partners of one kind."""
    return (run.numbers[a] - 1) / run.numbers[a] if a == b else 1.0


def _expected(run: Any, a: int, b: int) -> float:
    """The formula with both corrections."""
    box_at_rest = _own_pairs(run, a, b) * _sphere(run.freedom)
    return _formula(run, a, b) * _contact(run, a, b) * box_at_rest


def _mean_and_error(blocks: np.ndarray) -> tuple[float, float]:
    """Mean of the blocks and its standard error; a block outlasts 60 to 150 collisions of each."""
    return float(blocks.mean()), float(blocks.std(ddof=1) / math.sqrt(len(blocks)))


def test_simulation_conserves_energy_and_misses_no_collision(counted: Any) -> None:
    # Rounding alone: some 1e6 bounces of 1e-16 each; a missed collision would show as a contact
    # at a wrong distance of the order of a diameter.
    assert np.ptp(counted.energies) < 1e-11 * counted.energies[0]
    assert counted.energies[0] == pytest.approx(0.5 * counted.freedom, rel=1e-12, abs=0.0)
    assert counted.worst_contact < 1e-10


@pytest.mark.parametrize(("a", "b"), PAIRS)
def test_encounters_are_as_many_as_the_formula_says(counted: Any, a: int, b: int) -> None:
    # What is left out is the 1/N correction of the contact value itself, which the fluctuation
    # formula of J. L. Lebowitz and J. K. Percus, Phys. Rev. 122 (1961) 1675, puts at about
    # 3 eta / N = 8e-4 for spheres: a fifth of the standard error.
    # A run ten times as long (seed 99) is off by 0.3 to 1.5e-3 for spheres and by -2.2e-3 to
    # 0.4e-3 for discs, each with a standard error of 0.6 to 1.4e-3.
    mean, error = _mean_and_error(counted.counts[:, a, b])
    assert error < 0.006 * mean  # else the comparison would say little
    assert abs(mean - _expected(counted, a, b)) < SIGMAS * error


@pytest.mark.parametrize(("a", "b"), PAIRS)
def test_the_count_would_notice_a_wrong_formula(counted: Any, a: int, b: int) -> None:
    mean, error = _mean_and_error(counted.counts[:, a, b])
    right = _expected(counted, a, b)
    wrong = {
        "half dropped or doubled": right * (2.0 if a == b else 0.5),
        "mean speed of A for the relative speed": right
        / math.sqrt(1.0 + counted.masses[a] / counted.masses[b]),
        "reduced mass forgotten": right * math.sqrt(2.0),
        "the other dimension's mean speed": right * (math.pi / 4.0),
        "crowding forgotten": right / _contact(counted, a, b),
    }
    for what, value in wrong.items():
        assert abs(mean - value) > SIGMAS * error, what


def test_the_count_sees_the_pairs_of_a_small_box(counted: Any) -> None:
    # For one kind alone the missing 1/N is two or three per cent, some six standard errors; the
    # two kinds together leave room for chance.
    excess = 0.0
    for kind in (0, 1):
        mean, error = _mean_and_error(counted.counts[:, kind, kind])
        forgotten = _expected(counted, kind, kind) / _own_pairs(counted, kind, kind)
        excess += ((mean - forgotten) / error) ** 2
    assert excess > 2.0 + SIGMAS * 2.0  # chi squared of two: mean 2, standard deviation 2


@pytest.mark.parametrize("kind", [0, 1])
def test_mean_speed_and_free_path(counted: Any, kind: int) -> None:
    masses, amounts = _molar(counted)
    # The speed of one molecule against the rest has the reduced mass m (M - m) / M, hence the
    # root below for its speed in the box at rest.
    total = sum(n * m for n, m in zip(counted.numbers, counted.masses, strict=True))
    at_rest = math.sqrt(1.0 - counted.masses[kind] / total)
    fast: ModuleType = speeds if counted.dimensions == 3 else plane
    expected = at_rest * _sphere(counted.freedom) * fast.mean_speed(masses[kind], KELVIN)
    travelled = counted.paths[:, kind]
    mean, error = _mean_and_error(travelled / (counted.numbers[kind] * counted.block))
    assert abs(mean - expected) < SIGMAS * error

    space = counted.dimensions == 3
    frequencies = (
        mixtures.mixture_collision_frequencies
        if space
        else mixtures.plane_mixture_collision_frequencies
    )
    free_paths = (
        mixtures.mixture_mean_free_paths if space else mixtures.plane_mixture_mean_free_paths
    )
    sizes = np.array(counted.diameters)
    dilute = frequencies(masses, sizes, amounts, KELVIN)[kind]
    pairs = [(min(kind, other), max(kind, other)) for other in (0, 1)]
    crowded = dilute * [_contact(counted, *p) * _own_pairs(counted, *p) for p in pairs]
    path = free_paths(masses, sizes, amounts)[kind] * at_rest * dilute.sum() / crowded.sum()
    # Each encounter of like molecules ends the free path of two of them.
    ends = counted.counts[:, kind, kind] * 2.0 + counted.counts[:, 0, 1]
    mean, error = _mean_and_error(travelled / ends)
    assert abs(mean - path) < SIGMAS * error
    mean, error = _mean_and_error(ends / (counted.numbers[kind] * counted.block))
    assert abs(mean - crowded.sum() * _sphere(counted.freedom)) < SIGMAS * error


@pytest.mark.parametrize(("a", "b"), PAIRS)
def test_share_of_encounters_above_a_threshold(counted: Any, a: int, b: int) -> None:
    # On the energy sphere the flux-weighted share is (1 - E0 / E)^((f - 1) / 2), which is
    # exp(-E0 / kT) for many molecules; the ratio of the two is the correction.
    for level, threshold in enumerate(counted.thresholds):
        seen = counted.above[:, a, b, level]
        share = seen.sum() / counted.counts[:, a, b].sum()
        per_block = seen - share * counted.counts[:, a, b]
        error = per_block.std(ddof=1) * math.sqrt(len(seen)) / counted.counts[:, a, b].sum()
        molar = threshold * constants.N_A
        freedom = counted.freedom
        correction = math.exp(threshold) * (1 - 2 * threshold / freedom) ** ((freedom - 1) / 2)
        expected = line_of_centres.fraction_above(molar, KELVIN) * correction
        assert abs(share - expected) < SIGMAS * error
        # Energy over all directions instead of along the centres: (1 + E0/kT) times as many in
        # space (and other functions in a plane) is far outside.
        assert abs(share - expected * (1.0 + threshold)) > SIGMAS * error


def test_contact_values_of_mixtures_reduce_to_one_kind() -> None:
    # Carnahan and Starling (1969): (1 - eta/2) / (1 - eta)^3; Henderson (1975):
    # (1 - 7 eta / 16) / (1 - eta)^2. Equal sizes make the mixture one kind; rounding limits.
    sizes = np.array([1.3, 1.3])
    for filled in (0.01, 0.1, 0.3):
        shares = np.array([0.25, 0.75])
        spheres = shares * filled / (math.pi / 6 * 1.3**3)
        discs = shares * filled / (math.pi / 4 * 1.3**2)
        single = (1 - filled / 2) / (1 - filled) ** 3
        assert _contact_spheres(spheres, sizes, 0, 1) == pytest.approx(single, rel=1e-14, abs=0.0)
        single = (1 - 7 * filled / 16) / (1 - filled) ** 2
        assert _contact_discs(discs, sizes, 0, 1) == pytest.approx(single, rel=1e-14, abs=0.0)
