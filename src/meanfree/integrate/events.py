"""Times at which something happens, as roots of the dense output."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.optimize import brentq

from meanfree.equations.system import Floats
from meanfree.integrate.trajectory import Trajectory

REACHED = 1e-13
"""A level that the end of a run misses by this fraction of it, rounding, was reached there."""

Quantity = Callable[[Floats], Floats]
"""A quantity as a function of times [shape (n_times,)]."""


def crossings(
    trajectory: Trajectory, quantity: Quantity, level: float, first_only: bool = False
) -> list[float]:
    """Times [s] at which ``quantity`` crosses ``level``, in order.

    A jump over the level at a break counts as a crossing at the break.
    """
    grid = trajectory.fine_times
    difference = quantity(grid) - level
    found: list[float] = []
    if difference[0] == 0:
        found.append(float(grid[0]))
    signs = np.sign(difference)
    for i in np.flatnonzero((signs[:-1] != signs[1:]) & (signs[:-1] != 0)):
        found.append(_root(quantity, level, float(grid[i]), float(grid[i + 1])))
        if first_only:
            break
    # A run that was ended because it came to a level ends there, not one rounding before it.
    missed = abs(float(difference[-1]))
    if not found and len(grid) > 1 and 0 < missed <= REACHED * abs(level):
        found.append(float(grid[-1]))
    return found


def _root(quantity: Quantity, level: float, a: float, b: float) -> float:
    def difference(t: float) -> float:
        return float(quantity(np.array([t]))[0]) - level

    if difference(b) == 0:
        return b
    return float(brentq(difference, a, b, xtol=1e-300, rtol=8.9e-16))


def first_crossing(trajectory: Trajectory, quantity: Quantity, level: float) -> float | None:
    """The first time [s] at which ``quantity`` reaches ``level``, None if it never does."""
    found = crossings(trajectory, quantity, level, first_only=True)
    return found[0] if found else None


def last_crossing(trajectory: Trajectory, quantity: Quantity, level: float) -> float | None:
    """The last time [s] at which ``quantity`` crosses ``level``, None if it never does."""
    found = crossings(trajectory, quantity, level)
    return found[-1] if found else None
