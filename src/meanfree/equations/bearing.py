"""Which gases bear on one of them: what must come to rest before it can."""

from __future__ import annotations

import numpy as np

from meanfree.equations.system import System


def bearing_on(system: System, watched: int) -> list[int]:
    """Gases whose amounts bear on the watched one, itself among them.

    Where gas flows in, a product can pile up for ever while the watched gas has long come to
    rest; what no rate on the way to the watched gas depends on need not rest with it.
    """
    from meanfree.equations.templates import depends_on

    everything = list(range(system.n_gases))
    if not len(system.open_steps) or system.volume_varies or system.temperature_varies:
        return everything
    of_all = set(np.flatnonzero(system.bath >= 0).tolist())
    for block in system.blocks:
        if depends_on(block.law) - {"T"}:
            of_all.update(block.steps.tolist())
    of_all.update(
        int(j)
        for j, forward in zip(system.reverses.step, system.reverses.forward, strict=True)
        if int(forward) in of_all
    )
    bearing, pending = {watched}, [watched]
    changed_by: dict[int, list[int]] = {}
    for j, gas in zip(system.net.owner.tolist(), system.net.column.tolist(), strict=True):
        changed_by.setdefault(gas, []).append(j)
    while pending:
        for j in changed_by.get(pending.pop(), ()):
            if j in of_all:
                return everything
            needed = {gas for gas, _ in (*system.orders.row(j), *system.guards.row(j))}
            pending.extend(needed - bearing)
            bearing |= needed
    return sorted(bearing)
