"""Compiled: how a run of open length ends. The rules are those of a single run.

It ends when its watched gas is gone, or when nothing moves any more. In the second case the step
in which it had gone 99.9 % of the way to where it came to rest is looked up in what is remembered
of the run, and made once more for its dense output.
"""

from __future__ import annotations

import numpy as np

from meanfree.kernel.dense import dense_value, of_functional, of_state, root
from meanfree.kernel.records import (
    BEGAN,
    SLOT,
    WHO,
    Conditions,
    Floats,
    Kept,
    Longs,
    Places,
    Request,
    compiled,
)

LEFT = 1e-3
"""Fraction of the watched gas, or of the way, that is left at the end: 1 - 99.9 %."""

MOVING = 1e-6
"""Gases that go less than this part of the longest way do not decide when the run is done."""

T, H, CROSSED, REACHED = SLOT["t"], SLOT["h"], SLOT["crossed"], SLOT["reached"]
GOAL, OLDER, NEWER = SLOT["goal"], SLOT["older"], SLOT["newer"]
AT_LEAST, REFUSED = SLOT["at_least"], SLOT["refused"]


@compiled
def begin_watch(p: Places, W: Floats, I: Longs, job: Conditions, count: int, l: int) -> None:
    """Forget what another condition left in this lane."""
    W[CROSSED, l], W[GOAL, l] = -1.0, -1.0
    for i in range(p.size):
        W[p.most + i, l] = abs(W[p.state + i, l])
    if p.watched >= 0 and W[p.state + p.watched, l] > 0:
        goal = LEFT * W[p.state + p.watched, l]
        row = min(I[WHO, l], len(job.breaks) - 1)
        for segment in range(job.breaks.shape[1]):
            goal *= job.breaks[row, segment, 1]
        W[GOAL, l] = goal
    begin_segment(W, I, count, l)


@compiled
def begin_segment(W: Floats, I: Longs, count: int, l: int) -> None:
    """No state of this segment is known yet."""
    W[OLDER, l] = W[NEWER, l] = -1.0
    I[BEGAN, l] = count


@compiled
def passed_break(p: Places, W: Floats, I: Longs, ends: Floats, before: float, l: int) -> None:
    """A drawn sample may take the watched gas to its goal."""
    if p.watched >= 0 and before > W[GOAL, l] and W[p.state + p.watched, l] <= W[GOAL, l]:
        end_at_start(p, W, I, ends, l)


@compiled
def end_at_start(p: Places, W: Floats, I: Longs, ends: Floats, l: int) -> None:
    """The run ends, if nothing else comes, with the state that the lane has now."""
    W[CROSSED, l] = ends[I[WHO, l], p.size] = W[T, l]
    for k in range(p.size):
        ends[I[WHO, l], k] = W[p.state + k, l]


@compiled
def end_within(
    p: Places, W: Floats, I: Longs, table: Floats, ask: Request, out: Kept, theta: float,
    final: bool, l: int,
) -> None:  # fmt: skip
    """The run ends at the part theta of this step, unless it is known to last longer."""
    time, c = W[T, l] + theta * W[H, l], I[WHO, l]
    if time <= W[CROSSED, l]:
        return
    W[CROSSED, l] = out.ends[c, p.size] = time
    for k in range(p.size):
        out.ends[c, k] = dense_value(of_state(p, W, table, k, l), theta)
    for f in range(p.n_functionals):
        if final and ask.flags[f, 2]:
            # A maximum beyond the end is none; there may be as much at the end itself.
            value = dense_value(of_functional(p, W, f, l), theta)
            if out.peaks[c, f, 0] > time or value > out.peaks[c, f, 1]:
                out.peaks[c, f, 0], out.peaks[c, f, 1] = time, value


@compiled
def at_goal(
    p: Places, W: Floats, I: Longs, table: Floats, ask: Request, out: Kept, final: bool, l: int
) -> None:
    """The watched gas comes to its goal within this step."""
    theta = root(of_state(p, W, table, p.watched, l), W[GOAL, l], 0.0, 1.0)
    W[CROSSED, l] = -1.0
    end_within(p, W, I, table, ask, out, theta, final, l)


@compiled
def not_before(
    p: Places, W: Floats, I: Longs, table: Floats, ask: Request, out: Kept, l: int
) -> None:
    """The run lasts as long as it must, where that time lies within this step."""
    if W[T, l] < W[AT_LEAST, l] <= W[REACHED, l]:
        theta = (W[AT_LEAST, l] - W[T, l]) / W[H, l]
        end_within(p, W, I, table, ask, out, theta, True, l)


@compiled
def come_to_rest(p: Places, W: Floats, I: Longs, bearing: Longs, rests: Floats, l: int) -> None:
    """Remember where the run rests."""
    for i in range(p.size):
        W[p.rest + i, l] = rests[I[WHO, l], i] = W[p.new + i, l]
    for i in range(p.gases):
        if bearing[i] == 0:
            rests[I[WHO, l], i] = np.nan


@compiled
def decides(p: Places, W: Floats, bearing: Longs, i: int, l: int) -> bool:
    """True for gases whose way to rest counts: the watched one, or all that move."""
    way = abs(W[p.begin + i, l] - W[p.rest + i, l])
    first = W[p.begin + p.watched, l] if p.watched >= 0 else 0.0
    if first > 0 and W[p.rest + p.watched, l] != first:
        return i == p.watched
    longest = 0.0
    for k in range(p.gases):
        if bearing[k] == 1:
            longest = max(longest, abs(W[p.begin + k, l] - W[p.rest + k, l]))
    return bool(bearing[i] == 1 and way > MOVING * longest)


@compiled
def look_back(
    p: Places, W: Floats, history: Floats, bearing: Longs, began: int, count: int, l: int
) -> int:
    """The step in which the way to rest was last done; -1 where that was before the segment, -2

    where it was before what is remembered, -3 where there is no way.
    """
    held, first = len(history), max(began, count - len(history))
    latest, nothing = -1, True
    for i in range(p.gases):
        if decides(p, W, bearing, i, l):
            nothing = False
            rest = W[p.rest + i, l]
            left = LEFT * abs(W[p.begin + i, l] - rest)
            for step in range(count - 1, max(first, latest) - 1, -1):
                # What is this far away before a step came close within it, or would be now.
                if abs(history[step % held, 2 + i, l] - rest) > left:
                    latest = max(latest, step)
                    break
    if W[AT_LEAST, l] > 0:
        for step in range(count - 1, max(first, latest) - 1, -1):
            if history[step % held, 0, l] < W[AT_LEAST, l]:
                latest = max(latest, step)
                break
    if latest < 0 and nothing:
        return -3
    if latest < 0:
        return -1 if first == began else -2
    return latest


@compiled
def put_back(p: Places, W: Floats, history: Floats, step: int, l: int) -> None:
    """The lane as it was when a remembered step began."""
    place = step % len(history)
    W[T, l], W[H, l], W[REFUSED, l] = history[place, 0, l], history[place, 1, l], 0.0
    for i in range(p.states):
        W[p.state + i, l] = history[place, 2 + i, l]


@compiled
def approach(
    p: Places, W: Floats, I: Longs, table: Floats, ask: Request, out: Kept, l: int
) -> None:
    """In a step that is made again: the last time at which a gas was LEFT of its way from rest."""
    for i in range(p.gases):
        if decides(p, W, ask.bearing, i, l):
            rest = W[p.rest + i, l]
            left = LEFT * abs(W[p.begin + i, l] - rest)
            before, after = W[p.state + i, l] - rest, W[p.new + i, l] - rest
            if abs(before) > left and abs(after) <= left:
                level = rest + (left if before > 0 else -left)
                theta = root(of_state(p, W, table, i, l), level, 0.0, 1.0)
                end_within(p, W, I, table, ask, out, theta, True, l)
    not_before(p, W, I, table, ask, out, l)
