"""Compiled: the loop over steps that serves every kernel.

The phases are called by address, so that one compiled loop drives straight-line kernels and the
interpreter alike. Lanes never see each other: a condition gives the same bits in any lane.
"""

from __future__ import annotations

import numpy as np

from meanfree.kernel import events, jumps, lane, pivoting, resting
from meanfree.kernel.records import (
    AGAIN,
    FRESH,
    SEGMENT,
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
from meanfree.kernel.status import Ending
from meanfree.kernel.vector import call_address

ACCEPT, START, JUDGE, STEP = 0, 1, 4, 5
PENDING, REACHED, HORIZON = int(Ending.PENDING), int(Ending.REACHED), int(Ending.HORIZON)
CONVERTED, SETTLED = int(Ending.CONVERTED), int(Ending.SETTLED)
TOO_SMALL, TOO_MANY = int(Ending.STEP_TOO_SMALL), int(Ending.TOO_MANY_STEPS)
NOT_FINITE, IS_NEGATIVE = int(Ending.NOT_FINITE), int(Ending.NEGATIVE)

T, H, STOP, DUE, END, UNTIL = (
    SLOT[name] for name in ("t", "h", "stop", "due", "end", "until")
)  # fmt: skip
ACCEPTED, AT, NEXT_H, ATTENTION = (
    SLOT[name] for name in ("accepted", "reached", "next_h", "attention")
)  # fmt: skip
ERROR, BAD, FIRST, CROSSED, DEEPEST, NEGATIVE = (
    SLOT[name] for name in ("error", "bad", "first", "crossed", "deepest", "negative")
)
TRIED, REFUSALS, MOST_STEPS = SLOT["tried"], SLOT["refusals"], SLOT["most_steps"]
LEDGER, WORST = SLOT["atol_ledger"], SLOT["worst"]
AUTOMATIC, SNAP_AT = SLOT["automatic"], SLOT["snap_at"]

FIRST_STEP = 0.02
"""First step over the time in which a derivative changes; chosen by fewest steps on ROBER."""

ALLOWED = 100.0 / 1e-12
"""A negative amount may be 100 rtol of the total deep; the ledger's tolerance is 1e-12 of it."""


@compiled
def advance(
    p: Places,
    W: Floats,
    I: Longs,
    addresses: Longs,
    codes: Longs,
    entries: Longs,
    a: Floats,
    c_table: Floats,
    dense: Floats,
    job: Conditions,
    ask: Request,
    out: Kept,
) -> int:
    """Integrate all conditions; the number of steps that the lanes made together."""
    n, L, base, watching = out.marks.shape[0], p.lanes, W.ctypes.data, p.n_functionals > 0
    n_phases = len(addresses) if watching else len(addresses) - 1
    following, live, count, some_fresh = 0, 0, 0, True
    I[WHO, :] = -1
    I[AGAIN, :] = 0
    for l in range(L):
        lane.load(p, W, I, job, min(following, n - 1), l)
        if following < n:
            _enter(p, W, I, job, ask, out, following, l)
            following += 1
            live += 1
    while live > 0:
        if some_fresh:
            call_address(addresses[START], base, codes[START])
            _first_steps(p, W, I)
            some_fresh = False
        for s in range(STEP, n_phases):
            call_address(addresses[s], base, codes[s])
        count += 1
        bad = False
        for l in range(L):
            bad = bad or W[BAD, l] > W[WORST, l]
        if bad:
            _with_pivots(p, W, I, addresses, codes, entries, a, c_table, out.marks)
        for l in range(L):
            if W[ATTENTION, l] > 0 and I[WHO, l] >= 0:
                some_fresh = True
                if _attend(p, W, I, dense, job, ask, out, l):
                    I[WHO, l] = -1
                    live -= 1
        call_address(addresses[ACCEPT], base, codes[ACCEPT])
        if some_fresh:
            some_fresh = False
            for l in range(L):
                if I[WHO, l] < 0:
                    if following < n:
                        _enter(p, W, I, job, ask, out, following, l)
                        following += 1
                        live += 1
                        some_fresh = True
                elif I[AGAIN, l] == 2:
                    I[AGAIN, l] = 1
                    W[AUTOMATIC, l] = 1.0
                    lane.load(p, W, I, job, I[WHO, l], l)
                    some_fresh = True
                elif W[T, l] >= W[STOP, l]:
                    _pass_break(p, W, I, addresses, codes, job, ask, l)
                    some_fresh = True
    return count


@compiled
def _enter(
    p: Places, W: Floats, I: Longs, job: Conditions, ask: Request, out: Kept, c: int, l: int
) -> None:
    """A lane takes a condition for the first time."""
    I[WHO, l], I[AGAIN, l] = c, 0
    W[DEEPEST, l] = W[TRIED, l] = W[REFUSALS, l] = 0.0
    lane.load(p, W, I, job, c, l)
    W[DUE, l] = W[SNAP_AT, l] = events.NEVER
    W[AUTOMATIC, l] = 1.0 if p.automatic and job.breaks.shape[1] > 0 else -1.0
    if p.n_functionals > 0:
        events.begin(p, W, I, ask, out, l)
    if p.automatic:
        resting.begin_watch(p, W, I, l)


@compiled
def _first_steps(p: Places, W: Floats, I: Longs) -> None:
    """Choose a first step in every lane that starts anew."""
    for l in range(p.lanes):
        if I[FRESH, l]:
            I[FRESH, l] = 0
            W[H, l] = 1e-3 * (W[STOP, l] - W[T, l])
            if W[FIRST, l] > 0 and FIRST_STEP / W[FIRST, l] < W[H, l]:
                W[H, l] = FIRST_STEP / W[FIRST, l]


@compiled
def _with_pivots(
    p: Places,
    W: Floats,
    I: Longs,
    addresses: Longs,
    codes: Longs,
    entries: Longs,
    a: Floats,
    c_table: Floats,
    marks: Longs,
) -> None:
    """Make the step of lanes that met a bad pivot again, with row exchanges; judge all again."""
    base = W.ctypes.data
    for l in range(p.lanes):
        if W[BAD, l] > W[WORST, l]:
            solved = pivoting.pivoted_step(p, W, addresses, codes, entries, a, c_table, l)
            W[BAD, l] = W[WORST, l]
            if not solved:
                W[p.stage + (p.n_stages - 1) * p.size, l] = np.nan
            if I[WHO, l] >= 0:
                marks[I[WHO, l], 3] += 1
    call_address(addresses[JUDGE], base, codes[JUDGE])
    if p.n_functionals > 0:
        call_address(addresses[len(addresses) - 1], base, codes[len(addresses) - 1])


@compiled
def _attend(
    p: Places,
    W: Floats,
    I: Longs,
    dense: Floats,
    job: Conditions,
    ask: Request,
    out: Kept,
    l: int,
) -> bool:
    """Look at a lane after a step; True where its condition has ended."""
    c, ending, first_run = I[WHO, l], PENDING, I[AGAIN, l] == 0
    if W[ACCEPTED, l] > 0:
        if p.n_functionals > 0 and first_run and (W[AT, l] >= W[DUE, l] or W[p.alarm, l] > 0):
            events.look(p, W, I, ask, out, l)
        if p.automatic and first_run:
            last = I[SEGMENT, l] >= job.breaks.shape[1]
            ending = resting.watch(p, W, I, dense, out.ends, last, l)
        elif p.automatic:
            resting.approach(p, W, dense, out.ends, c, l)
        if W[AT, l] >= W[STOP, l] or ending != PENDING:
            end = W[UNTIL, l] if I[AGAIN, l] == 1 else W[END, l]
            if ending == PENDING and W[AT, l] >= end:
                ending = HORIZON if p.automatic else REACHED
            if first_run:
                events.last_peaks(p, W, I, ask.flags, out.peaks, l)
                if ending != PENDING and ending != CONVERTED:
                    lane.hand_out(p, W, out.ends, c, l)
    elif not (W[NEXT_H, l] > 1e-15 * W[T, l] and W[NEXT_H, l] > 1e-280):
        ending = TOO_SMALL if np.isfinite(W[ERROR, l]) else NOT_FINITE
    if ending == PENDING and W[TRIED, l] + 1.5 > W[MOST_STEPS, l]:
        ending = TOO_MANY
    if ending == SETTLED and first_run:
        # Once more from the start, to find when it had arrived.
        I[AGAIN, l] = 2
        W[UNTIL, l], W[CROSSED, l] = out.ends[c, p.size], -1.0
        for i in range(p.size):
            out.rests[c, i] = W[p.rest + i, l]
        return False
    if ending == PENDING:
        return False
    _close(p, W, I, ask, out, ending, l)
    return True


@compiled
def _close(p: Places, W: Floats, I: Longs, ask: Request, out: Kept, ending: int, l: int) -> None:
    """Write down how a condition ended, when, and what it cost."""
    c = I[WHO, l]
    if I[AGAIN, l] == 1 and ending == HORIZON:
        # The second run ended where the first had settled; the way was done before.
        ending = SETTLED
    if ending in (SETTLED, CONVERTED) and W[CROSSED, l] >= 0:
        out.ends[c, p.size] = W[CROSSED, l]
    if p.automatic and ending != HORIZON:
        lane.strike_beyond(out.events, out.values, ask.grid, c, out.ends[c, p.size])
    deepest = max(W[DEEPEST, l], W[NEGATIVE, l])
    if ending <= HORIZON and deepest > ALLOWED * (p.rtol + 1e-16) * W[LEDGER, l]:
        ending = IS_NEGATIVE
    out.marks[c, 0] = ending
    out.marks[c, 1] = int(W[TRIED, l]) + 1
    out.marks[c, 2] = int(W[REFUSALS, l]) + int(W[ACCEPTED, l] <= 0)


@compiled
def _pass_break(
    p: Places, W: Floats, I: Longs, addresses: Longs, codes: Longs, job: Conditions, ask: Request,
    l: int,
) -> None:  # fmt: skip
    """A break, and what it means for levels that shrink with the contents."""
    if p.size > p.states:
        jumps.pass_break(p, W, I, job, addresses, codes, l)
    else:
        lane.pass_break(p, W, I, job.breaks, job.changed, l)
    for f in range(p.n_functionals):
        if not ask.flags[f, 2]:
            events.set_level(p, W, I, ask.flags, ask.levels, f, l)
