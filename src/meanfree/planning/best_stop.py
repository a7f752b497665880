"""When to stop for the most of an intermediate."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.integrate.run import Run

NOTICEABLE = 1e-3
"""A gas counts as an intermediate where it ends at least this share below its most."""


@dataclass(frozen=True)
class Peak:
    """The most there is of one gas: at ``time`` [s] an ``amount`` [mol]; at the end ``end``."""

    gas: str
    time: float
    amount: float
    end: float


def peaks(run: Run) -> list[Peak]:
    """Every gas that rises and falls again within a run, in the order of the case."""
    found = []
    for gas in run.system.gases:
        peak = peak_of(run, gas)
        if peak is not None and peak.end < peak.amount * (1 - NOTICEABLE):
            found.append(peak)
    return found


def peak_of(run: Run, gas: str) -> Peak | None:
    """The inner maximum of a gas, as a root of its net rate of formation; None without one."""
    from scipy.optimize import brentq

    i = run.index(gas)
    grid = run.trajectory.fine_times
    amounts = run.amounts(grid)[i]
    at = int(np.argmax(amounts))
    if not 0 < at < len(grid) - 1:
        return None
    numbers = np.zeros(run.system.n_steps)
    net = run.system.net
    for j in range(run.system.n_steps):
        numbers[j] = dict(net.row(j)).get(i, 0.0)

    def forming(t: float) -> float:
        return float(numbers @ run.rates(t)[:, 0])

    low, high = float(grid[at - 1]), float(grid[at + 1])
    if not forming(low) > 0 > forming(high):
        return None  # a break: a lamp, a sample, a corner of the temperature program
    time = float(brentq(forming, low, high, xtol=1e-300, rtol=8.9e-16))
    return Peak(gas, time, float(run.amounts(time)[i, 0]), float(amounts[-1]))
