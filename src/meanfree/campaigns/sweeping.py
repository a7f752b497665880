"""A sweep from its first missing part to its last: engine, disk, progress."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.part import Part
from meanfree.campaigns.store import Store
from meanfree.progress import Progress, silent

Engine = Callable[[Campaign, Sequence[int]], Iterator[Part]]
"""Computes parts of a campaign by their numbers, in any order."""


def fill(store: Store, engine: Engine, progress: Progress = silent) -> None:
    """Make every missing part and keep it.

    Raises `ComputationError` for a full disk or a part that fails; what is finished is kept.
    """
    store.refuse_if_no_room()
    campaign, missing = store.campaign, store.missing
    total = campaign.design.count
    done = total - sum(b - a for a, b in map(campaign.span, missing))
    progress(done, total, "conditions")
    if not missing:
        return
    parts = engine(campaign, missing)
    try:
        for part in parts:
            store.keep(part)
            done += part.rows
            progress(done, total, "conditions")
    finally:
        close = getattr(parts, "close", None)
        if close is not None:
            close()
