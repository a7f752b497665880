"""Profile-likelihood intervals: how far a parameter can go while all others make up for it.

Source: Bates and Watts, Nonlinear Regression Analysis and Its Applications, 1988, section 6.1;
Venzon and Moolgavkar, Appl. Statist. 37 (1988) 87.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from meanfree.equations.system import Floats
from meanfree.measured.least_squares import Residuals, Scales, Solution, solve

FAR: Final[float] = 60.0
"""Steps of one standard error after which an interval counts as open; no source."""

HOPELESS: Final[float] = 1e200
"""A sum of squares beyond this is that of a prediction that failed."""

CLOSE: Final[float] = 1e-4
"""How well an end of an interval is found, in standard errors: four digits of its length."""

BETTER: Final[float] = 1e-6
"""A sum of squares lower by this is a better minimum and not rounding."""


class BetterMinimum(Exception):  # noqa: N818 -- nothing went wrong: there is news
    """A profile met a lower minimum, at ``values``."""

    def __init__(self, values: Floats) -> None:
        self.values = values
        super().__init__("a better minimum")


@dataclass(frozen=True)
class Profile:
    """The profile of one parameter, in inner coordinates.

    ``low`` and ``high`` are where the excess of the sum of squares reaches ``threshold``; infinite
    where it never does. ``at`` and ``excess`` [shape (n,)] are the points met on the way.
    """

    low: float
    high: float
    at: Floats
    excess: Floats
    threshold: float


def profile(
    residuals: Residuals,
    solution: Solution,
    covariance: Floats,
    place: int,
    threshold: float,
    scales: Scales,
    farthest: float = math.inf,
) -> Profile:
    """The profile of the parameter at ``place``.

    ``covariance`` is that of the parameters for residuals of unit deviation; ``threshold`` the
    excess of the sum of squares at which the interval ends (the square of Student's t). Beyond
    ``farthest`` from the estimate an end counts as open.

    Raises BetterMinimum where it meets a sum of squares below that of the solution.
    """
    walk = _Walk(residuals, solution, covariance, place, scales)
    ends = [_end(walk, sign, threshold, farthest) for sign in (-1.0, 1.0)]
    points = sorted(walk.points.items())
    return Profile(
        ends[0],
        ends[1],
        np.array([u for u, _ in points]),
        np.array([excess for _, excess in points]),
        threshold,
    )


class _Walk:
    """Excess of the sum of squares at values of one parameter, the others fitted anew."""

    def __init__(
        self,
        residuals: Residuals,
        solution: Solution,
        covariance: Floats,
        place: int,
        scales: Scales,
    ) -> None:
        self.residuals, self.solution, self.place, self.scales = residuals, solution, place, scales
        n = len(solution.values)
        self.others = np.array([i for i in range(n) if i != place], int)
        self.origin = float(solution.values[place])
        self.least = solution.sum_of_squares
        variance = covariance[place, place]
        known = np.isfinite(variance) and variance > 0
        self.step = math.sqrt(variance) if known else float(scales.size[place])
        along = covariance[self.others, place] / variance if known else np.zeros(n - 1)
        self.along = np.where(np.isfinite(along), along, 0.0)
        self.points: dict[float, float] = {self.origin: 0.0}
        self.last: dict[float, tuple[float, Floats]] = {}

    def excess(self, u: float) -> float:
        """Excess at u; the others start where the last point on this side suggests."""
        if u in self.points:
            return self.points[u]
        side = 1.0 if u >= self.origin else -1.0
        before, others = self.last.get(side, (self.origin, self.solution.values[self.others]))
        guess = others + self.along * (u - before)
        low, high = self.scales.low[self.others], self.scales.high[self.others]
        guess = np.clip(guess, low, high)

        of_others = _OfOthers(self, u)
        if len(guess):
            # Differences are good to the square of their step: nothing finer can be found.
            size, step = self.scales.size[self.others], self.scales.step
            sub = Scales(guess, low, high, size, step=step, follow=self.scales.follow)
            found = solve(of_others, sub, polish=False, most=60, tolerance=step**2)
            rest, squares = found.values, found.sum_of_squares
        else:
            r = of_others(guess)
            rest, squares = guess, float(r @ r)
        excess = squares - self.least if squares < HOPELESS else math.inf
        if excess < -BETTER * max(1.0, self.least):
            raise BetterMinimum(self.joined(u, rest))
        if math.isfinite(excess):
            self.points[u], self.last[side] = excess, (u, rest)
        return excess

    def joined(self, u: float, rest: Floats) -> Floats:
        """All parameters: one at u, the others as given."""
        values = self.solution.values.copy()
        values[self.place], values[self.others] = u, rest
        return values


class _OfOthers:
    """Residuals as a function of the other parameters, one of them held at ``u``."""

    def __init__(self, walk: _Walk, u: float) -> None:
        self.walk, self.u = walk, u
        if hasattr(walk.residuals, "together"):
            self.together = self._together
        if hasattr(walk.residuals, "jacobian"):
            self.jacobian = self._jacobian

    def __call__(self, rest: Floats) -> Floats:
        return self.walk.residuals(self.walk.joined(self.u, rest))

    def _together(self, points: Sequence[Floats]) -> list[Floats]:
        several: list[Floats] = self.walk.residuals.together(  # type: ignore[attr-defined]
            [self.walk.joined(self.u, rest) for rest in points]
        )
        return several

    def _jacobian(self, rest: Floats, scales: Scales) -> Floats:
        walk = self.walk
        whole = walk.residuals.jacobian(  # type: ignore[attr-defined]
            walk.joined(self.u, rest), walk.scales
        )
        return np.asarray(whole[:, walk.others])


def _end(walk: _Walk, sign: float, threshold: float, farthest: float) -> float:
    """Where the excess reaches the threshold on one side."""
    bound = walk.scales.low[walk.place] if sign < 0 else walk.scales.high[walk.place]
    goal = math.sqrt(threshold)
    if sign * (bound - walk.origin) <= 0:
        return walk.origin

    def reach(u: float) -> float:
        return math.sqrt(max(walk.excess(u), 0.0)) - goal

    inner, below = walk.origin, -goal
    distance, failures = min(goal * walk.step, 0.5 * farthest), 0
    while distance <= min(FAR * goal * walk.step, farthest):
        outer = walk.origin + sign * distance
        if sign * (outer - bound) >= 0:
            outer = float(bound)
        above = reach(outer)
        if math.isinf(above):
            # Nothing can be predicted there: that is no limit. Look nearer, a few times.
            failures += 1
            if failures > 6:
                return sign * math.inf
            distance = 0.5 * (distance + abs(inner - walk.origin))
            continue
        if above >= 0:
            return _between(reach, (inner, below), (outer, above), walk.step)
        if outer == bound:
            return float(bound)
        inner, below = outer, above
        # The root of the excess grows about evenly: aim a little beyond where it should be.
        share = goal / max(above + goal, 0.05 * goal)
        distance *= min(max(1.05 * share, 1.1), 4.0)
    return sign * math.inf


def _between(
    f: Callable[[float], float], inner: tuple[float, float], outer: tuple[float, float], step: float
) -> float:
    """The root between two points of opposite sign, to `CLOSE` of a standard error.

    Near a parabola the root of the excess is nearly straight: one secant step is often enough.
    """
    from scipy.optimize import brentq

    (a, fa), (b, fb) = inner, outer
    width = CLOSE * min(step, abs(b - a))
    c = a - fa * (b - a) / (fb - fa)
    fc = f(c)
    if abs(fc) < CLOSE:
        return c
    low, high = (c, b) if fc < 0 else (a, c)
    return float(brentq(f, low, high, xtol=width, rtol=1e-12))
