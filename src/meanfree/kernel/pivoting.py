"""Compiled: a step of one lane with row exchanges, for the rare matrix that needs them.

The elimination order of a kernel is fixed beforehand. Where it meets a pivot that is small
against its column, the step of that lane is made again here, slowly and safely.
"""

from __future__ import annotations

import numpy as np

from meanfree.kernel.records import SLOT, Floats, Longs, Places, compiled
from meanfree.kernel.vector import call_address

ASSEMBLE, EVALUATE = 2, 3
INVERSE_H = SLOT["inverse_h"]


@compiled
def factorise(A: Floats, order: Longs) -> bool:
    """LU with row exchanges in place; False where the matrix is singular or not finite.

    Rows are compared after scaling each by its largest entry.
    """
    n = len(A)
    scale = np.empty(n)
    for r in range(n):
        order[r] = r
        scale[r] = np.max(np.abs(A[r]))
        if not (scale[r] > 0 and scale[r] < np.inf):
            return False
    for k in range(n):
        best = k
        for r in range(k + 1, n):
            if abs(A[r, k]) / scale[r] > abs(A[best, k]) / scale[best]:
                best = r
        if A[best, k] == 0 or not np.isfinite(A[best, k]):
            return False
        if best != k:
            for c in range(n):
                A[k, c], A[best, c] = A[best, c], A[k, c]
            order[k], order[best] = order[best], order[k]
            scale[k], scale[best] = scale[best], scale[k]
        for r in range(k + 1, n):
            if A[r, k] != 0:
                A[r, k] /= A[k, k]
                for c in range(k + 1, n):
                    A[r, c] -= A[r, k] * A[k, c]
    return True


@compiled
def solve(A: Floats, order: Longs, rhs: Floats) -> Floats:
    """Solution with the factors of `factorise`."""
    n = len(A)
    x = np.empty(n)
    for r in range(n):
        x[r] = rhs[order[r]]
        for c in range(r):
            x[r] -= A[r, c] * x[c]
    for r in range(n - 1, -1, -1):
        for c in range(r + 1, n):
            x[r] -= A[r, c] * x[c]
        x[r] /= A[r, r]
    return x


@compiled
def pivoted_step(
    p: Places,
    W: Floats,
    addresses: Longs,
    codes: Longs,
    entries: Longs,
    a: Floats,
    c: Floats,
    l: int,
) -> bool:
    """The stages of one lane and the last one's argument, as the step's phases leave them.

    ``entries`` [n, 4]: block, row, column and slot, see `meanfree.kernel.phases`; ``a``, ``c`` are
    the method's. False where the matrix is singular.
    """
    base = W.ctypes.data
    call_address(addresses[ASSEMBLE], base, codes[ASSEMBLE])
    A, order = np.zeros((p.unknowns, p.unknowns)), np.empty(p.unknowns, np.int64)
    for e in range(len(entries)):
        if entries[e, 0] == 0:
            A[entries[e, 1], entries[e, 2]] = W[entries[e, 3], l]
    if not factorise(A, order):
        return False
    rhs = np.zeros(p.unknowns)
    for s in range(p.n_stages):
        for i in range(p.size):
            w = W[p.state + i, l]
            for q in range(s):
                w += a[s, q] * W[p.stage + q * p.size + i, l]
            W[p.argument + i, l] = w
        call_address(addresses[EVALUATE], base, codes[EVALUATE])
        x = np.zeros(p.unknowns)
        for block in range(p.size // p.states):
            first = block * p.states
            for i in range(p.states):
                earlier = 0.0
                for q in range(s):
                    earlier += c[s, q] * W[p.stage + q * p.size + first + i, l]
                rhs[i] = W[p.value + first + i, l] + W[INVERSE_H, l] * earlier
            if block > 0:
                for e in range(len(entries)):
                    if entries[e, 0] == block:
                        rhs[entries[e, 1]] += W[entries[e, 3], l] * x[entries[e, 2]]
            y = solve(A, order, rhs)
            if block == 0:
                x[:] = y
            for i in range(p.states):
                W[p.stage + s * p.size + first + i, l] = y[i]
    return True
