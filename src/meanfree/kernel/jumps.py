"""Compiled: what a break does to derivatives of the state.

With y+ = G(y-) at a break that comes at t_b: s+ = G_y (s- + f- t_b') + G_p - f+ t_b', where '
is the derivative along the direction: the derivative by p of y on both sides of t_b(p).
"""

from __future__ import annotations

import numpy as np

from meanfree.kernel import lane
from meanfree.kernel.pivoting import EVALUATE
from meanfree.kernel.records import SEGMENT, WHO, Conditions, Floats, Longs, Places, compiled
from meanfree.kernel.vector import call_address


@compiled
def _rates(p: Places, W: Floats, addresses: Longs, codes: Longs, l: int) -> Floats:
    """dy/dt of one lane as it stands."""
    for i in range(p.size):
        W[p.argument + i, l] = W[p.state + i, l]
    call_address(addresses[EVALUATE], W.ctypes.data, codes[EVALUATE])
    found = np.empty(p.states)
    for i in range(p.states):
        found[i] = W[p.value + i, l]
    return found


@compiled
def pass_break(
    p: Places, W: Floats, I: Longs, job: Conditions, addresses: Longs, codes: Longs, l: int
) -> None:
    """The break itself, and then the derivatives in every direction."""
    c, place = I[WHO, l], I[SEGMENT, l]
    here = job.breaks[min(c, len(job.breaks) - 1), place]
    moving = job.moving[min(c, len(job.moving) - 1), place]
    n, shifts = p.states, False
    before, old, new = np.empty(n), np.zeros(n), np.zeros(n)
    for i in range(n):
        before[i] = W[p.state + i, l]
    for k in range(len(moving)):
        shifts = shifts or moving[k, 0] != 0
    if shifts:
        old = _rates(p, W, addresses, codes, l)
    lane.pass_break(p, W, I, job.breaks, job.changed, l)
    if shifts:
        new = _rates(p, W, addresses, codes, l)
    for k in range(len(moving)):
        for i in range(n):
            slot = p.state + n * (1 + k) + i
            s = W[slot, l] + old[i] * moving[k, 0]
            if i < p.gases or i == p.v:
                s = here[1] * s + moving[k, 1] * before[i]
            elif i == p.T and here[2] > 0:
                s = moving[k, 2]
            W[slot, l] = s - new[i] * moving[k, 0]
