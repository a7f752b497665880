"""How the values of one address are put together for curves and maps: by the design alone."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.counted import Longs
from meanfree.campaigns.designs import Floats, Grid, QuasiRandom

MOST_LEVELS = 64
"""A grid has a bin for each of its values, up to so many."""


@dataclass(frozen=True)
class Bins:
    """How the values of one address are put together: ``centres`` [unit of the case]."""

    edges: Floats
    centres: Floats
    logarithmic: bool

    def of(self, values: Floats) -> Longs:
        """The bin of each value."""
        return np.asarray(np.searchsorted(self.edges, values, side="right"), np.int64)


def bins_of(campaign: Campaign, address: str, most: int) -> Bins:
    """The bins of an address, by its design alone."""
    design = campaign.design
    if isinstance(design, Grid):
        values = np.unique(design.values[address])
        if len(values) > MOST_LEVELS:
            values = values[np.linspace(0, len(values) - 1, most).round().astype(int)]
        ratios = values[1:] / values[:-1] if np.all(values > 0) else np.array([1.0])
        even = len(ratios) > 1 and np.ptp(ratios) < 1e-6 * ratios.mean()
        edges = np.sqrt(values[1:] * values[:-1]) if even else (values[1:] + values[:-1]) / 2
        return Bins(edges, values, bool(even))
    if isinstance(design, QuasiRandom):
        spread = design.spreads[address]
        shares = np.arange(1, 2 * most) / (2 * most)
        places = spread.of(shares)
        return Bins(places[1::2], places[::2], spread.spacing == "log")
    column = design.rows(0, design.count)[address]
    steps = np.linspace(column.min(), column.max(), 2 * most + 1)[1:-1]
    if column.min() == column.max():
        return Bins(np.empty(0), column[:1], False)
    return Bins(steps[1::2], steps[::2], False)
