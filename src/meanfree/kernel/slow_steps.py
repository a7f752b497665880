"""Whether a lane that seems to rest waits for a slow step; the rule of `integrate.settling`.

A phase of its own, carried out only when a lane seems to rest, which it does once or a few times.
"""

from __future__ import annotations

from collections.abc import Sequence

from meanfree.equations.bearing import NOISE, turnovers
from meanfree.kernel.balances import Balances
from meanfree.kernel.slots import Layout
from meanfree.kernel.stillness import STILL
from meanfree.kernel.tape import Phase, Tape


def waiting_phase(layout: Layout, bearing: Sequence[int], most: int, horizon: float) -> Phase:
    """Leaves ``waits`` > 0 in lanes where a step out of balance has not had the time to act.

    ``most`` is the first slot of the most there was of each gas; ``horizon`` [s] is the longest
    automatic run.
    """
    t = Tape()
    waits = never = t.const(-1.0)
    steps = turnovers(layout.system, bearing)
    if steps:
        new = [t.input(layout.new + i) for i in range(layout.states)]
        flows = Balances(layout, border=False).flows(t, new)
        reached = t.input(layout.scalar("reached"))
        for one in steps:
            back = flows[one.reverse] if one.reverse >= 0 else t.const(0.0)
            net, both = t.sub(flows[one.step], back), t.add(flows[one.step], back)
            for taken, forwards in ((one.left, net), (one.right, t.neg(net))):
                if not taken:
                    continue
                there = [t.div(new[gas], t.const(number)) for gas, number in taken]
                scarcest = there[0]
                for amount in there[1:]:
                    scarcest = t.min(amount, scarcest)
                so = t.nmadd(t.const(NOISE), both, forwards)
                so = t.min(t.nmadd(reached, forwards, scarcest), so)
                so = t.min(t.sub(t.mul(t.const(horizon), forwards), scarcest), so)
                for gas, _ in taken:
                    enough = t.nmadd(t.const(STILL), t.input(most + gas), new[gas])
                    so = t.min(enough, so)
                waits = t.max(t.select(so, t.const(1.0), never), waits)
    return Phase("waiting", t, {layout.scalar("waits"): waits})
