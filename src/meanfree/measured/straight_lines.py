"""Straight lines by least squares, with everything that is read off one."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from meanfree.equations.system import Floats
from meanfree.measured.fits import quantile


@dataclass(frozen=True)
class Interval:
    """A number with its standard error and its 95 % interval, all in the same unit."""

    value: float
    error: float
    low: float
    high: float


def interval(value: float, error: float, t: float) -> Interval:
    """A number with t standard errors to either side."""
    return Interval(value, error, value - t * error, value + t * error)


@dataclass(frozen=True)
class Line:
    """y = intercept + slope x.

    Errors are standard errors, in the units of their number; ``covariance`` is that of
    (intercept, slope); ``freedom`` the degrees of freedom, None where the deviations of y were
    given; ``x`` and ``y`` the points; ``through_origin`` where the intercept was held at zero.
    """

    slope: float
    intercept: float
    covariance: Floats
    r_squared: float
    freedom: int | None
    x: Floats
    y: Floats
    sd: Floats | None
    chi_square: float
    through_origin: bool = False

    @property
    def slope_error(self) -> float:
        """Standard error of the slope."""
        return math.sqrt(max(float(self.covariance[1, 1]), 0.0))

    @property
    def intercept_error(self) -> float:
        """Standard error of the intercept."""
        return math.sqrt(max(float(self.covariance[0, 0]), 0.0))

    @property
    def quantile(self) -> float:
        """Student's t (or the normal one) of a 95 % interval."""
        return quantile(self.freedom)

    @property
    def slope_interval(self) -> Interval:
        """The slope with its 95 % interval."""
        return interval(self.slope, self.slope_error, self.quantile)

    @property
    def intercept_interval(self) -> Interval:
        """The intercept with its 95 % interval."""
        return interval(self.intercept, self.intercept_error, self.quantile)

    def at(self, x: Floats) -> Floats:
        """The line [shape of x]."""
        return np.asarray(self.intercept + self.slope * x)

    def error_at(self, x: Floats) -> Floats:
        """Standard error of the line at x [shape of x]."""
        rows = np.stack([np.ones_like(x), x])
        variance = np.einsum("i...,ij,j...->...", rows, self.covariance, rows)
        return np.asarray(np.sqrt(np.maximum(variance, 0.0)))


def straight_line(
    x: Floats, y: Floats, sd: Floats | None = None, *, through_origin: bool = False
) -> Line:
    """The line through points [shape (n,)] by (weighted) least squares.

    ``sd`` [shape (n,)] are the standard deviations of y; None: all alike, told by the scatter.

    Raises ValueError for fewer points than the line has numbers, or for x all alike.

    Source: any text on statistics, for example Draper and Smith, Applied Regression Analysis,
    3rd ed. 1998, chapter 1.
    """
    x, y = np.asarray(x, float), np.asarray(y, float)
    count = 1 if through_origin else 2
    if len(x) < count + (1 if sd is None else 0):
        raise ValueError(f"{len(x)} points; a line with its error needs at least {count + 1}")
    if not through_origin and float(np.ptp(x)) == 0:
        raise ValueError("every x is the same")
    w = np.ones(len(x)) if sd is None else 1.0 / np.asarray(sd, float)
    design = np.stack([np.zeros(len(x)) if through_origin else np.ones(len(x)), x], axis=1)
    A = design * w[:, None]
    used = A[:, 1:] if through_origin else A
    q, r = np.linalg.qr(used)
    found = np.linalg.solve(r, q.T @ (y * w))
    inverse = np.linalg.inv(r)
    cov = np.zeros((2, 2))
    cov[2 - count :, 2 - count :] = inverse @ inverse.T
    intercept, slope = (0.0, float(found[0])) if through_origin else map(float, found)
    residuals = (y - intercept - slope * x) * w
    squares = float(residuals @ residuals)
    freedom = len(x) - count
    if sd is None:
        cov = cov * squares / freedom
    middle = 0.0 if through_origin else float(np.average(y, weights=w**2))
    whole = float(np.sum(((y - middle) * w) ** 2))
    r_squared = 1 - squares / whole if whole > 0 else math.nan
    given = freedom if sd is None else None
    return Line(slope, intercept, cov, r_squared, given, x, y, sd, squares, through_origin)


def widened(line: Line) -> Line:
    """A weighted line whose points scatter more than their errors say: errors by the scatter.

    The factor is the root of the reduced chi-square (Birge, Phys. Rev. 40 (1932) 207), and the
    interval then that of Student's t.
    """
    freedom = len(line.x) - (1 if line.through_origin else 2)
    if line.freedom is not None or freedom < 1 or line.chi_square <= freedom:
        return line
    scale = line.chi_square / freedom
    return replace(line, covariance=line.covariance * scale, freedom=freedom)


def correlated_line(
    x: Floats, y: Floats, covariance: Floats, *, known: bool, through_origin: bool = False
) -> Line:
    """The line through points whose errors go together: generalised least squares.

    ``covariance`` [shape (n, n)] is that of y; where it is not ``known`` it holds up to a factor,
    which the scatter tells. Source: Draper and Smith, Applied Regression Analysis, 3rd ed. 1998,
    section 9.2.
    """
    lower = np.linalg.cholesky(covariance)
    ones = np.zeros(len(x)) if through_origin else np.ones(len(x))
    design = np.linalg.solve(lower, np.stack([ones, x], axis=1))
    target = np.linalg.solve(lower, y)
    used = design[:, 1:] if through_origin else design
    inverse = np.linalg.inv(used.T @ used)
    found = inverse @ (used.T @ target)
    residuals = target - used @ found
    squares, count = float(residuals @ residuals), used.shape[1]
    cov = np.zeros((2, 2))
    cov[2 - count :, 2 - count :] = inverse
    freedom = len(x) - count
    if not known:
        cov = cov * squares / freedom
    intercept, slope = (0.0, float(found[0])) if through_origin else map(float, found)
    sd = np.sqrt(np.diag(covariance)) if known else None
    plain = y - intercept - slope * x
    r_squared = 1 - float(plain @ plain) / float(np.sum((y - y.mean()) ** 2))
    given = None if known else freedom
    return Line(
        slope, intercept, cov, r_squared, given, x, y, sd, squares, through_origin=through_origin
    )
