"""Compiled: the method's own dense output, its roots and its maxima.

``k`` holds the value before the step, the value after it and the dense coefficients.
"""

from __future__ import annotations

import numpy as np

from meanfree.kernel.records import Floats, Places, compiled


@compiled
def dense_value(k: Floats, theta: float) -> float:
    """The quantity at the part theta of the step."""
    total = 0.0
    for d in range(len(k) - 1, 1, -1):
        total = k[d] + theta * total
    value: float = (1 - theta) * k[0] + theta * (k[1] + (1 - theta) * total)
    return value


@compiled
def dense_slope(k: Floats, theta: float) -> float:
    """Its derivative by theta."""
    total, slope = 0.0, 0.0
    for d in range(len(k) - 1, 1, -1):
        slope = total + theta * slope
        total = k[d] + theta * total
    value: float = k[1] - k[0] + (1 - 2 * theta) * total + theta * (1 - theta) * slope
    return value


@compiled
def root(k: Floats, level: float, low: float, high: float) -> float:
    """Where the quantity crosses a level between two thetas, to the last place.

    Newton's method, kept inside the bracket by bisection.
    """
    above = dense_value(k, low) > level
    theta = 0.5 * (low + high)
    for _ in range(200):
        f = dense_value(k, theta) - level
        if f == 0 or high - low <= 2e-16 * high:
            break
        if (f > 0) == above:
            low = theta
        else:
            high = theta
        slope = dense_slope(k, theta)
        moved = theta - f / slope if slope != 0 else low - 1.0
        if not low < moved < high:
            moved = 0.5 * (low + high)
        if moved == theta:
            break
        theta = moved
    return theta


@compiled
def top(k: Floats) -> float:
    """Theta of a maximum inside a step that begins rising and ends falling."""
    low, high = 0.0, 1.0
    for _ in range(60):
        middle = 0.5 * (low + high)
        if dense_slope(k, middle) > 0:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


@compiled
def of_functional(p: Places, W: Floats, f: int, l: int) -> Floats:
    """``k`` of a functional, as the watching phase left it."""
    k = np.empty(2 + p.n_dense)
    first = p.alarm + 1 + (3 + p.n_dense) * f
    for i in range(2 + p.n_dense):
        k[i] = W[first + i, l]
    return k


@compiled
def of_state(p: Places, W: Floats, table: Floats, i: int, l: int) -> Floats:
    """``k`` of a state, from the stages; ``table`` [n_stages, n_dense] is the method's."""
    k = np.zeros(2 + p.n_dense)
    k[0], k[1] = W[p.state + i, l], W[p.new + i, l]
    for s in range(p.n_stages):
        for d in range(p.n_dense):
            k[2 + d] += table[s, d] * W[p.stage + s * p.size + i, l]
    return k
