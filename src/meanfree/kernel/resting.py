"""Compiled: when a run of open length is done. The rules are those of a single run.

A run ends when its watched gas is gone, or when nothing moves any more. In the second case it is
carried out once more, to find when it had gone 99.9 % of the way to where it came to rest.
"""

from __future__ import annotations

from meanfree.kernel.dense import dense_value, of_state, root
from meanfree.kernel.records import SLOT, SNAPS, SNAPSHOTS, WHO, Floats, Longs, Places, compiled
from meanfree.kernel.status import Ending

LEFT = 1e-3
"""Fraction of the watched gas, or of the way, that is left at the end: 1 - 99.9 %."""

STILL = 1e-6
"""Change, over the most that was ever there, that counts as no movement."""

WINDOW, SPACING = 100.0, 1.25
"""Nothing may move between t/WINDOW and t; states are remembered at times SPACING apart."""

MOVING = 1e-6
"""Gases that go less than this part of the longest way do not decide when the run is done."""

PENDING, CONVERTED, SETTLED = int(Ending.PENDING), int(Ending.CONVERTED), int(Ending.SETTLED)
T, H, CROSSED, STEPS = SLOT["t"], SLOT["h"], SLOT["crossed"], SLOT["steps"]
SNAP_AT = SLOT["snap_at"]


@compiled
def begin_watch(p: Places, W: Floats, I: Longs, l: int) -> None:
    """Forget what another condition left in this lane."""
    I[SNAPS, l] = 0
    W[CROSSED, l], W[SNAP_AT, l] = -1.0, 0.0
    for i in range(p.size):
        W[p.most + i, l] = abs(W[p.state + i, l])


@compiled
def watch(p: Places, W: Floats, I: Longs, table: Floats, ends: Floats, last: bool, l: int) -> int:
    """After an accepted step, before it is taken over: why the run ends here, or PENDING.

    Called when the watched gas comes to its goal and when a state is to be remembered; after every
    step where segments follow one another.

    ``last`` is True in the last segment.
    """
    c = I[WHO, l]
    for i in range(p.size):
        there = abs(W[p.new + i, l])
        if there > W[p.most + i, l]:
            W[p.most + i, l] = there
    if p.watched >= 0 and W[p.begin + p.watched, l] > 0:
        goal = LEFT * W[p.begin + p.watched, l]
        if W[p.new + p.watched, l] <= goal:
            if W[p.state + p.watched, l] > goal:
                _cross(p, W, table, ends, c, p.watched, goal, l)
            if last:
                return CONVERTED
        else:
            W[CROSSED, l] = -1.0
    if last and _rests(p, W, I, l):
        for i in range(p.size):
            W[p.rest + i, l] = W[p.new + i, l]
        return SETTLED
    return PENDING


@compiled
def _cross(
    p: Places, W: Floats, table: Floats, ends: Floats, c: int, i: int, level: float, l: int
) -> None:
    """Remember the moment at which a state crosses a level in this step, and the state then."""
    theta = root(of_state(p, W, table, i, l), level, 0.0, 1.0)
    time = W[T, l] + theta * W[H, l]
    if time > W[CROSSED, l]:
        W[CROSSED, l] = time
        for k in range(p.size):
            ends[c, k] = dense_value(of_state(p, W, table, k, l), theta)


@compiled
def _rests(p: Places, W: Floats, I: Longs, l: int) -> bool:
    """True where nothing moved since t/WINDOW, judged each time a state is remembered."""
    t, count, width = W[T, l] + W[H, l], I[SNAPS, l], p.size + 1
    if W[STEPS, l] >= 4 and count > 0:
        nothing = True
        for i in range(p.size):
            if _counts(p, i) and W[p.new + i, l] != W[p.begin + i, l]:
                nothing = False
        if nothing:
            return True
    if t < W[SNAP_AT, l]:
        return False
    rests = False
    for back in range(1, min(count, SNAPSHOTS) + 1):
        place = p.snaps + ((count - back) % SNAPSHOTS) * width
        if _distance(p, W, place, l) > STILL:
            break
        if W[place + p.size, l] <= t / WINDOW:
            rests = True
            break
    place = p.snaps + (count % SNAPSHOTS) * width
    W[place + p.size, l] = t
    for i in range(p.size):
        W[place + i, l] = W[p.new + i, l]
    I[SNAPS, l] = count + 1
    W[SNAP_AT, l] = SPACING * t
    return rests


@compiled
def _counts(p: Places, i: int) -> bool:
    """True for the states that must rest: gases, v and T, not the ledger."""
    return i < p.gases or i == p.v or i == p.T


@compiled
def _distance(p: Places, W: Floats, place: int, l: int) -> float:
    """Largest change since a remembered state, over the most there was."""
    largest = 0.0
    for i in range(p.size):
        if _counts(p, i) and W[p.most + i, l] > 0:
            change = abs(W[p.new + i, l] - W[place + i, l])
            largest = max(largest, change / W[p.most + i, l])
    return largest


@compiled
def approach(p: Places, W: Floats, table: Floats, ends: Floats, c: int, l: int) -> None:
    """In the second run: the last time at which a gas was LEFT of its way from rest."""
    longest = 0.0
    for i in range(p.gases):
        longest = max(longest, abs(W[p.begin + i, l] - W[p.rest + i, l]))
    only = -1
    if p.watched >= 0 and abs(W[p.begin + p.watched, l] - W[p.rest + p.watched, l]) > 0:
        only = p.watched
    for i in range(p.gases):
        rest = W[p.rest + i, l]
        way = abs(W[p.begin + i, l] - rest)
        if (only >= 0 and i != only) or (only < 0 and not way > MOVING * longest):
            continue
        before, after = W[p.state + i, l] - rest, W[p.new + i, l] - rest
        if abs(before) > LEFT * way and abs(after) <= LEFT * way:
            level = rest + (LEFT * way if before > 0 else -LEFT * way)
            _cross(p, W, table, ends, c, i, level, l)
