"""What a sweep shows as a whole: against numpy and pandas over all conditions at once."""

from __future__ import annotations

from functools import partial
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from sweeps import CASE, campaign_in

from meanfree.campaigns.bins import bins_of
from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.counted import Grouped, classes, middle
from meanfree.campaigns.digest import LEVELS, digest_of
from meanfree.campaigns.local import on_cores
from meanfree.campaigns.reading import arrow_parts, part_files, read_sweep
from meanfree.campaigns.store import opened
from meanfree.campaigns.sweeping import fill
from meanfree.case import load_case
from meanfree.case.sweeps import campaign_of

HALF_A_CLASS = 5.01e-4
"""Classes are a thousandth of a factor of e wide."""


def frame_of(folder: Path, campaign: Campaign) -> pd.DataFrame:
    with opened(folder / "sweep", campaign, replace=False) as store:
        fill(store, partial(on_cores, workers=1))
    return read_sweep(folder / "sweep")


def test_classes_keep_size_and_sign() -> None:
    rng = np.random.default_rng(2)
    values = rng.choice([-1.0, 1.0], 5000) * 10.0 ** rng.uniform(-300, 300, 5000)
    np.testing.assert_allclose(middle(classes(values)), values, rtol=HALF_A_CLASS)
    assert middle(classes(np.array([0.0, -0.0]))).tolist() == [0.0, 0.0]
    ordered = np.sort(values)
    assert np.all(np.diff(classes(ordered)) >= 0)


def test_quantiles_of_groups() -> None:
    rng = np.random.default_rng(3)
    group, values = rng.integers(0, 5, 40_000), rng.normal(1.0, 3.0, 40_000)
    values[::97] = np.nan
    whole = Grouped(6)
    for start in range(0, 40_000, 7_000):
        whole.add(group[start : start + 7_000], values[start : start + 7_000])
    found = whole.quantiles(LEVELS)
    assert np.all(np.isnan(found[:, 5]))
    for g in range(5):
        own = values[(group == g) & np.isfinite(values)]
        expected = np.quantile(own, LEVELS, method="inverted_cdf")
        np.testing.assert_allclose(found[:, g], expected, rtol=HALF_A_CLASS)


def test_counts_do_not_grow_with_the_number_of_values() -> None:
    rng, whole = np.random.default_rng(4), Grouped(1)
    sizes = []
    for _ in range(20):
        whole.add(np.zeros(50_000, np.int64), 10.0 ** rng.uniform(-1, 1, 50_000))
        sizes.append(len(whole.keys))
    # two decades are 4,605 classes
    assert sizes[-1] <= 4607
    assert whole.counts.sum() == 1_000_000


@pytest.mark.parametrize("part", [16, 128])
def test_against_all_conditions_at_once(tmp_path: Path, part: int) -> None:
    campaign = campaign_in(tmp_path, samples=256, part=part)
    frame = frame_of(tmp_path, campaign)
    digest = digest_of(campaign, arrow_parts(part_files(tmp_path / "sweep")))
    assert digest.conditions == 256
    failed = frame["X_A"].isna()
    assert digest.failed == failed.sum() == len(digest.failures)
    assert [entry["index"] for entry in digest.failures] == frame["index"][failed].tolist()
    assert digest.endings == frame["ending"].value_counts().loc[lambda n: n > 0].to_dict()
    for spread in digest.spreads:
        column = frame[spread.column].dropna()
        assert (spread.reached, spread.least, spread.most) == (
            *(len(column), column.min(), column.max()),
        )
        expected = np.quantile(column, LEVELS, method="inverted_cdf")
        found = [spread.low, spread.median, spread.high]
        np.testing.assert_allclose(found, expected, rtol=HALF_A_CLASS)
    curve = digest.curves[0]
    name = campaign.columns.conditions[curve.address]
    medians = frame.groupby(curve.bins.of(frame[name].to_numpy()))[curve.column].agg(
        lambda own: np.quantile(own.dropna(), 0.5, method="inverted_cdf")
    )
    np.testing.assert_allclose(curve.quantiles[1], medians, rtol=HALF_A_CLASS)


def test_bins_hold_equal_shares_of_the_design(tmp_path: Path) -> None:
    campaign = campaign_in(tmp_path, samples=1024, part=1024)
    rows = campaign.design.rows(0, 1024)
    for address in campaign.design.addresses:
        counts = np.bincount(bins_of(campaign, address, 16).of(rows[address]), minlength=16)
        # a Sobol sequence has exactly as many points in each sixteenth; a value at an edge may
        # fall to either side by rounding
        assert np.all(np.abs(counts - 64) <= 1)


def test_a_map_of_a_grid_has_its_values(tmp_path: Path) -> None:
    sweep = (
        '\n[sweep]\nobservables = ["conversion of A"]\n[sweep.vary]\n'
        '"temperature.value" = { values = ["480 K", "510 K", "490 K"] }\n'
        '"steps.two.k" = { between = ["1 L/mol/s", "4 L/mol/s"], points = 3, spacing = "log" }\n'
    )
    (tmp_path / "case.toml").write_text(CASE + sweep)
    campaign = campaign_of(load_case(tmp_path / "case.toml"))
    frame = frame_of(tmp_path, campaign)
    (found,) = digest_of(campaign, arrow_parts(part_files(tmp_path / "sweep"))).maps
    assert found.bins[0].centres.tolist() == [480.0, 490.0, 510.0]
    np.testing.assert_allclose(found.bins[1].centres, [1.0, 2.0, 4.0], rtol=1e-14)
    assert (found.bins[0].logarithmic, found.bins[1].logarithmic) == (False, True)
    table = frame.pivot_table(
        index="steps.two.k_L_per_mol_per_s", columns="temperature.value_K", values="X_A"
    )
    np.testing.assert_allclose(found.median, table, rtol=HALF_A_CLASS)
