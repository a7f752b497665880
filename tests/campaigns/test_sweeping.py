"""Parts on disk: the same bytes however they come about, failures kept, nothing half-written."""

from __future__ import annotations

import errno
import os
import resource
from collections.abc import Iterator, Sequence
from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np
import pytest
from sweeps import campaign_in, contents, write_case

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.local import on_cores
from meanfree.campaigns.part import Part, compute_part
from meanfree.campaigns.reading import read_sweep, read_sweep_parts
from meanfree.campaigns.store import Store, opened, part_name
from meanfree.campaigns.sweeping import fill
from meanfree.case import load_case
from meanfree.case.sweeps import campaign_of
from meanfree.errors import ComputationError, InputError
from meanfree.integrate.many import many
from meanfree.integrate.observables import EndTime

HERE = partial(on_cores, workers=1)


@pytest.fixture
def campaign(tmp_path: Path) -> Campaign:
    return campaign_in(tmp_path)


def filled(folder: Path, campaign: Campaign) -> Path:
    with opened(folder / "sweep", campaign, replace=False) as store:
        fill(store, HERE)
        return store.folder


def stops_after(count: int, campaign: Campaign, numbers: Sequence[int]) -> Iterator[Part]:
    for done, number in enumerate(numbers):
        if done == count:
            raise KeyboardInterrupt
        yield compute_part(campaign, number)


def test_what_stands_in_the_parts(tmp_path: Path, campaign: Campaign) -> None:
    frame = read_sweep(filled(tmp_path, campaign))
    assert list(frame.columns) == [
        "index",
        "temperature.value_K",
        "fill.gases.A_torr",
        "steps.one.A_per_s",
        "half_life_A_1_s",
        "X_A",
        "peak_time_B_s",
        "peak_amount_B_mol",
        "p_total_at_100_s_Pa",
        "ending",
    ]
    assert frame["index"].tolist() == list(range(128))
    rows = campaign.design.rows(0, 128)
    for address, column in campaign.columns.conditions.items():
        np.testing.assert_array_equal(frame[column], rows[address])
    # against the integration of all conditions at once: what differs is the last bits of the
    # numbers of each condition; where that changes a step, results differ by the error of a step,
    # which is held to rtol, 1e-8
    alone = many(campaign.experiment, rows, campaign.observables, workers=1)
    for column in campaign.columns.observables:
        np.testing.assert_allclose(frame[column], alone[column], rtol=1e-8, atol=0)


def test_a_part_alone_has_the_same_bytes(tmp_path: Path, campaign: Campaign) -> None:
    folder = filled(tmp_path, campaign)
    for number in (7, 2):
        assert (folder / part_name(number)).read_bytes() == compute_part(campaign, number).content


@pytest.mark.parametrize("after", [0, 1, 5, 7])
def test_interrupted_and_resumed(tmp_path: Path, campaign: Campaign, after: int) -> None:
    through = contents(filled(tmp_path / "through", campaign))
    target = tmp_path / "stopped" / "sweep"
    with pytest.raises(KeyboardInterrupt), opened(target, campaign, replace=False) as store:
        fill(store, partial(stops_after, after))
    with opened(target, campaign, replace=False) as store:
        assert len(store.finished) == after
        (store.folder / f".{part_name(after)}").write_bytes(b"half a part")
    with opened(target, campaign, replace=False) as store:
        fill(store, HERE)
    assert contents(store.folder) == through


def test_a_spoilt_part_is_made_again(tmp_path: Path, campaign: Campaign) -> None:
    folder = filled(tmp_path, campaign)
    before = contents(folder)
    whole = (folder / part_name(3)).read_bytes()
    (folder / part_name(3)).write_bytes(whole[:-40])
    (folder / part_name(4)).write_bytes((folder / part_name(5)).read_bytes())
    with opened(tmp_path / "sweep", campaign, replace=False) as store:
        assert store.missing == [3, 4]
        fill(store, HERE)
    assert contents(folder) == before


def test_progress_counts_what_was_there(tmp_path: Path, campaign: Campaign) -> None:
    target, seen = tmp_path / "sweep", []
    with pytest.raises(KeyboardInterrupt), opened(target, campaign, replace=False) as store:
        fill(store, partial(stops_after, 3))
    with opened(target, campaign, replace=False) as store:
        fill(store, HERE, lambda done, total, note="": seen.append((done, total)))
    assert seen == [(16 * n, 128) for n in range(3, 9)]


def other_campaigns(folder: Path, campaign: Campaign) -> dict[str, Campaign]:
    case = folder / "case.toml"
    hotter = load_case(case, {"vessel.volume": "3 L"})
    return {
        "the case differs": campaign_of(hotter),
        "the conditions differ": campaign_of(load_case(case), {"seed": 4}),
        "the observables differ": replace(campaign, observables=(EndTime(),)),
        "the size of a part differs": replace(campaign, part_size=32),
    }


@pytest.mark.parametrize(
    "words",
    [
        "the case differs",
        "the conditions differ",
        "the observables differ",
        "the size of a part differs",
    ],
)
def test_another_sweep_is_not_taken_up(tmp_path: Path, campaign: Campaign, words: str) -> None:
    filled(tmp_path, campaign)
    other = other_campaigns(tmp_path, campaign)[words]
    with (
        pytest.raises(InputError) as raised,
        opened(tmp_path / "sweep", other, replace=False),
    ):
        pass
    (problem,) = raised.value.problems
    folder = tmp_path / "sweep.unfinished"
    assert problem.found == (
        f"{folder}, which holds an unfinished sweep that cannot be taken up: {words}"
    )
    assert problem.expected == (
        "the same case, conditions and observables as before, --replace to give those parts up "
        "and start anew, or another folder named with --out"
    )
    with opened(tmp_path / "sweep", other, replace=True) as store:
        assert not store.finished
        assert not list(folder.glob("part-*"))


def test_title_and_other_tables_do_not_count(tmp_path: Path, campaign: Campaign) -> None:
    path = tmp_path / "case.toml"
    text = path.read_text().replace("Dimerisation", "Another title")
    path.write_text(text + '\n[plan]\npatience = "1 h"\n')
    assert campaign_of(load_case(path)).hash == campaign.hash


def test_a_folder_of_something_else_is_left_alone(tmp_path: Path, campaign: Campaign) -> None:
    folder = tmp_path / "sweep.unfinished"
    folder.mkdir()
    (folder / "thesis.txt").write_text("mine")
    for replaced in (False, True):
        with (
            pytest.raises(InputError, match="something other than an unfinished sweep"),
            opened(tmp_path / "sweep", campaign, replace=replaced),
        ):
            pass
    assert (folder / "thesis.txt").read_text() == "mine"


def test_two_at_once_are_refused(tmp_path: Path, campaign: Campaign) -> None:
    with (
        opened(tmp_path / "sweep", campaign, replace=False),
        pytest.raises(ComputationError, match="Another process has been writing"),
        opened(tmp_path / "sweep", campaign, replace=False),
    ):
        pass


def test_impossible_conditions_are_counted_and_kept(tmp_path: Path) -> None:
    """A normal spread of 15 torr about 5 torr goes below zero in 37 % of its points."""
    path = write_case(tmp_path)
    path.write_text(path.read_text().replace('mean = "40 torr"', 'mean = "5 torr"'))
    campaign = campaign_of(load_case(path))
    frame = read_sweep(filled(tmp_path, campaign))
    bad = frame["fill.gases.A_torr"] < 0
    assert bad.sum() == pytest.approx(0.369 * 128, abs=1.5)
    reasons = set(frame["ending"][bad])
    assert len(reasons) == 1
    assert reasons.pop().startswith("fill.gases.A is not a number ")
    assert set(frame["ending"][~bad]) == {"reached the stated time"}
    assert frame["X_A"][bad].isna().all()
    assert frame["X_A"][~bad].notna().all()


def test_part_by_part_and_some_columns(tmp_path: Path, campaign: Campaign) -> None:
    folder = filled(tmp_path, campaign)
    parts = list(read_sweep_parts(folder, ["index", "X_A"]))
    assert [len(part) for part in parts] == [16] * 8
    assert list(parts[0].columns) == ["index", "X_A"]
    with pytest.raises(InputError, match="columns: found 'X_Z'; expected some of index, temp"):
        read_sweep(folder, ["X_Z"])
    with pytest.raises(InputError, match="found no sweep; expected a folder that meanfree sweep"):
        read_sweep(tmp_path / "nowhere")


def test_a_full_disk_keeps_what_is_finished(tmp_path: Path, campaign: Campaign) -> None:
    """A limit on the size of files refuses a part as a full disk does (EFBIG beside ENOSPC)."""
    through = contents(filled(tmp_path / "through", campaign))
    target = tmp_path / "full" / "sweep"
    before = resource.getrlimit(resource.RLIMIT_FSIZE)

    def fills_up(campaign: Campaign, numbers: Sequence[int]) -> Iterator[Part]:
        for number in numbers:
            part = compute_part(campaign, number)
            if number == 2:
                resource.setrlimit(resource.RLIMIT_FSIZE, (1000, before[1]))
            yield part

    try:
        with (
            pytest.raises(ComputationError) as raised,
            opened(target, campaign, replace=False) as store,
        ):
            fill(store, fills_up)
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, before)
    folder = target.parent / "sweep.unfinished"
    assert str(raised.value) == (
        f"There is no room left in {folder} ({os.strerror(errno.EFBIG)}). 2 of 8 parts are kept "
        "there. Free some space and give the same command again: it goes on from there."
    )
    assert sorted(path.name for path in folder.iterdir()) == [
        *(part_name(0), part_name(1), "sweep.json"),
    ]
    assert contents(filled(tmp_path / "full", campaign)) == through


def test_room_is_asked_for_beforehand(
    tmp_path: Path, campaign: Campaign, monkeypatch: pytest.MonkeyPatch
) -> None:
    class Usage:
        free = 1_000_000

    monkeypatch.setattr("meanfree.campaigns.store.shutil.disk_usage", lambda _: Usage)
    with (
        pytest.raises(ComputationError, match=r"33\.6 MB are needed, 1 MB are free.\. 0 of 8"),
        opened(tmp_path / "sweep", campaign, replace=False) as store,
    ):
        fill(store, HERE)


def test_other_versions_are_refused_where_a_part_is_made(campaign: Campaign) -> None:
    assert campaign.identity["made_by"]
    campaign.__dict__["identity"] = {**campaign.identity, "made_by": "meanfree 0.0.0"}
    with pytest.raises(ComputationError, match=r"planned with meanfree 0\.0\.0\. Install the same"):
        compute_part(campaign, 0)


def test_the_store_holds_nothing_else(tmp_path: Path, campaign: Campaign) -> None:
    folder = filled(tmp_path, campaign)
    assert sorted(path.name for path in folder.iterdir()) == [
        *(part_name(number) for number in range(8)),
        "sweep.json",
    ]
    assert not list(tmp_path.glob(".*"))
    assert isinstance(Store(folder, campaign).missing, list)
