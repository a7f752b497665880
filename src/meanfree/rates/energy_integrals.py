"""Averages of a piecewise linear cross-section over a Maxwell-Boltzmann distribution.

The rate constant is the mean relative speed times the integral of sigma(u) u exp(-u) du over
the energies u = E/RT. The pieces are in closed form, written so that no digits are lost
where a piece is narrow or far out: every term is positive where the cross-section is.

Source: Levine, Molecular Reaction Dynamics, 2005, section 3.1 (the average); the moments
are elementary.
"""

from __future__ import annotations

from math import factorial
from typing import Any

from meanfree.rates.law import Functions

_NARROW = 1.0
"""Width, in units of RT, below which the moments come from a series."""

_TERMS = 16
"""Terms of that series: the next one is below 1e-16 of the first at the limit."""


def moments(fn: Functions, h: Any) -> tuple[Any, Any, Any]:
    """Integrals of s^n exp(-h s) over s from 0 to 1, for n = 0, 1, 2 and h > 0.

    A namespace that carries them as functions of their own has ``fall_moment(n, h)``: sympy's,
    for which differentiating the series term by term would take seconds a point.

    >>> from meanfree.rates.law import NUMBERS
    >>> [round(float(g), 12) for g in moments(NUMBERS, 1e-14)]
    [1.0, 0.5, 0.333333333333]
    """
    own = getattr(fn, "fall_moment", None)
    if own is not None:
        return own(0, h), own(1, h), own(2, h)
    first, second, third = moments_up_to(fn, 2, h)
    return first, second, third


def moments_up_to(fn: Functions, highest: int, h: Any) -> tuple[Any, ...]:
    """The same for n = 0 to ``highest``; d/dh of the n-th is minus the next.

    The closed form of the second, (2 - exp(-h)(2 + 2h + h^2))/h^3, loses all digits at small
    h. There the highest is exp(-h) sum h^k n!/(n+k+1)!, all of it positive, and the others follow
    from g_(n-1) = (h g_n + exp(-h))/n, which only adds.
    """
    n, fall = highest, fn.exp(-h)
    series: Any = 0.0
    for k in range(_TERMS - 1, -1, -1):
        series = (1.0 + h * series) / (k + n + 1.0)
    # n! (1 - exp(-h) sum_{k<=n} h^k/k!)/h^(n+1)
    powers: Any = 0.0
    for k in range(n, -1, -1):
        powers = factorial(n) / factorial(k) + h * powers
    last = fn.below(h, _NARROW, fall * series, (factorial(n) - fall * powers) / h ** (n + 1))
    found = [last]
    for k in range(n, 0, -1):
        found.append((h * found[-1] + fall) / k)
    return tuple(reversed(found))


def piece(fn: Functions, a: Any, b: Any, sigma_a: Any, sigma_b: Any) -> Any:
    """Integral of sigma(u) u exp(-u) from a to b, sigma linear from sigma_a to sigma_b.

    With u = a + h s the integrand is a quadratic in s times exp(-h s).
    """
    h = b - a
    g0, g1, g2 = moments(fn, h)
    near = a * (g0 - g1) + h * (g1 - g2)
    far = a * g1 + h * g2
    return h * fn.exp(-a) * (sigma_a * near + sigma_b * far)


def step_up(fn: Functions, a: Any) -> Any:
    """Integral of u exp(-u) from a to infinity: a cross-section of 1 above a."""
    return fn.exp(-a) * (1 + a)


def ramp_up(fn: Functions, a: Any) -> Any:
    """Integral of (u - a) u exp(-u) from a to infinity: a cross-section that rises from a."""
    return fn.exp(-a) * (2 + a)


def falling(fn: Functions, a: Any) -> Any:
    """Integral of (a/u) u exp(-u) from a to infinity: a cross-section of 1 at a, as 1/u."""
    return fn.exp(-a) * a
