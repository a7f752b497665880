"""What a sweep shows as a whole, from its parts one after the other, in memory that stays small."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from meanfree.campaigns.bins import Bins, bins_of
from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.columns import ENDING, INDEX
from meanfree.campaigns.counted import Grouped
from meanfree.campaigns.designs import Floats
from meanfree.kernel.status import Ending

BINS = 24
"""Bins of an address for curves."""

CELLS = 48
"""Bins each way of a map."""

LEVELS = (0.16, 0.5, 0.84)
KEPT_FAILURES = 10_000
"""Failures listed one by one; all are counted, and all stand in the parts."""


@dataclass(frozen=True)
class Spread:
    """One observable over all conditions; None where no run has it."""

    column: str
    reached: int
    least: float | None
    median: float | None
    most: float | None
    low: float | None
    high: float | None


@dataclass(frozen=True)
class Curve:
    """The first observables against one address: quantiles [shape (3, n_bins)] in every bin."""

    address: str
    column: str
    bins: Bins
    quantiles: Floats


@dataclass(frozen=True)
class Map:
    """The median of one observable over two addresses [shape (n_up, n_across)]."""

    across: str
    up: str
    column: str
    bins: tuple[Bins, Bins]
    median: Floats


@dataclass(frozen=True)
class Digest:
    """Everything that the summary, the page and the figures show of a sweep.

    ``ranges``: lowest and highest value of each address, in the unit of the case.
    """

    conditions: int
    failed: int
    endings: dict[str, int]
    failures: list[dict[str, Any]]
    ranges: dict[str, tuple[float, float]]
    spreads: list[Spread]
    curves: list[Curve]
    maps: list[Map]


FIGURED = 2
"""Observables that are drawn."""

MOST_CURVES = 6
"""Addresses that are drawn."""

GOOD = frozenset(ending.sentence for ending in Ending if ending.is_good)


def digest_of(campaign: Campaign, parts: Iterable[Any]) -> Digest:
    """The digest of parts (Arrow tables), in the order in which they come."""
    gathering = _Gathering(campaign)
    for table in parts:
        gathering.add(table)
    return gathering.digest()


Range = tuple[float, float]
_NOTHING = (np.inf, -np.inf)


class _Gathering:
    """What is kept of the parts seen so far."""

    def __init__(self, campaign: Campaign) -> None:
        self.campaign = campaign
        self.names, addresses = campaign.columns.observables, campaign.design.addresses
        self.shown, self.places = self.names[:FIGURED], addresses[:MOST_CURVES]
        flat = len(addresses) == 2
        most = CELLS if flat else BINS
        self.bins = {a: bins_of(campaign, a, most) for a in self.places}
        self.size = [len(self.bins[a].centres) for a in self.places]
        self.whole = {name: Grouped(1) for name in self.names}
        self.curves = {
            (a, n): Grouped(len(self.bins[a].centres)) for n in self.shown for a in self.places
        }
        self.maps = {n: Grouped(self.size[0] * self.size[1]) for n in self.shown if flat}
        self.extremes: dict[str, Range] = {}
        self.ranges: dict[str, Range] = {}
        self.reached: Counter[str] = Counter()
        self.endings: Counter[str] = Counter()
        self.failures: list[dict[str, Any]] = []
        self.count = 0

    def add(self, table: Any) -> None:
        """Take in one part."""
        self.count += table.num_rows
        self.endings.update(_counted(table[ENDING].combine_chunks()))
        _note_failures(table, self.failures)
        inside = {}
        for address, name in self.campaign.columns.conditions.items():
            values = table[name].to_numpy()
            self.ranges[address] = _wider(self.ranges.get(address, _NOTHING), values)
            if address in self.places:
                inside[address] = self.bins[address].of(values)
        for name in self.names:
            values = table[name].to_numpy(zero_copy_only=False)
            good = values[np.isfinite(values)]
            self.reached[name] += len(good)
            if len(good):
                self.extremes[name] = _wider(self.extremes.get(name, _NOTHING), good)
            self.whole[name].add(np.zeros(len(values), np.int64), values)
            if name in self.shown:
                self._place(name, inside, values)

    def _place(self, name: str, inside: dict[str, Any], values: Floats) -> None:
        for address in self.places:
            self.curves[address, name].add(inside[address], values)
        if name in self.maps:
            across, up = (inside[address] for address in self.places)
            self.maps[name].add(up * self.size[0] + across, values)

    def digest(self) -> Digest:
        """What they show together."""
        endings = sorted(self.endings.items(), key=lambda entry: (-entry[1], entry[0]))
        return Digest(
            conditions=self.count,
            failed=sum(times for words, times in endings if words not in GOOD),
            endings=dict(endings),
            failures=self.failures,
            ranges=self.ranges,
            spreads=[
                _spread(name, self.reached[name], self.extremes.get(name), self.whole[name])
                for name in self.names
            ],
            curves=[
                Curve(a, n, self.bins[a], grouped.quantiles(LEVELS))
                for (a, n), grouped in self.curves.items()
            ],
            maps=[self._map(name, grouped) for name, grouped in self.maps.items()],
        )

    def _map(self, name: str, grouped: Grouped) -> Map:
        across, up = self.places
        median = grouped.quantiles((0.5,))[0].reshape(self.size[1], self.size[0])
        return Map(across, up, name, (self.bins[across], self.bins[up]), median)


def _wider(before: Range, values: Floats) -> Range:
    return min(before[0], float(values.min())), max(before[1], float(values.max()))


def _counted(words: Any) -> dict[str, int]:
    import pyarrow.compute as pc

    counts = pc.value_counts(words.dictionary_decode()).to_pylist()
    return {entry["values"]: entry["counts"] for entry in counts}


def _note_failures(table: Any, failures: list[dict[str, Any]]) -> None:
    """Add the failed conditions of a part, as far as the list goes."""
    import pyarrow as pa
    import pyarrow.compute as pc

    room = KEPT_FAILURES - len(failures)
    if room <= 0:
        return
    words = table[ENDING].combine_chunks().dictionary_decode()
    bad = pc.invert(pc.is_in(words, value_set=pa.array(sorted(GOOD))))
    if not pc.any(bad).as_py():
        return
    conditions = [INDEX, *(f.name for f in table.schema if f.metadata), ENDING]
    failures += table.select(conditions).filter(bad).slice(0, room).to_pylist()


def _spread(
    name: str, reached: int, extremes: tuple[float, float] | None, whole: Grouped
) -> Spread:
    if extremes is None:
        return Spread(name, 0, None, None, None, None, None)
    low, median, high = (float(np.clip(q, *extremes)) for q in whole.quantiles(LEVELS)[:, 0])
    return Spread(name, reached, extremes[0], median, extremes[1], low, high)
