"""Designs: every condition follows from its index, and the points lie as they should."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from scipy.stats import qmc

from meanfree.campaigns.designs import Design, Grid, Listed, QuasiRandom, Spread, spaced

GRID = Grid({"a": np.array([1.0, 2.0, 3.0]), "b": np.array([5.0, 7.0]), "c": np.arange(4.0)})
SPREADS = {
    "a": Spread("linear", 2.0, 6.0),
    "b": Spread("log", 1e-3, 1e3),
    "c": Spread("normal", 10.0, 2.0),
}
RANDOM = QuasiRandom(SPREADS, 10, 7)
LISTED = Listed({"a": np.arange(13.0), "b": np.arange(13.0) ** 2}, "points.csv")


@pytest.mark.parametrize("design", [GRID, RANDOM, LISTED], ids=lambda d: type(d).__name__)
def test_any_part_can_be_made_alone(design: Design) -> None:
    whole = design.rows(0, design.count)
    rng = np.random.default_rng(5)
    for _ in range(12):
        start, stop = np.sort(rng.integers(0, design.count + 1, 2))
        part = design.rows(int(start), int(stop))
        assert list(part) == list(design.addresses)
        for address, column in part.items():
            np.testing.assert_array_equal(column, whole[address][start:stop])


def test_a_grid_holds_every_combination_once() -> None:
    rows = GRID.rows(0, GRID.count)
    combinations = set(zip(*(column.tolist() for column in rows.values()), strict=True))
    assert len(combinations) == GRID.count == 3 * 2 * 4
    assert rows["c"][:5].tolist() == [0.0, 1.0, 2.0, 3.0, 0.0]  # the last moves fastest


def test_spacings() -> None:
    np.testing.assert_allclose(spaced(1.0, 100.0, 3, "log"), [1.0, 10.0, 100.0], rtol=1e-14)
    np.testing.assert_allclose(spaced(1.0, 100.0, 3, "linear"), [1.0, 50.5, 100.0], rtol=1e-14)
    assert spaced(3.0, 9.0, 1, "linear").tolist() == [3.0]


def test_quasi_random_points_are_spread_as_asked() -> None:
    """Kolmogorov's distance of 1,024 Sobol points from their own distribution.

    Every one-dimensional projection has one point in each of 1,024 equal shares, so the distance
    is below 2/1024; random points come to about 0.03.
    """
    rows = RANDOM.rows(0, RANDOM.count)
    expected = {
        "a": stats.uniform(2.0, 4.0),
        "b": stats.loguniform(1e-3, 1e3),
        "c": stats.norm(10.0, 2.0),
    }
    for address, distribution in expected.items():
        distance = stats.kstest(rows[address], distribution.cdf).statistic
        assert distance < 2 / 1024


def test_quasi_random_points_fill_the_space_together() -> None:
    """Centred discrepancy in three dimensions far below that of random points."""
    rows = RANDOM.rows(0, RANDOM.count)
    shares = np.column_stack([
        (rows["a"] - 2.0) / 4.0,
        (np.log10(rows["b"]) + 3.0) / 6.0,
        stats.norm(10.0, 2.0).cdf(rows["c"]),
    ])  # fmt: skip
    random = np.random.default_rng(1).random(shares.shape)
    assert qmc.discrepancy(shares) < qmc.discrepancy(random) / 20


def test_the_seed_decides_the_points() -> None:
    other = QuasiRandom(SPREADS, 10, 8).rows(0, 64)
    again = QuasiRandom(SPREADS, 10, 7).rows(0, 64)
    assert np.all(other["a"] != RANDOM.rows(0, 64)["a"])
    np.testing.assert_array_equal(again["a"], RANDOM.rows(0, 64)["a"])


def test_whatever_changes_a_condition_changes_the_description() -> None:
    described = [
        GRID,
        Grid({**GRID.values, "b": np.array([5.0, np.nextafter(7.0, 8.0)])}),
        RANDOM,
        QuasiRandom(SPREADS, 10, 8),
        QuasiRandom(SPREADS, 11, 7),
        QuasiRandom({**SPREADS, "a": Spread("linear", 2.0, 7.0)}, 10, 7),
        LISTED,
        Listed({**LISTED.columns, "a": LISTED.columns["a"] + 1}, "points.csv"),
    ]
    assert len({str(design.described()) for design in described}) == len(described)
    # what a list is called decides no bit
    assert Listed(LISTED.columns, "other.csv").described() == LISTED.described()


def test_shares_of_zero_and_one_stay_finite() -> None:
    values = SPREADS["c"].of(np.array([0.0, 1.0]))
    assert np.all(np.isfinite(values))
