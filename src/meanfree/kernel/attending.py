"""Compiled: what the loop does with a lane that calls for attention after a step."""

from __future__ import annotations

import numpy as np

from meanfree.kernel import events, jumps, lane, resting
from meanfree.kernel.records import (
    AGAIN,
    BEGAN,
    FIRST_RUN,
    ONE_STEP,
    SEGMENT,
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

PENDING, REACHED, HORIZON = int(Ending.PENDING), int(Ending.REACHED), int(Ending.HORIZON)
CONVERTED, SETTLED = int(Ending.CONVERTED), int(Ending.SETTLED)
RESTLESS = int(Ending.RESTLESS)
TOO_SMALL, TOO_MANY = int(Ending.STEP_TOO_SMALL), int(Ending.TOO_MANY_STEPS)
NOT_FINITE, IS_NEGATIVE = int(Ending.NOT_FINITE), int(Ending.NEGATIVE)

T, STOP, DUE, END, UNTIL = (SLOT[name] for name in ("t", "stop", "due", "end", "until"))
ACCEPTED, AT, NEXT_H = (SLOT[name] for name in ("accepted", "reached", "next_h"))
ERROR, CROSSED, DEEPEST, NEGATIVE = (
    SLOT[name] for name in ("error", "crossed", "deepest", "negative")
)
TRIED, REFUSALS, MOST_STEPS = SLOT["tried"], SLOT["refusals"], SLOT["most_steps"]
LEDGER, AUTOMATIC, LAST = SLOT["atol_ledger"], SLOT["automatic"], SLOT["last"]
VERDICT, CROSSES, WAITS = SLOT["verdict"], SLOT["crosses"], SLOT["waits"]

ALLOWED = 100.0 / 1e-12
"""A negative amount may be 100 rtol of the total deep; the ledger's tolerance is 1e-12 of it."""


@compiled
def enter(
    p: Places, W: Floats, I: Longs, job: Conditions, ask: Request, out: Kept, c: int, count: int,
    l: int,
) -> None:  # fmt: skip
    """A lane takes a condition for the first time."""
    I[WHO, l], I[AGAIN, l] = c, FIRST_RUN
    W[DEEPEST, l] = W[TRIED, l] = W[REFUSALS, l] = 0.0
    lane.load(p, W, I, job, c, l)
    W[DUE, l], W[AUTOMATIC, l], W[LAST, l] = events.NEVER, -1.0, -1.0
    if p.n_functionals > 0:
        events.begin(p, W, I, ask, out, l)
    if p.automatic:
        resting.begin_watch(p, W, I, job, count, l)
        W[LAST, l] = 1.0 if job.breaks.shape[1] == 0 else -1.0


@compiled
def attend(
    p: Places,
    W: Floats,
    I: Longs,
    dense: Floats,
    job: Conditions,
    ask: Request,
    out: Kept,
    history: Floats,
    count: int,
    l: int,
) -> bool:
    """Look at a lane after a step; True where its condition has ended."""
    ending = PENDING
    if W[ACCEPTED, l] > 0:
        if I[AGAIN, l] == FIRST_RUN:
            ending = _first_run(p, W, I, dense, ask, out, l)
        elif I[AGAIN, l] == ONE_STEP:
            resting.approach(p, W, I, dense, ask, out, l)
            ending = SETTLED
        else:
            if I[SEGMENT, l] >= job.breaks.shape[1]:
                resting.approach(p, W, I, dense, ask, out, l)
            if W[AT, l] >= W[UNTIL, l]:
                ending = SETTLED
    elif not (W[NEXT_H, l] > 1e-15 * W[T, l] and W[NEXT_H, l] > 1e-280):
        ending = TOO_SMALL if np.isfinite(W[ERROR, l]) else NOT_FINITE
    if ending == PENDING and W[TRIED, l] + 1.5 > W[MOST_STEPS, l]:
        ending = TOO_MANY
    if ending == SETTLED and I[AGAIN, l] == FIRST_RUN:
        resting.come_to_rest(p, W, I, ask.bearing, out.rests, l)
        W[UNTIL, l], W[CROSSED, l] = W[AT, l], -1.0
        step = resting.look_back(p, W, history, ask.bearing, I[BEGAN, l], count, l)
        if step == -1:
            # The way was done before the last segment began; a run lasts to its last break.
            resting.put_back(p, W, history, I[BEGAN, l], l)
            resting.end_at_start(p, W, I, out.ends, l)
        elif step == -2:
            I[AGAIN, l] = TO_RUN_AGAIN
        elif step >= 0:
            I[AGAIN, l], I[BEGAN, l] = TO_STEP_AGAIN, step
        if step >= 0 or step == -2:
            W[AUTOMATIC, l], W[LAST, l] = 1.0, -1.0
            return False
    if ending == PENDING:
        return False
    _close(p, W, I, ask, out, ending, l)
    return True


@compiled
def _first_run(
    p: Places, W: Floats, I: Longs, dense: Floats, ask: Request, out: Kept, l: int
) -> int:
    """What an accepted step brought: events, a goal, an end. Why the run ends here, or PENDING."""
    ending, c = PENDING, I[WHO, l]
    if p.n_functionals > 0 and (W[AT, l] >= W[DUE, l] or W[p.alarm, l] > 0):
        events.look(p, W, I, ask, out, l)
    if p.automatic:
        ending = int(W[VERDICT, l])
        if ending == SETTLED and W[WAITS, l] > 0:
            ending = PENDING
    if W[AT, l] >= W[STOP, l] or ending != PENDING:
        if ending == PENDING and W[AT, l] >= W[END, l]:
            ending = HORIZON if p.automatic else REACHED
        events.last_peaks(p, W, I, ask.flags, out.peaks, l)
        if ending != PENDING and ending != CONVERTED:
            lane.hand_out(p, W, out.ends, c, l)
    if p.automatic:
        if W[CROSSES, l] > 0:
            resting.at_goal(p, W, I, dense, ask, out, ending == CONVERTED, l)
        if ending == CONVERTED:
            resting.not_before(p, W, I, dense, ask, out, l)
    return ending


@compiled
def _close(p: Places, W: Floats, I: Longs, ask: Request, out: Kept, ending: int, l: int) -> None:
    """Write down how a condition ended, when, and what it cost."""
    c = I[WHO, l]
    if ending in (SETTLED, CONVERTED):
        lane.strike_beyond(out.events, out.values, ask.grid, c, out.ends[c, p.size])
    deepest = max(W[DEEPEST, l], W[NEGATIVE, l])
    if (ending <= HORIZON or ending == RESTLESS) and deepest > ALLOWED * (p.rtol + 1e-16) * W[
        LEDGER, l
    ]:
        ending = IS_NEGATIVE
    out.marks[c, 0] = ending
    out.marks[c, 1] = int(W[TRIED, l]) + 1
    out.marks[c, 2] = int(W[REFUSALS, l]) + int(W[ACCEPTED, l] <= 0)


@compiled
def pass_break(
    p: Places, W: Floats, I: Longs, addresses: Longs, codes: Longs, job: Conditions, ask: Request,
    out: Kept, count: int, l: int,
) -> None:  # fmt: skip
    """A break, and what it means for levels that shrink and for runs of open length."""
    before = W[p.state + p.watched, l] if p.watched >= 0 else 0.0
    if p.size > p.states:
        jumps.pass_break(p, W, I, job, addresses, codes, l)
    else:
        lane.pass_break(p, W, I, job.breaks, job.changed, l)
    for f in range(p.n_functionals):
        if not ask.flags[f, 2]:
            events.set_level(p, W, I, ask.flags, ask.levels, f, l)
    if p.automatic:
        last = I[SEGMENT, l] >= job.breaks.shape[1]
        if I[AGAIN, l] == FIRST_RUN:
            resting.begin_segment(W, I, count, l)
            resting.passed_break(p, W, I, out.ends, before, l)
            W[LAST, l] = 1.0 if last else -1.0
        elif last:
            resting.end_at_start(p, W, I, out.ends, l)
