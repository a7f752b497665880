"""Distributions in memory that stays small: counts of rounded values, apart for each group.

A value falls into a class that is 0.1 % wide, so quantiles are good to half of that, whatever the
number of values.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from meanfree.campaigns.designs import Floats

Longs = NDArray[np.int64]

CLASSES = 1000.0
"""Classes for each factor of e."""

_ZERO = 0
_OFFSET = 2_000_000
_SPAN = 2 * _OFFSET + 1


def classes(values: Floats) -> Longs:
    """The class of each value: the rounded logarithm of its size, negative for negative values."""
    size = np.abs(values)
    with np.errstate(divide="ignore"):
        rounded = np.rint(CLASSES * np.log(size))
    code = np.where(size > 0, rounded + _OFFSET / 2, 0.0)
    return np.asarray(np.where(values < 0, -code, code), np.int64)


def middle(code: Longs) -> Floats:
    """The value in the middle of a class."""
    size = np.exp((np.abs(code) - _OFFSET / 2) / CLASSES)
    return np.asarray(np.where(code == _ZERO, 0.0, np.sign(code) * size), float)


@dataclass
class Grouped:
    """Counts of classes of values, apart for each group (a bin of a curve, a cell of a map)."""

    groups: int
    keys: Longs = field(default_factory=lambda: np.empty(0, np.int64))
    counts: Longs = field(default_factory=lambda: np.empty(0, np.int64))

    def add(self, group: Longs, values: Floats) -> None:
        """Count values; those that are not finite are left out."""
        good = np.isfinite(values)
        keys = group[good] * _SPAN + classes(values[good]) + _OFFSET
        new, times = np.unique(keys, return_counts=True)
        # Most classes are there from earlier parts: only the others need room.
        place: Longs = np.atleast_1d(np.searchsorted(self.keys, new))
        there = np.zeros(len(new), bool)
        inside = place < len(self.keys)
        there[inside] = self.keys[place[inside]] == new[inside]
        self.counts[place[there]] += times[there]
        self.keys = np.insert(self.keys, place[~there], new[~there])
        self.counts = np.insert(self.counts, place[~there], times[~there])

    def quantiles(self, levels: Sequence[float]) -> Floats:
        """Quantiles of each group [shape (n_levels, n_groups)], NaN where it is empty."""
        found = np.full((len(levels), self.groups), np.nan)
        group = self.keys // _SPAN
        value = middle(self.keys % _SPAN - _OFFSET)
        edges = np.searchsorted(group, np.arange(self.groups + 1))
        for g in range(self.groups):
            first, last = edges[g], edges[g + 1]
            if first == last:
                continue
            running = np.cumsum(self.counts[first:last])
            for place, level in enumerate(levels):
                at = np.searchsorted(running, level * running[-1], side="left")
                found[place, g] = value[first + min(int(at), last - first - 1)]
        return found
