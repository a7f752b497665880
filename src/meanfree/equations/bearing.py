"""What must come to rest before a gas can: the gases that bear on it, and the steps behind them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import System

NOISE = 1e-3
"""Net over both ways of a reversible step below which it counts as balanced."""


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


@dataclass(frozen=True)
class Turnover:
    """A step with its reverse (-1: one-way): what going forwards takes, and going backwards.

    ``left`` and ``right`` are gases with how many of them a net event takes.
    """

    step: int
    reverse: int
    left: tuple[tuple[int, float], ...]
    right: tuple[tuple[int, float], ...]


def turnovers(system: System, bearing: Sequence[int]) -> list[Turnover]:
    """Steps that may still have to act when everything seems to rest.

    Of the steps that change a gas that must rest, unless one alone does: then rest is rest.
    """
    back = dict(zip(system.reverses.forward.tolist(), system.reverses.step.tolist(), strict=True))
    reverses, found = set(back.values()), []
    for j in range(system.n_steps):
        net = system.net.row(j)
        if j in reverses or not any(gas in bearing for gas, _ in net):
            continue
        left = tuple((gas, -number) for gas, number in net if number < 0)
        right = tuple((gas, number) for gas, number in net if number > 0)
        found.append(Turnover(j, back.get(j, -1), left, right))
    return found if len(found) > 1 else []
