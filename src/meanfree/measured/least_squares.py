"""Nonlinear least squares: scaled parameters, bounds, robust losses, several starts.

It knows nothing of chemistry: residuals in units of their standard deviation come in, estimates
with their covariance go out. scipy does the minimising; the scaling, the differences, the choice
of method and what is said about the result are here.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any, Final, Literal

import numpy as np

from meanfree.equations.system import Floats

Residuals = Callable[[Floats], Floats]
Jacobian = Callable[[Floats], Floats]
Loss = Literal["linear", "soft_l1", "huber", "cauchy"]

STEP: Final[float] = 3e-5
"""Step of central differences over the size of a parameter: errors of 1e-9 by curvature, and by
rounding where the residuals are good to 1e-14."""

TOLERANCE: Final[float] = 1e-14


@dataclass(frozen=True)
class Scales:
    """Where each parameter starts, its bounds and its size; all of shape (n,).

    ``basis`` [shape (n, n)] maps inner coordinates to the parameters (over their sizes), so that
    parameters that move together can be taken apart; None: each stands for itself. ``step`` is that
    of differences over the size. Where sizes ``follow`` the values, the second search has new ones.
    """

    start: Floats
    low: Floats
    high: Floats
    size: Floats
    basis: Floats | None = None
    step: float = STEP
    follow: bool = False

    @classmethod
    def of(
        cls,
        start: Sequence[float],
        low: Sequence[float] | None = None,
        high: Sequence[float] | None = None,
        size: Sequence[float] | None = None,
        basis: Floats | None = None,
    ) -> Scales:
        """Scales with what is not given left open: no bounds, the start itself as size."""
        x = np.asarray(start, float)
        return cls(
            x,
            np.full(len(x), -np.inf) if low is None else np.asarray(low, float),
            np.full(len(x), np.inf) if high is None else np.asarray(high, float),
            np.where(x == 0, 1.0, np.abs(x)) if size is None else np.asarray(size, float),
            basis,
            follow=size is None,
        )

    @property
    def is_bounded(self) -> bool:
        """True where some parameter has a bound."""
        return bool(np.any(np.isfinite(self.low)) or np.any(np.isfinite(self.high)))


@dataclass(frozen=True)
class Solution:
    """A minimum.

    ``values`` [shape (n,)], ``residuals`` [shape (m,)] and their ``jacobian`` by the parameters
    [shape (m, n)], all before any robust loss; ``cost`` is half the sum of the losses. ``size``
    [shape (n,)] is a change of each parameter that counts as one; ``at_bound`` marks those that
    rest on a bound. ``converged`` is False where the method gave up, with its reason in
    ``message``. ``minima`` are the costs the other starts ended at.
    """

    values: Floats
    residuals: Floats
    jacobian: Floats
    cost: float
    at_bound: np.ndarray
    converged: bool
    message: str
    evaluations: int
    size: Floats
    loss: Loss = "linear"
    width: float = 1.0
    minima: tuple[float, ...] = ()

    @property
    def sum_of_squares(self) -> float:
        """Sum of the squared residuals."""
        return float(self.residuals @ self.residuals)

    @property
    def free(self) -> np.ndarray:
        """Parameters that do not rest on a bound, as a mask [shape (n,)]."""
        return ~self.at_bound


def differences(f: Residuals, x: Floats, scales: Scales) -> Floats:
    """Jacobian by central differences, one-sided (second order) at a bound [shape (m, n)].

    Where ``f`` has a method ``together`` it is asked for all points in one go.
    """
    points: list[Floats] = []
    weights: list[list[tuple[int, float]]] = []
    low, high = scales.low, scales.high
    for i in range(len(x)):
        h = scales.step * max(scales.size[i], abs(x[i]) if scales.follow else 0.0)
        ahead, behind = x[i] + h <= high[i], x[i] - h >= low[i]
        shifts: tuple[tuple[float, float], ...]
        if ahead and behind:
            shifts = ((h, 1.0), (-h, -1.0))
        elif behind:
            shifts = ((0.0, 3.0), (-h, -4.0), (-2 * h, 1.0))
        else:
            shifts = ((0.0, -3.0), (h, 4.0), (2 * h, -1.0))
        row = []
        for shift, weight in shifts:
            point = x.copy()
            point[i] += shift
            row.append((len(points), weight / (2 * h)))
            points.append(point)
        weights.append(row)
    if not points:
        return np.zeros((len(f(x)), 0))
    together = getattr(f, "together", None)
    values = [f(point) for point in points] if together is None else together(points)
    return np.column_stack([sum(w * values[at] for at, w in row) for row in weights])


def solve(
    residuals: Residuals,
    scales: Scales,
    *,
    jacobian: Jacobian | None = None,
    loss: Loss = "linear",
    width: float = 1.0,
    starts: Sequence[Floats] = (),
    most: int = 2000,
    polish: bool = True,
    tolerance: float = TOLERANCE,
) -> Solution:
    """The parameters that minimise the sum of losses of the residuals.

    Parameters
    ----------
    residuals : parameters [shape (n,)] to residuals [shape (m,)] in units of their deviation
    scales : start, bounds and sizes of the parameters
    jacobian : its derivative [shape (m, n)]; None: what ``residuals.jacobian(parameters, scales)``
        gives, where it has that, else central differences
    loss, width : robust loss, and the residual beyond which it takes effect
    starts : further starting points, each of shape (n,); the lowest minimum counts
    most : evaluations after which a start is given up
    polish : minimise once more from the minimum, with the sizes found there
    tolerance : relative change of squares, parameters and slope below which it is done
    """
    once = _from if polish else _once
    how = _How(loss, width, most, tolerance)
    found = [
        once(residuals, replace(scales, start=np.asarray(x, float)), jacobian, how)
        for x in (scales.start, *starts)
    ]
    best = min(found, key=lambda one: (not np.isfinite(one.cost), one.cost))
    evaluations = sum(one.evaluations for one in found)
    return replace(best, evaluations=evaluations, minima=tuple(one.cost for one in found))


@dataclass(frozen=True)
class _How:
    loss: Loss
    width: float
    most: int
    tolerance: float


class _Inner:
    """The problem in inner coordinates z: parameters = start + size (basis z)."""

    def __init__(self, f: Residuals, scales: Scales, jacobian: Jacobian | None) -> None:
        self.f, self.scales, self.given = f, scales, jacobian
        size = scales.size
        basis = np.eye(len(size)) if scales.basis is None else scales.basis
        self.matrix = size[:, None] * basis
        self.evaluations = 0
        # The method and we ask for the same point again: what it gave last is kept.
        self.last: tuple[bytes, Floats] = (b"", np.zeros(0))
        self.last_slope: tuple[bytes, Floats] = (b"", np.zeros((0, 0)))

    def outer(self, z: Floats) -> Floats:
        x: Floats = self.scales.start + self.matrix @ z
        return np.asarray(np.clip(x, self.scales.low, self.scales.high))

    def residuals(self, z: Floats) -> Floats:
        x = self.outer(z)
        if self.last[0] != x.tobytes():
            self.last = (x.tobytes(), self.at(x))
        return self.last[1].copy()

    def at(self, x: Floats) -> Floats:
        self.evaluations += 1
        with np.errstate(all="ignore"):
            return _finite(np.asarray(self.f(x), float))

    def slope(self, x: Floats) -> Floats:
        if self.given is not None:
            return np.asarray(self.given(x), float)
        if self.last_slope[0] != x.tobytes():
            own = getattr(self.f, "jacobian", None)
            if own is None:
                found = differences(_Watched(self), x, self.scales)
            else:
                found = np.asarray(own(x, self.scales), float)
            self.last_slope = (x.tobytes(), found)
        return self.last_slope[1].copy()

    def jacobian(self, z: Floats) -> Floats:
        return np.asarray(self.slope(self.outer(z)) @ self.matrix)


class _Watched:
    """Residuals made finite and counted, one point at a time or several together."""

    def __init__(self, inner: _Inner) -> None:
        self.inner = inner

    def __call__(self, x: Floats) -> Floats:
        return self.inner.at(x)

    def together(self, points: Sequence[Floats]) -> list[Floats]:
        several = getattr(self.inner.f, "together", None)
        if several is None:
            return [self.inner.at(x) for x in points]
        self.inner.evaluations += len(points)
        with np.errstate(all="ignore"):
            return [_finite(np.asarray(r, float)) for r in several(points)]


def _finite(r: Floats) -> Floats:
    """A step too far may overflow; large finite residuals make the method take a smaller one."""
    r = np.nan_to_num(r, nan=1e150, posinf=1e150, neginf=-1e150)
    return np.asarray(np.clip(r, -1e150, 1e150))


def _from(
    f: Residuals,
    scales: Scales,
    jacobian: Jacobian | None,
    how: _How,
) -> Solution:
    """One start, and once more from where it led: a far start makes poor sizes for differences."""
    first = _once(f, scales, jacobian, how)
    size = scales.size
    if scales.follow:
        size = np.where(first.values == 0, size, np.minimum(size, np.abs(first.values)))
    closer = replace(scales, start=first.values, size=size)
    second = _once(f, closer, jacobian, how)
    better = second.converged and second.cost <= first.cost * (1 + 1e-12)
    kept = second if better else first
    return replace(kept, evaluations=first.evaluations + second.evaluations)


def _once(
    f: Residuals,
    scales: Scales,
    jacobian: Jacobian | None,
    how: _How,
) -> Solution:
    from scipy.optimize import least_squares

    inner = _Inner(f, scales, jacobian)
    n = len(scales.start)
    # Sizes are the scaling: MINPACK's own, by the columns of J, jumps too far from a poor start.
    options: dict[str, Any] = {
        "ftol": how.tolerance,
        "xtol": how.tolerance,
        "gtol": how.tolerance,
        "x_scale": 1.0,
    }
    options |= {"jac": inner.jacobian, "max_nfev": how.most, "loss": how.loss, "f_scale": how.width}
    bounded = scales.is_bounded and scales.basis is None
    if bounded:
        low, high = (side - scales.start for side in (scales.low, scales.high))
        options["bounds"] = (low / scales.size, high / scales.size)
    plain = how.loss == "linear" and not bounded and len(inner.residuals(np.zeros(n))) >= n
    options["method"] = "lm" if plain else "trf"
    with np.errstate(all="ignore"):
        try:
            found = least_squares(inner.residuals, np.zeros(n), **options)
            message, status, z = str(found.message), int(found.status), np.asarray(found.x)
        except (ValueError, ArithmeticError, np.linalg.LinAlgError) as error:
            message, status, z = str(error), -1, np.zeros(n)
    x = inner.outer(z)
    residuals = inner.residuals(z)
    return Solution(
        values=x,
        residuals=residuals,
        jacobian=inner.slope(x),
        cost=_cost(residuals, how.loss, how.width),
        at_bound=_at_bound(x, scales),
        converged=status > 0 and bool(np.all(np.abs(residuals) < 1e149)),
        message=message,
        evaluations=inner.evaluations,
        size=scales.size,
        loss=how.loss,
        width=how.width,
    )


def _at_bound(x: Floats, scales: Scales) -> np.ndarray:
    near = 1e-9 * np.maximum(scales.size, np.abs(x))
    return (x - scales.low <= near) | (scales.high - x <= near)


def _cost(residuals: Floats, loss: Loss, width: float) -> float:
    z = (residuals / width) ** 2
    return float(0.5 * width**2 * np.sum(_rho(z, loss)))


def _rho(z: Floats, loss: Loss) -> Floats:
    """The loss of squared residuals z, as scipy.optimize.least_squares defines it."""
    if loss == "soft_l1":
        return np.asarray(2 * (np.sqrt(1 + z) - 1))
    if loss == "huber":
        return np.where(z <= 1, z, 2 * np.sqrt(np.maximum(z, 1)) - 1)
    if loss == "cauchy":
        return np.log1p(z)
    return z
