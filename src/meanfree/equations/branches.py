"""Functions that sympy carries as they are, with the derivatives we know.

`sympy.Piecewise` simplifies its conditions whenever it is made or differentiated, which for
a rate law can take seconds a step. `choose` says the same and is left alone;
``rewrite(sympy.Piecewise)`` gives the form for people. `fall_moment` stands for a series of
which sympy would differentiate every term.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import sympy

from meanfree.rates.energy_integrals import moments_up_to
from meanfree.rates.law import NUMBERS


class choose(sympy.Function):  # type: ignore[misc]  # noqa: N801
    """``choose(x, limit, then, otherwise)``: the third where x < limit, else the fourth."""

    nargs = 4

    def _eval_derivative(self, symbol: Any) -> Any:
        """Each branch by itself: a branch not taken may be infinite, and 0 times that is no 0."""
        x, limit, then, otherwise = self.args
        slopes = then.diff(symbol), otherwise.diff(symbol)
        if slopes == (0, 0):
            return sympy.Integer(0)
        return choose(x, limit, *slopes)

    def _eval_rewrite_as_Piecewise(self, *args: Any, **options: Any) -> Any:
        x, limit, then, otherwise = args
        return sympy.Piecewise((then, x < limit), (otherwise, True))


class fall_moment(sympy.Function):  # type: ignore[misc]  # noqa: N801
    """``fall_moment(n, h)``: the integral of s^n exp(-h s) over s from 0 to 1."""

    nargs = 2

    def fdiff(self, argindex: int = 2) -> Any:
        """d/dh of the n-th is minus the next."""
        n, h = self.args
        return -fall_moment(n + 1, h)


def _fall_moment(n: int, h: Any) -> Any:
    """The n-th of as many as a first derivative asks for."""
    return moments_up_to(NUMBERS, max(2, int(n)), h)[int(n)]


def _of_arrays(x: Any, limit: Any, then: Any, otherwise: Any) -> Any:
    return np.where(x < limit, then, otherwise)


def _of_numbers(x: float, limit: float, then: float, otherwise: float) -> float:
    return then if x < limit else otherwise


FOR_ARRAYS: dict[str, Callable[..., Any]] = {
    "choose": _of_arrays,
    "fall_moment": _fall_moment,
}
"""What ``sympy.lambdify`` needs beside "numpy"."""

FOR_NUMBERS: dict[str, Callable[..., Any]] = {
    "choose": _of_numbers,
    "fall_moment": lambda n, h: float(_fall_moment(n, h)),
}
"""What ``sympy.lambdify`` needs beside "math"."""
