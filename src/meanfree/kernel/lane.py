"""Compiled: a lane takes a condition in, passes a break, hands its result out."""

from __future__ import annotations

import numpy as np

from meanfree.kernel.records import (
    AGAIN,
    FIRST_RUN,
    FRESH,
    SEGMENT,
    SLOT,
    WHO,
    Conditions,
    Floats,
    Longs,
    Places,
    compiled,
)

ATOL, T, STOP = SLOT["atol_x"], SLOT["t"], SLOT["stop"]
THETA, UNTIL, END = SLOT["theta"], SLOT["until"], SLOT["end"]
REFUSED, STEPS, LIMITED = SLOT["refused"], SLOT["steps"], SLOT["limited"]
REACHED = SLOT["reached"]

OF_ITS_OWN = 1e-12
"""Absolute tolerance of a filled gas over its own fill, where that is less than over the total."""


@compiled
def load(p: Places, W: Floats, I: Longs, job: Conditions, c: int, l: int) -> None:
    """Put a condition's state and parameters into a lane, at time zero."""
    for i in range(p.size):
        W[p.state + i, l] = job.common[i]
    for i in range(p.n_parameters):
        W[p.parameter + i, l] = job.common[p.size + i]
    after = p.size + p.n_parameters
    for i in range(3):
        W[ATOL + i, l] = job.common[after + i]
    W[END, l] = job.common[after + 3]
    for v in range(len(job.varied)):
        place = job.varied[v]
        if place < p.size:
            slot = p.state + place
        elif place < after:
            slot = p.parameter + place - p.size
        elif place < after + 3:
            slot = ATOL + place - after
        else:
            slot = END
        W[slot, l] = job.own[v, c]
    for i in range(p.gases):
        # A filled trace is kept to a part of its own fill, however little of the whole that is.
        filled = W[p.state + i, l]
        own = OF_ITS_OWN * filled
        W[p.atol + i, l] = own if filled > 0 and own < W[ATOL, l] else W[ATOL, l]
    if p.automatic:
        for i in range(p.size):
            W[p.begin + i, l] = W[p.state + i, l]
    for zero in (T, REFUSED, STEPS):
        W[zero, l] = 0.0
    W[THETA, l], W[LIMITED, l] = 1.0, -1.0
    I[SEGMENT, l], I[FRESH, l] = 0, 1
    set_stop(p, W, I, job.breaks, c, l)


@compiled
def set_stop(p: Places, W: Floats, I: Longs, breaks: Floats, c: int, l: int) -> None:
    """The break or end that the lane must not step over."""
    end = W[END, l] if I[AGAIN, l] == FIRST_RUN else W[UNTIL, l]
    if I[SEGMENT, l] < breaks.shape[1]:
        end = min(end, breaks[min(c, len(breaks) - 1), I[SEGMENT, l], 0])
    W[STOP, l] = end


@compiled
def pass_break(p: Places, W: Floats, I: Longs, breaks: Floats, changed: Longs, l: int) -> None:
    """Samples are drawn, parameters change, and the lane starts anew from there."""
    c = I[WHO, l]
    here = breaks[min(c, len(breaks) - 1), I[SEGMENT, l]]
    if here[1] != 1.0:
        W[THETA, l] *= here[1]
        for i in range(p.gases):
            W[p.state + i, l] *= here[1]
        if p.v >= 0:
            W[p.state + p.v, l] *= here[1]
    if p.T >= 0 and here[2] > 0:
        W[p.state + p.T, l] = here[2]
    for i in range(len(changed)):
        W[p.parameter + changed[i], l] = here[3 + i]
    I[SEGMENT, l] += 1
    I[FRESH, l] = 1
    set_stop(p, W, I, breaks, c, l)


@compiled
def hand_out(p: Places, W: Floats, ends: Floats, c: int, l: int) -> None:
    """Keep the state after the step, and when that is."""
    for i in range(p.size):
        ends[c, i] = W[p.new + i, l]
    ends[c, p.size] = W[REACHED, l]


@compiled
def strike_beyond(events: Floats, values: Floats, grid: Floats, c: int, end: float) -> None:
    """A run that was found to end earlier keeps nothing from beyond its end."""
    row = min(c, len(grid) - 1)
    for f in range(events.shape[1]):
        for k in range(events.shape[2]):
            if events[c, f, k] > end:
                events[c, f, k] = np.nan
        for g in range(grid.shape[1]):
            if grid[row, g] > end:
                values[c, g, f] = np.nan
