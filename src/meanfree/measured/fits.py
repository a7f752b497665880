"""What a fit is asked and what it answers, as records."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np

from meanfree.equations.system import Floats
from meanfree.measured.judging import RunsTest
from meanfree.measured.least_squares import Loss, Solution
from meanfree.measured.misfit import Misfit
from meanfree.measured.parameters import Asked, Parameter
from meanfree.measured.profiles import Profile
from meanfree.measured.runs import MeasuredRun

LEVEL: Final[float] = 0.95


@dataclass(frozen=True)
class FitRequest:
    """What shall be fitted to what.

    ``starts`` counts starting points: the first is the case's own values, the others are drawn
    around it, the same for the same ``seed``.
    """

    runs: tuple[MeasuredRun, ...]
    asked: tuple[Asked, ...]
    loss: Loss = "linear"
    starts: int = 1
    seed: int = 1
    intervals: bool = True


@dataclass(frozen=True)
class Estimate:
    """One fitted number in the file's unit and counting.

    ``stderr`` is infinite or nan where nothing is known; ``low`` and ``high`` bound the 95 %
    interval (infinite: open); ``profile`` is in inner coordinates, None where the interval comes
    from the standard error.
    """

    parameter: Parameter
    value: float
    stderr: float
    low: float
    high: float
    at_bound: bool
    profile: Profile | None


@dataclass(frozen=True)
class Fit:
    """A fit.

    ``inner`` are the inner coordinates at the minimum and ``covariance`` theirs (deviations
    applied, also estimated ones). ``freedom`` is the number of readings and priors less that of
    parameters. ``findings`` are what a reader should know, in sentences.
    """

    request: FitRequest
    misfit: Misfit
    solution: Solution
    covariance: Floats
    estimates: tuple[Estimate, ...]
    freedom: int
    runs_tests: tuple[RunsTest | None, ...]
    findings: tuple[str, ...]
    temperature: float | None

    @property
    def parameters(self) -> tuple[Parameter, ...]:
        """The fitted parameters."""
        return self.misfit.parameters

    @property
    def inner(self) -> Floats:
        """Inner coordinates at the minimum."""
        return self.solution.values

    @property
    def values(self) -> Floats:
        """The estimates in the file's unit [shape (n,)]."""
        return self.misfit.natural(self.inner)

    @cached_property
    def correlation(self) -> Floats:
        """Correlations of the inner coordinates; nan where one is not determined."""
        return correlations(self.covariance)

    @property
    def deviations_estimated(self) -> bool:
        """True where the scatter about the fit told a standard deviation."""
        return any(self.misfit.groups)

    @property
    def chi_square(self) -> float:
        """Sum of squares over the deviations: tells something where those were given."""
        return self.solution.sum_of_squares

    @property
    def reduced_chi_square(self) -> float:
        """Chi-square a degree of freedom; nan where there is none."""
        return self.chi_square / self.freedom if self.freedom > 0 else math.nan

    @property
    def log_likelihood(self) -> float:
        """ln L at the minimum."""
        return self.misfit.log_likelihood(self.solution.residuals)

    @property
    def quantile(self) -> float:
        """Student's t (the normal one where all deviations were given) of a 95 % interval."""
        return quantile(self.freedom if self.deviations_estimated else None)

    def estimate(self, address: str) -> Estimate:
        """The estimate at an address. Raises KeyError where that was not fitted."""
        for one in self.estimates:
            if one.parameter.address == address:
                return one
        raise KeyError(address)

    def residuals_of(self, place: int) -> Floats:
        """Residuals of a run in standard deviations, in order of time [shape (n,)]."""
        start = sum(self.misfit.sizes[:place])
        return self.solution.residuals[start : start + self.misfit.sizes[place]]


def quantile(freedom: int | None, level: float = LEVEL) -> float:
    """Two-sided quantile of Student's t with that freedom; of the normal law for None."""
    from scipy.stats import norm, t

    if freedom is None:
        return float(norm.ppf(0.5 + level / 2))
    return float(t.ppf(0.5 + level / 2, freedom)) if freedom > 0 else math.inf


def correlations(cov: Floats) -> Floats:
    """Correlations that go with a covariance; nan where a variance is zero or infinite."""
    sd = np.sqrt(np.diag(cov))
    usable = np.isfinite(sd) & (sd > 0)
    safe = np.where(usable, sd, np.nan)
    return np.asarray(cov / np.outer(safe, safe))
