"""What the phase after every step sees of a run whose length is open, for all lanes at once.

The rules are those of `meanfree.integrate.settling`. Instead of every state since t/WINDOW two are
remembered: an older one, away from which nothing has moved, and a newer one that takes its place
when something has. The newer one is never half as far away, so what is found to rest does so
at most when the remaining movement is half of what would do.
"""

from __future__ import annotations

from collections.abc import Sequence

from meanfree.kernel.slots import Layout
from meanfree.kernel.status import Ending
from meanfree.kernel.tape import Op, Tape

STILL = 1e-6
"""Change, over the most that was ever there, that counts as no movement."""

WINDOW = 100.0
"""Nothing may move between t/WINDOW and t."""

BOUND = 1e9
"""Growth of the amount of all gases at which a run is given up."""

MOST_STEPS = 30_000
"""Steps after which a run is ended as it is: one that swings for ever never rests."""

LEDGER = 1e-12
"""The ledger's absolute tolerance over the amount of all gases at the start."""


def observe(
    layout: Layout, t: Tape, most: int, still: int, watched: int, bearing: Sequence[int],
    out: dict[int, int],
) -> int:  # fmt: skip
    """Write down what moved; > 0 where the loop must look.

    ``most`` and ``still`` are the first slots of the most there was of each state and of the
    remembered ones, the newer behind the older; ``bearing`` are the gases that must rest. Must not
    be repeated for a step.
    """

    def scalar(name: str) -> int:
        return t.input(layout.scalar(name))

    system, zero, one, never = layout.system, t.const(0.0), t.const(1.0), t.const(-1.0)
    accepted, reached = scalar("accepted"), scalar("reached")
    older, newer = scalar("older"), scalar("newer")
    kept = [*bearing, *range(system.n_gases + system.n_ledger, layout.states)]
    from_older, from_newer, half = t.neg(older), t.neg(newer), t.neg(newer)
    states, n = {}, layout.size
    for i in kept:
        new, known = t.input(layout.new + i), t.input(most + i)
        states[i] = (new, t.input(still + i), t.input(still + n + i))
        largest = t.max(t.unary(Op.ABS, new), known)
        out[most + i] = t.select(accepted, largest, known)
        changes = [t.unary(Op.ABS, t.sub(new, state)) for state in states[i][1:]]
        from_older = t.max(t.nmadd(t.const(STILL), largest, changes[0]), from_older)
        from_newer = t.max(t.nmadd(t.const(STILL), largest, changes[1]), from_newer)
        half = t.max(t.nmadd(t.const(STILL / 2), largest, changes[1]), half)

    def kept_or(old: int, follower: int, new: int) -> tuple[int, int]:
        """Older and newer after this step."""
        replaced = t.select(from_older, t.select(from_newer, new, follower), old)
        followed = t.select(half, new, follower)
        return t.select(accepted, replaced, old), t.select(accepted, followed, follower)

    for i, (new, old, follower) in states.items():
        out[still + i], out[still + n + i] = kept_or(old, follower, new)
    since, later = kept_or(older, newer, reached)
    out[layout.scalar("older")], out[layout.scalar("newer")] = since, later
    may_end = t.min(scalar("last"), t.sub(reached, scalar("at_least")))
    rests = t.nmadd(t.const(WINDOW), since, reached)
    total = t.sum([t.input(layout.new + i) for i in range(system.n_gases)])
    grown = t.nmadd(t.const(BOUND / LEDGER), scalar("atol_ledger"), total)
    many = t.sub(scalar("steps"), t.const(MOST_STEPS - 1.5))

    def code(ending: Ending) -> int:
        return t.const(float(ending))

    verdict = t.select(many, code(Ending.RESTLESS), zero)
    verdict = t.select(grown, code(Ending.UNBOUNDED), verdict)
    verdict = t.select(t.min(rests, may_end), code(Ending.SETTLED), verdict)
    crosses = never
    if watched >= 0:
        goal = scalar("goal")
        gone = t.select(t.sub(t.input(layout.new + watched), goal), never, one)
        crosses = t.min(t.min(t.sub(t.input(layout.state + watched), goal), gone), goal)
        done = t.select(may_end, code(Ending.CONVERTED), zero)
        verdict = t.select(t.min(gone, goal), done, verdict)
    out[layout.scalar("verdict")] = verdict = t.select(accepted, verdict, zero)
    out[layout.scalar("crosses")] = crosses = t.select(accepted, crosses, never)
    return t.max(verdict, crosses)
