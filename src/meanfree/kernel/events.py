"""Compiled: levels reached, maxima passed and values on a grid, from the dense output of a step."""

from __future__ import annotations

import numpy as np

from meanfree.kernel.dense import dense_slope, dense_value, of_functional, root, top
from meanfree.kernel.records import (
    GRID,
    LEVEL,
    SLOT,
    WHO,
    Floats,
    Kept,
    Longs,
    Places,
    Request,
    compiled,
)

NEVER = 1e300
"""A level that is never reached, a time that never comes."""

T, H, DUE, THETA = SLOT["t"], SLOT["h"], SLOT["due"], SLOT["theta"]


@compiled
def level_slot(p: Places, f: int) -> int:
    """Where the watching phase looks for the level that comes next, or for the peak so far."""
    return p.alarm + 3 + p.n_dense + (3 + p.n_dense) * f


@compiled
def set_level(p: Places, W: Floats, I: Longs, flags: Longs, levels: Floats, f: int, l: int) -> None:
    """Put the level that comes next into its slot."""
    place, next_one = level_slot(p, f), I[LEVEL + f, l]
    W[place, l] = NEVER
    if next_one < levels.shape[2]:
        level = levels[min(I[WHO, l], len(levels) - 1), f, next_one]
        if not np.isnan(level):
            if flags[f, 1]:
                level *= W[THETA, l]
            W[place, l] = flags[f, 0] * level


@compiled
def set_due(W: Floats, I: Longs, grid: Floats, l: int) -> None:
    """When the next time of the grid comes."""
    W[DUE, l] = NEVER
    if I[GRID, l] < grid.shape[1]:
        W[DUE, l] = grid[min(I[WHO, l], len(grid) - 1), I[GRID, l]]


@compiled
def begin(p: Places, W: Floats, I: Longs, ask: Request, out: Kept, l: int) -> None:
    """Levels, maxima and grid at time zero."""
    c, flags, levels, grid, initial = I[WHO, l], ask.flags, ask.levels, ask.grid, ask.initial
    events, peaks, values = out.events, out.peaks, out.values
    I[GRID, l] = 0
    row, grid_row = min(c, len(levels) - 1), min(c, len(grid) - 1)
    for g in range(grid.shape[1]):
        if grid[grid_row, g] > 0:
            break
        I[GRID, l] = g + 1
    set_due(W, I, grid, l)
    for f in range(p.n_functionals):
        value, sign = initial[c, f], flags[f, 0]
        for g in range(I[GRID, l]):
            values[c, g, f] = value
        I[LEVEL + f, l] = 0
        if flags[f, 2]:
            peaks[c, f, 0], peaks[c, f, 1] = 0.0, value
            W[level_slot(p, f), l] = value
            continue
        # A level that lies behind is never reached from this side; one that is met now is.
        while I[LEVEL + f, l] < levels.shape[2]:
            level = levels[row, f, I[LEVEL + f, l]]
            if np.isnan(level) or sign * level > sign * value:
                break
            if level == value:
                events[c, f, I[LEVEL + f, l]] = 0.0
            I[LEVEL + f, l] += 1
        set_level(p, W, I, flags, levels, f, l)


@compiled
def look(p: Places, W: Floats, I: Longs, ask: Request, out: Kept, l: int) -> None:
    """After an accepted step, before it is taken over: what happened within it."""
    flags, levels, grid = ask.flags, ask.levels, ask.grid
    events, peaks, values = out.events, out.peaks, out.values
    c, t, h, first = I[WHO, l], W[T, l], W[H, l], I[GRID, l]
    row, last = min(c, len(grid) - 1), first
    while last < grid.shape[1] and grid[row, last] <= t + h:
        last += 1
    for f in range(p.n_functionals):
        k = of_functional(p, W, f, l)
        for g in range(first, last):
            theta = (grid[row, g] - t) / h
            values[c, g, f] = dense_value(k, theta) if theta < 1 else k[1]
        if flags[f, 2]:
            theta = 0.0
            if dense_slope(k, 0.0) > 0 and dense_slope(k, 1.0) < 0:
                theta = top(k)
            value = dense_value(k, theta)
            if value > peaks[c, f, 1]:
                peaks[c, f, 0], peaks[c, f, 1] = t + theta * h, value
                W[level_slot(p, f), l] = value
        else:
            _levels(p, W, I, flags, levels, events, k, f, l)
    I[GRID, l] = last
    set_due(W, I, grid, l)


@compiled
def last_peaks(p: Places, W: Floats, I: Longs, flags: Longs, peaks: Floats, l: int) -> None:
    """At the end of a run or of a stretch: the end itself may be the highest."""
    c = I[WHO, l]
    for f in range(p.n_functionals):
        ending = W[p.alarm + 2 + (3 + p.n_dense) * f, l]
        if flags[f, 2] and ending > peaks[c, f, 1]:
            peaks[c, f, 0], peaks[c, f, 1] = W[T, l] + W[H, l], ending
            W[level_slot(p, f), l] = ending


@compiled
def _levels(
    p: Places,
    W: Floats,
    I: Longs,
    flags: Longs,
    levels: Floats,
    events: Floats,
    k: Floats,
    f: int,
    l: int,
) -> None:
    """Levels of one functional reached within the step."""
    place, sign, low = level_slot(p, f), flags[f, 0], 0.0
    while W[place, l] < NEVER:
        level = sign * W[place, l]
        found = -1.0
        for piece in range(4):
            end = 0.25 * (piece + 1)
            if end > low and sign * dense_value(k, end) >= sign * level:
                found = root(k, level, max(low, end - 0.25), end)
                break
        if found < 0:
            break
        low = found
        events[I[WHO, l], f, I[LEVEL + f, l]] = W[T, l] + found * W[H, l]
        I[LEVEL + f, l] += 1
        set_level(p, W, I, flags, levels, f, l)
