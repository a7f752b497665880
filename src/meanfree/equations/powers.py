"""A concentration to the power of an order, kept smooth where the order is below one.

c^q with q < 1 has an infinite slope at zero and no meaning below it. Written as
c (c^2 + e^2)^((q-1)/2) it equals c^q to (e/c)^2 and stops at zero smoothly.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from meanfree.equations.system import Floats

STOP = 1e-9
"""e over the total initial concentration for orders from 0 to below 1."""

ROUNDING = 1e-20
"""e over the total initial concentration for other orders that are no whole numbers."""


def is_whole(order: float) -> bool:
    """True for 1, 2, 3, …: an ordinary polynomial term."""
    return order >= 1 and order == int(order)


def smoothing(order: float) -> float:
    """e over the total initial concentration that an order asks for; 0 for whole orders."""
    if is_whole(order):
        return 0.0
    return STOP if order < 1 else ROUNDING


def power(c: Any, order: float, scale: float) -> Any:
    """c^order, smooth at zero. Works for arrays and for sympy expressions.

    c [mol/m^3]; ``scale`` [mol/m^3] the total initial concentration.
    """
    if is_whole(order):
        return c ** int(order)
    e = smoothing(order) * scale
    return c * (c * c + e * e) ** ((order - 1) / 2)


def powers(c: Floats, order: Floats, scale: float) -> tuple[Floats, Floats]:
    """c^order and its derivative for arrays of one shape."""
    if np.all(order == 1):
        return c, np.ones_like(c)
    value, slope = c.copy(), np.ones_like(c)
    for q in np.unique(order[order != 1]):
        at = order == q
        here = c[at]
        value[at] = power(here, float(q), scale)
        if is_whole(float(q)):
            slope[at] = q * here ** int(q - 1)
        else:
            square = here * here + (smoothing(float(q)) * scale) ** 2
            slope[at] = square ** ((q - 3) / 2) * (square + (q - 1) * here * here)
    return value, slope
