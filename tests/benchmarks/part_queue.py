"""What a sweep of 1e9 conditions on a cluster needs, by simulation of the queue of parts.

``python tests/benchmarks/part_queue.py [CASE]`` measures here how long a part takes to compute, to
pass to another process and to bring to the disk, then plays the queue: workers compute parts, one
process takes them in one after the other, and hands out the next. Nothing else is assumed; the
network and the disk of a cluster are given with --megabytes-per-second.
"""

from __future__ import annotations

import argparse
import heapq
import pickle
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from meanfree.campaigns.part import compute_part
from meanfree.campaigns.store import opened
from meanfree.case import load_case
from meanfree.case.sweeps import campaign_of

SWEEP = {
    "design": "quasi-random",
    "samples": 2**22,
    "vary": {
        "temperature.value": {"between": ["440 K", "520 K"]},
        "fill.gases.NOCl": {"between": ["10 torr", "200 torr"], "spacing": "log"},
    },
}
AHEAD = 2
HANDING_OUT = 1e-3
"""Seconds that the scheduler spends on a part. Assumed; no source."""


@dataclass(frozen=True)
class Played:
    """What came of a simulated sweep: times in s, the longest line of finished parts."""

    makespan: float
    busy_workers: float
    busy_taker: float
    longest_line: int


def play(parts: int, workers: int, computing: float, spread: float, taking: float) -> Played:
    """Let ``workers`` compute ``parts``, which one process takes in, ``taking`` [s] each.

    Computing takes ``computing`` [s] on average, log-normal with standard deviation ``spread`` of
    its logarithm. Up to `AHEAD` parts a worker are handed out before they are taken in.
    """
    rng = np.random.default_rng(1)
    times = computing * np.exp(spread * rng.standard_normal(parts) - spread**2 / 2)
    ahead = AHEAD * workers
    free = [0.0] * workers
    heapq.heapify(free)
    finished: list[float] = []
    taker, worked, line, longest = 0.0, 0.0, [], 0
    handed = 0
    while handed < min(ahead, parts):
        _begin(free, finished, times[handed], 0.0)
        handed += 1
    for _ in range(parts):
        done = heapq.heappop(finished)
        line = [t for t in line if t > done]
        start = max(taker, done)
        taker = start + taking
        worked += taking
        line.append(taker)
        longest = max(longest, len(line))
        if handed < parts:
            _begin(free, finished, times[handed], taker)
            handed += 1
    return Played(taker, float(times.sum()) / (workers * taker), worked / taker, longest)


def _begin(free: list[float], finished: list[float], takes: float, not_before: float) -> None:
    end = max(heapq.heappop(free), not_before) + takes
    heapq.heappush(free, end)
    heapq.heappush(finished, end)


def measured(case: Path) -> tuple[float, float, int, int]:
    """Seconds to compute a part and to keep it, its bytes, its conditions."""
    campaign = campaign_of(load_case(case), SWEEP)
    compute_part(campaign, 0)
    begun = time.process_time()
    part = compute_part(campaign, 1)
    computing = time.process_time() - begun
    with (
        tempfile.TemporaryDirectory(dir=Path.cwd()) as folder,
        opened(Path(folder) / "sweep", campaign, replace=False) as store,
    ):
        begun = time.perf_counter()
        for _ in range(5):
            store.keep(pickle.loads(pickle.dumps(part)))
        keeping = (time.perf_counter() - begun) / 5
    return computing, keeping, len(part.content), campaign.part_size


def main() -> None:
    """Measure, play, print."""
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("case", nargs="?", default="cases/nocl-bulb.toml", type=Path)
    options.add_argument("--conditions", type=float, default=1e9)
    options.add_argument("--megabytes-per-second", type=float, default=None)
    asked = options.parse_args()
    computing, keeping, size, conditions = measured(asked.case)
    parts = int(-(-asked.conditions // conditions))
    if asked.megabytes_per_second is not None:
        keeping = size / (1e6 * asked.megabytes_per_second)
    taking = keeping + HANDING_OUT
    print(f"a part: {conditions} conditions, {computing:.2f} s, {size / 1e6:.2f} MB")
    print(f"taking one in: {1e3 * taking:.1f} ms; saturated by {computing / taking:.0f} workers")
    print(f"{asked.conditions:.3g} conditions: {parts} parts, {parts * size / 1e9:.1f} GB")
    print(
        f"{'workers':>8} {'hours':>8} {'workers busy':>13} {'taker busy':>11} {'longest line':>13}"
    )
    for workers in (2, 10, 30, 100, 300, 1000):
        found = play(parts, workers, computing, 0.2, taking)
        print(
            f"{workers:8d} {found.makespan / 3600:8.3f} {found.busy_workers:13.0%} "
            f"{found.busy_taker:11.0%} {found.longest_line:13d}"
        )


if __name__ == "__main__":
    main()
