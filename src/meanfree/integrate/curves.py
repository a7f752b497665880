"""How a number follows one value: a short formula where one fits, else a Chebyshev series.

Only what is known at a few values is used, so no law and no way to fill a vessel is written a
second time.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np
from numpy.polynomial import chebyshev

from meanfree.equations.system import Floats

Curve = Callable[[Floats], Floats]

AGREE = 1e-12
"""Relative agreement of a number with what its formula predicts: rounding of a few operations."""

SMOOTH = 1e-11
"""The same for a series, whose values carry the rounding of what they go through."""

FORMULA_NODES = 6
"""Intervals between values at which formulas are tried; they have three constants at most."""

LEVELS = (FORMULA_NODES, 12, 24, 48)
"""Intervals between the nodes of a series, each level with all nodes of the one before."""

DECADE = 3.0
"""A span is walked by its logarithm from this ratio of its ends."""


def nodes_of(low: float, high: float, intervals: int) -> Floats:
    """Where a span is looked at [shape (intervals + 1,)]: both ends, and denser towards them."""
    shape = (1 - np.cos(np.pi * np.arange(intervals + 1) / intervals)) / 2
    geometric = _by_logarithm(low, high)
    found = low * (high / low) ** shape if geometric else low + (high - low) * shape
    found[0], found[-1] = low, high
    return np.asarray(found, float)


def _by_logarithm(low: float, high: float) -> bool:
    return low > 0 and high / low > DECADE


def agree(one: Floats, other: Floats, tolerance: float = AGREE) -> np.ndarray:
    """Where numbers agree; NaN agrees with NaN."""
    close = np.abs(one - other) <= tolerance * np.abs(other)
    same: np.ndarray = close | (one == other) | (np.isnan(one) & np.isnan(other))
    return same


def formula(nodes: Floats, values: Floats) -> Curve | None:
    """The first short formula that gives the values at all nodes; None where there is none."""
    for curve in _formulas(nodes, values):
        if agree(curve(nodes), values).all():
            return curve
    return None


def _formulas(v: Floats, y: Floats) -> Iterator[Curve]:
    """c v, c/v; a + b f with f = v, 1/v, ln v; c v^p; a quadratic; (a + b s)/(1 + c s)."""
    one_sided = v[0] > 0 or v[-1] < 0
    if v[-1] != 0:
        yield _scaled(float(y[-1] / v[-1]), 1.0)
    if one_sided:
        yield _scaled(float(y[-1] * v[-1]), -1.0)
    yield _line(v, y, lambda x: x)
    if one_sided:
        yield _line(v, y, lambda x: 1 / x)
    if v[0] > 0:
        yield _line(v, y, np.log)
        if y[0] * y[-1] > 0:
            yield _power(v, y)
    yield from _curved(v, y)


def _scaled(factor: float, sign: float) -> Curve:
    return (lambda x: factor * x) if sign > 0 else (lambda x: factor / x)


def _line(v: Floats, y: Floats, f: Curve) -> Curve:
    ends = f(v[[0, -1]])
    slope = (y[-1] - y[0]) / (ends[1] - ends[0])
    return lambda x: y[0] + slope * (f(x) - ends[0])


def _power(v: Floats, y: Floats) -> Curve:
    p = float(np.log(y[-1] / y[0]) / np.log(v[-1] / v[0]))
    # Powers in physics are mostly whole or halves; one found by differences is only nearly so.
    p = round(2 * p) / 2 if abs(2 * p - round(2 * p)) < 1e-8 else p
    return lambda x: y[-1] * (x / v[-1]) ** p


def _curved(v: Floats, y: Floats) -> Iterator[Curve]:
    """Through both ends and the middle, by s from 0 to 1."""
    middle = len(v) // 2
    m = (v[middle] - v[0]) / (v[-1] - v[0])
    rise, part = y[-1] - y[0], y[middle] - y[0]
    bend = (part - rise * m) / (m * (m - 1))

    def share(x: Floats) -> Floats:
        return np.asarray((x - v[0]) / (v[-1] - v[0]), float)

    yield lambda x: y[0] + share(x) * (rise + bend * (share(x) - 1))
    if y[-1] != y[middle]:
        c = (part - rise * m) / (m * (y[-1] - y[middle]))
        b = y[-1] * (1 + c) - y[0]
        if c > -1:
            yield lambda x: (y[0] + b * share(x)) / (1 + c * share(x))


def series(nodes: Floats, values: Floats) -> Curve | None:
    """A Chebyshev series through every other node that gives the others; None where it fails."""
    low, high = float(nodes[0]), float(nodes[-1])
    positive = bool((values > 0).all() and values.max() > 2 * values.min())
    data = np.log(values) if positive else values
    every = data[::2][::-1]
    n = len(every) - 1
    weights = np.ones(n + 1)
    weights[[0, -1]] = 0.5
    angle = np.pi * np.arange(n + 1) / n
    coefficients = 2 / n * (np.cos(np.outer(np.arange(n + 1), angle)) @ (weights * every))
    coefficients[[0, -1]] *= 0.5

    def curve(x: Floats) -> Floats:
        if _by_logarithm(low, high):
            s = np.log(x / low) / np.log(high / low)
        else:
            s = (x - low) / (high - low)
        found = chebyshev.chebval(2 * s - 1, coefficients)
        return np.asarray(np.exp(found) if positive else found, float)

    return curve if agree(curve(nodes), values, SMOOTH).all() else None
