"""Where parts are computed decides no bit: this process, others here, workers of a cluster."""

from __future__ import annotations

import os
import signal
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from sweeps import campaign_in

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.cluster import on_cluster
from meanfree.campaigns.local import TRIES, on_cores
from meanfree.campaigns.part import Part, compute_part
from meanfree.errors import ComputationError, InputError


def by_number(parts: Iterator[Part]) -> dict[int, bytes]:
    return {part.number: part.content for part in parts}


@pytest.fixture
def campaign(tmp_path: Path) -> Campaign:
    return campaign_in(tmp_path, samples=128, part=16)


@pytest.fixture
def here(campaign: Campaign) -> dict[int, bytes]:
    return by_number(on_cores(campaign, range(campaign.parts), 1))


def children() -> list[int]:
    """Processes that this one started."""
    own = os.getpid()
    return [int(n) for n in Path(f"/proc/{own}/task/{own}/children").read_text().split()]


needs_proc = pytest.mark.skipif(
    not Path(f"/proc/{os.getpid()}/task/{os.getpid()}/children").exists(),
    reason="processes are found through /proc",
)


@pytest.mark.slow
def test_processes(campaign: Campaign, here: dict[int, bytes]) -> None:
    assert by_number(on_cores(campaign, range(campaign.parts), 2)) == here


@pytest.mark.slow
@needs_proc
def test_killed_workers_cost_their_part_only(campaign: Campaign, here: dict[int, bytes]) -> None:
    """A worker is killed after the first and after the third part; all parts come all the same."""
    before, found = set(children()), {}
    for part in on_cores(campaign, range(campaign.parts), 2):
        found[part.number] = part.content
        if len(found) in (1, 3):
            os.kill((set(children()) - before).pop(), signal.SIGKILL)
    assert found == here
    # the tracker of shared memory, which Python keeps, is no worker of ours
    assert len(set(children()) - before) <= 1


def test_a_part_that_fails_is_told(campaign: Campaign, monkeypatch: pytest.MonkeyPatch) -> None:
    from meanfree.campaigns import local

    class Gone:
        """A worker that dies at every part."""

        def __init__(self, campaign: Campaign) -> None:
            self.at: int | None = None
            self.pipe, self.process = object(), self
            self.sentinel = object()
            self.is_lost = False

        def is_alive(self) -> bool:
            return False

        def begin(self, number: int) -> None:
            self.at = number

        def answer(self) -> None:
            return None

        def end(self) -> None: ...

    monkeypatch.setattr(local, "_Worker", Gone)
    monkeypatch.setattr(local, "wait", lambda things: things)
    with pytest.raises(ComputationError, match=rf"Workers died {TRIES} times at part \d\. Perhaps"):
        list(on_cores(campaign, range(campaign.parts), 2))


def test_an_error_of_a_worker_comes_in_words(campaign: Campaign) -> None:
    from meanfree.campaigns.local import _tried

    # no part has that number; the words after the colon are numpy's
    assert str(_tried(campaign, -1)).startswith("OverflowError: ")
    assert isinstance(_tried(campaign, 0), Part)


@contextmanager
def cluster(workers: int) -> Iterator[object]:
    distributed = pytest.importorskip("distributed", reason="the extra cluster is not installed")
    with distributed.LocalCluster(
        n_workers=workers, threads_per_worker=1, dashboard_address=None, processes=True
    ) as running:
        yield running


# whatever Dask itself warns of is not ours to mend
@pytest.mark.filterwarnings("default")
@pytest.mark.slow
def test_a_cluster_gives_the_same_bytes(campaign: Campaign, here: dict[int, bytes]) -> None:
    with cluster(2) as running:
        address = running.scheduler_address  # type: ignore[attr-defined]
        assert by_number(on_cluster(campaign, range(campaign.parts), address)) == here


@pytest.mark.filterwarnings("default")
@pytest.mark.slow
def test_a_lost_worker_of_a_cluster(campaign: Campaign, here: dict[int, bytes], size: str) -> None:
    """Workers are killed while parts are under way: the nanny starts others, nothing is lost."""
    kills = 1 if size == "small" else 5
    with cluster(2) as running:
        address, found = running.scheduler_address, {}  # type: ignore[attr-defined]
        for part in on_cluster(campaign, range(campaign.parts), address):
            found[part.number] = part.content
            if len(found) <= kills:
                nanny = running.workers[len(found) % 2]  # type: ignore[attr-defined]
                if nanny.pid:
                    os.kill(nanny.pid, signal.SIGKILL)
        assert found == here


def test_no_scheduler_there(campaign: Campaign, monkeypatch: pytest.MonkeyPatch) -> None:
    pytest.importorskip("distributed", reason="the extra cluster is not installed")
    monkeypatch.setattr("meanfree.campaigns.cluster.PATIENCE_S", 0.5)
    with pytest.raises(InputError) as raised:
        list(on_cluster(campaign, [0], "tcp://127.0.0.1:9"))
    (problem,) = raised.value.problems
    assert problem.found == "tcp://127.0.0.1:9, where no scheduler answers"


def test_without_dask(campaign: Campaign, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(__import__("sys").modules, "distributed", None)
    with pytest.raises(InputError) as raised:
        list(on_cluster(campaign, [0], "tcp://127.0.0.1:9"))
    (problem,) = raised.value.problems
    assert (problem.found, problem.expected) == (
        "dask, which is not installed",
        "pip install 'meanfree[cluster]'",
    )


def test_the_number_of_the_part_decides_its_content(campaign: Campaign) -> None:
    assert compute_part(campaign, 0).content != compute_part(campaign, 1).content
