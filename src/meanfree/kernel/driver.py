"""The loop over steps that serves every kernel: step sizes, acceptance, lanes that take new work.

The phases are called by address, so that one compiled loop drives straight-line kernels and the
interpreter alike. Lanes never see each other: a condition gives the same bits in any lane.
"""
from __future__ import annotations

import numpy as np
from numba import njit

from meanfree.kernel.vector import call_address

ACCEPT, START, ASSEMBLE, EVALUATE, STEP = 0, 1, 2, 3, 4


@njit(cache=True, nogil=True, error_model="numpy")
def advance(addresses, codes, W, L, places, gamma, x0, parameters, atol, end, out_y, out_t, status, counters):
    """Integrate all conditions."""
    size, state, new, stage0, first_parameter = places[0], places[1], places[2], places[3], places[4]
    n = len(end)
    base = W.ctypes.data
    n_step = len(addresses) - STEP
    who = np.full(L, -1, np.int64)
    t = np.zeros(L)
    h = np.zeros(L)
    rejected = np.zeros(L, np.int64)
    fresh = np.zeros(L, np.int64)
    following = 0
    live = 0
    any_fresh = True
    for l in range(L):
        who[l] = -1
        c = min(following, n - 1)
        if following < n:
            who[l] = following
            live += 1
            following += 1
        fresh[l] = 1
        t[l] = 0.0
        for i in range(size):
            W[(state + i) * L + l] = x0[c, i]
        for i in range(parameters.shape[1]):
            W[(first_parameter + i) * L + l] = parameters[c, i]
        for k in range(atol.shape[1]):
            W[(8 + k) * L + l] = atol[c, k]
    steps = 0
    while live > 0:
        if any_fresh:
            call_address(addresses[START], base, codes[START])
            for l in range(L):
                if fresh[l]:
                    fresh[l] = 0
                    rate = W[6 * L + l]
                    stop = end[max(who[l], 0)]
                    h[l] = min(0.02 / rate, 0.01*stop) if rate > 0 else 1e-3 * stop
                    rejected[l] = 0
            any_fresh = False
        for l in range(L):
            if who[l] >= 0:
                stop = end[who[l]]
                if t[l] + h[l] * (1 + 1e-12) >= stop:
                    h[l] = stop - t[l]
            W[l] = 1.0 / (gamma * h[l])
            W[L + l] = 1.0 / h[l]
        for s in range(n_step):
            call_address(addresses[STEP + s], base, codes[STEP + s])
        steps += 1
        for l in range(L):
            error = W[3 * L + l]
            factor = W[4 * L + l]
            W[2 * L + l] = 0.0
            c = who[l]
            if c < 0:
                continue
            counters[c, 0] += 1
            if error <= 1.0:
                W[2 * L + l] = 1.0
                t[l] += h[l]
                if rejected[l]:
                    factor = min(factor, 1.0)
                rejected[l] = 0
                if t[l] >= end[c]:
                    for i in range(size):
                        out_y[c, i] = W[(new + i) * L + l]
                    out_t[c] = t[l]
                    status[c] = 1
                    who[l] = -1
                    live -= 1
                    fresh[l] = 1
            else:
                counters[c, 1] += 1
                rejected[l] = 1
                factor = min(factor, 0.5)
            h[l] *= factor
        call_address(addresses[ACCEPT], base, codes[ACCEPT])
        for l in range(L):
            if fresh[l]:
                if following < n:
                    c = following
                    who[l] = c
                    following += 1
                    live += 1
                    any_fresh = True
                    t[l] = 0.0
                    for i in range(size):
                        W[(state + i) * L + l] = x0[c, i]
                    for i in range(parameters.shape[1]):
                        W[(first_parameter + i) * L + l] = parameters[c, i]
                    for k in range(atol.shape[1]):
                        W[(8 + k) * L + l] = atol[c, k]
                else:
                    fresh[l] = 0
    return steps
