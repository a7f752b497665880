"""Compiled: the loop over steps that serves every kernel.

The phases are called by address, so that one compiled loop drives straight-line kernels and the
interpreter alike. Lanes never see each other: a condition gives the same bits in any lane.
"""

from __future__ import annotations

import numpy as np

from meanfree.kernel import attending, lane, pivoting, resting
from meanfree.kernel.records import (
    AGAIN,
    BEGAN,
    FIRST_RUN,
    FRESH,
    ONE_STEP,
    SECOND_RUN,
    SLOT,
    TO_RUN_AGAIN,
    TO_STEP_AGAIN,
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
from meanfree.kernel.vector import call_address, positive_lanes, unowned

ACCEPT, START, JUDGE, STEP = 0, 1, 4, 5

T, H, STOP, ATTENTION = (SLOT[name] for name in ("t", "h", "stop", "attention"))
BAD, FIRST, WORST, LAST = (SLOT[name] for name in ("bad", "first", "worst", "last"))
VERDICT, SETTLED = SLOT["verdict"], float(Ending.SETTLED)

FIRST_STEP = 0.02
"""First step over the time in which a derivative changes; chosen by fewest steps on ROBER."""


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
    history: Floats,
) -> int:
    """Integrate all conditions; the number of steps that the lanes made together.

    ``history`` [steps, 2 + states, lanes] is room for what runs of open length look back at.
    """
    base = W.ctypes.data
    W, I, addresses, codes, entries = (
        unowned(W), unowned(I), unowned(addresses), unowned(codes), unowned(entries)
    )  # fmt: skip
    a, c_table, dense, history = unowned(a), unowned(c_table), unowned(dense), unowned(history)
    job = Conditions(
        unowned(job.common), unowned(job.varied), unowned(job.own), unowned(job.breaks),
        unowned(job.changed), unowned(job.moving),
    )  # fmt: skip
    ask = Request(
        unowned(ask.flags), unowned(ask.initial), unowned(ask.levels), unowned(ask.grid),
        unowned(ask.bearing),
    )  # fmt: skip
    out = Kept(
        unowned(out.ends), unowned(out.rests), unowned(out.marks), unowned(out.events),
        unowned(out.peaks), unowned(out.values),
    )  # fmt: skip
    steps: int = _loop(
        p, W, I, addresses, codes, entries, a, c_table, dense, job, ask, out, history, base
    )
    return steps


@compiled
def _loop(
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
    history: Floats,
    base: int,
) -> int:
    """The loop itself."""
    n, L = out.marks.shape[0], p.lanes
    watching = p.n_functionals > 0 or p.automatic
    waiting, last_phase = len(addresses) - 1, len(addresses) - 2
    following, live, count, some_fresh = 0, 0, 0, True
    I[WHO, :] = -1
    I[AGAIN, :] = FIRST_RUN
    W[LAST, :] = -1.0
    for l in range(L):
        lane.load(p, W, I, job, min(following, n - 1), l)
        if following < n:
            attending.enter(p, W, I, job, ask, out, following, count, l)
            following += 1
            live += 1
    while live > 0:
        if some_fresh:
            call_address(addresses[START], base, codes[START])
            _first_steps(p, W, I)
            some_fresh = False
        if p.automatic:
            _remember(p, W, history, count)
        for s in range(STEP, last_phase):
            call_address(addresses[s], base, codes[s])
        call_address(addresses[JUDGE], base, codes[JUDGE])
        count += 1
        calling = positive_lanes(base, ATTENTION, L)
        if calling != 0:
            bad = False
            for l in range(L):
                bad = bad or W[BAD, l] > W[WORST, l]
            if bad:
                _with_pivots(p, W, I, addresses, codes, entries, a, c_table, out.marks)
        if watching:
            call_address(addresses[last_phase], base, codes[last_phase])
        calling = positive_lanes(base, ATTENTION, L)
        if p.automatic and calling != 0 and _some_rest(W, I, L):
            call_address(addresses[waiting], base, codes[waiting])
        for l in range(L if calling != 0 else 0):
            called = (calling >> l) & 1 and I[WHO, l] >= 0
            if called and attending.attend(p, W, I, dense, job, ask, out, history, count, l):
                I[WHO, l] = -1
                live -= 1
        call_address(addresses[ACCEPT], base, codes[ACCEPT])
        for l in range(L if calling != 0 else 0):
            if (calling >> l) & 1:
                if I[WHO, l] < 0:
                    if following < n:
                        attending.enter(p, W, I, job, ask, out, following, count, l)
                        following += 1
                        live += 1
                        some_fresh = True
                elif I[AGAIN, l] == TO_STEP_AGAIN:
                    I[AGAIN, l] = ONE_STEP
                    resting.put_back(p, W, history, I[BEGAN, l], l)
                elif I[AGAIN, l] == TO_RUN_AGAIN:
                    I[AGAIN, l] = SECOND_RUN
                    lane.load(p, W, I, job, I[WHO, l], l)
                    some_fresh = True
                elif W[T, l] >= W[STOP, l]:
                    attending.pass_break(p, W, I, addresses, codes, job, ask, out, count, l)
                    some_fresh = True
    return count


@compiled
def _some_rest(W: Floats, I: Longs, lanes: int) -> bool:
    """True where a lane seems to have come to rest in its first run."""
    for l in range(lanes):
        if I[WHO, l] >= 0 and I[AGAIN, l] == FIRST_RUN and W[VERDICT, l] == SETTLED:
            return True
    return False


@compiled
def _remember(p: Places, W: Floats, history: Floats, count: int) -> None:
    """Time, step size and state of every lane before a step."""
    place = count % len(history)
    for l in range(p.lanes):
        history[place, 0, l] = W[T, l]
        history[place, 1, l] = W[H, l]
    for i in range(p.states):
        for l in range(p.lanes):
            history[place, 2 + i, l] = W[p.state + i, l]


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
