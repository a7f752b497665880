"""Fits: all runs at once, with errors, correlations, intervals, and words where these mislead."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Final

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.measured import judging
from meanfree.measured.covariances import covariance
from meanfree.measured.fits import Estimate, Fit, FitRequest, quantile
from meanfree.measured.judging import runs_test
from meanfree.measured.least_squares import Loss, Scales, Solution, solve
from meanfree.measured.misfit import Misfit
from meanfree.measured.parameters import Parameter, parameters_of, scales_of
from meanfree.measured.profiles import BetterMinimum, Profile, profile
from meanfree.measured.runs import MeasuredRun

DECADES: Final[tuple[int, ...]] = (-12, -9, -6, -4, -3, -2, -1, 1, 2, 3, 4, 6, 9, 12)
"""Powers of ten by which a guess is tried to be off."""

MOST_FACTOR: Final[float] = 23.0
"""Logarithm of the factor (1e10) by which a positive number may differ within its interval."""

WIDTHS: Final[dict[str, float]] = {"linear": 1.0, "soft_l1": 1.0, "huber": 1.345, "cauchy": 2.385}
"""Residuals, in deviations, beyond which a robust loss takes effect: 95 % efficiency for Gaussian
scatter (Rey, Introduction to Robust and Quasi-Robust Statistical Methods, 1983, section 6.4)."""


def fit(request: FitRequest) -> Fit:
    """Fit the parameters of a request to its runs.

    Raises
    ------
    InputError
        A parameter is not there, or there are more parameters than readings.
    ComputationError
        The minimum was not found.
    """
    parameters = parameters_of(request.runs, request.asked)
    T = middle_temperature(request.runs)
    misfit = Misfit(request.runs, parameters)
    _enough(misfit)
    scales = scales_of(parameters, T)
    misfit, solution = _minimised(misfit, scales, request)
    for _ in range(3):
        cov = covariance(solution)
        try:
            profiles = _profiles(request, misfit, solution, cov, scales)
            break
        except BetterMinimum as news:
            better = replace(scales, start=news.values)
            misfit, solution = _minimised(misfit, better, request)
    else:
        raise ComputationError("The fit has no minimum that stays one: every profile goes lower.")
    return _told(request, misfit, solution, cov, profiles, T)


def middle_temperature(runs: Sequence[MeasuredRun]) -> float | None:
    """Harmonic mean of the temperatures of all readings [K]; None where there is but one."""
    inverse: list[float] = []
    for run in runs:
        if run.readings.signal.is_rate_constant:
            inverse.extend(1.0 / run.readings.times)
        else:
            inverse.extend([1.0 / run.experiment.temperature.initial] * len(run.readings))
    return len(inverse) / sum(inverse)


def _enough(misfit: Misfit) -> None:
    data = misfit.n_readings + len(misfit.priors)
    count = len(misfit.parameters)
    needed = count + 1 if any(misfit.groups) else count
    if data < needed:
        raise InputError.at(
            "fit.parameters",
            f"{count} parameters for {misfit.n_readings} readings",
            f"at most {max(data - needed + count, 0)}, or more readings",
        )


def _minimised(misfit: Misfit, scales: Scales, request: FitRequest) -> tuple[Misfit, Solution]:
    """The minimum, with estimated deviations brought in line with the scatter about it."""
    width = WIDTHS[request.loss]
    starts = [*_starts(scales, request), *_from_afar(misfit, scales)]
    solution = _checked(solve(misfit, scales, loss=request.loss, width=width, starts=starts))
    if not any(misfit.groups):
        return misfit, solution
    alone = len(set(misfit.groups)) == 1 and not misfit.priors and request.loss == "linear"
    for _ in range(100):
        before = misfit.estimates
        after = _scatter(misfit, solution, request.loss)
        misfit = misfit.with_deviations(after)
        if alone:
            # One common deviation scales everything alike: the minimum stays where it is.
            ratio = before[misfit.groups[0]] / after[misfit.groups[0]]
            return misfit, _rescaled(solution, ratio)
        again = replace(scales, start=solution.values)
        solution = _checked(solve(misfit, again, loss=request.loss, width=width))
        if all(abs(after[g] / before[g] - 1) < 1e-6 for g in after if g in misfit.groups):
            return misfit, solution
    raise ComputationError("The scatter of the readings could not be estimated: it keeps changing.")


def _starts(scales: Scales, request: FitRequest) -> list[Floats]:
    """Further starts: a factor of e or so around the first, from a fixed seed."""
    random = np.random.default_rng(request.seed)
    matrix = np.diag(scales.size)
    if scales.basis is not None:
        matrix = scales.size[:, None] * scales.basis
    drawn = random.normal(size=(max(request.starts - 1, 0), len(scales.start)))
    return [np.clip(scales.start + matrix @ z, scales.low, scales.high) for z in drawn]


def _from_afar(misfit: Misfit, scales: Scales) -> list[Floats]:
    """A better start, where one rate constant by some power of ten makes the readings likelier.

    A guess that is off by decades leaves nothing or everything to react, and no slope to follow.
    """
    rows = [scales.start]
    for i, parameter in enumerate(misfit.parameters):
        if not (parameter.logarithmic and parameter.key.startswith("steps.")):
            continue
        for decades in DECADES:
            row = scales.start.copy()
            row[i] += decades * math.log(10)
            if scales.low[i] <= row[i] <= scales.high[i]:
                rows.append(row)
    squares = [float(r @ r) for r in misfit.together(rows)]
    best = int(np.argmin(squares))
    return [rows[best]] if squares[best] < 0.5 * squares[0] else []


def _checked(solution: Solution) -> Solution:
    if solution.converged and np.all(np.abs(solution.residuals) < 1e100):
        return solution
    raise ComputationError(
        "The fit failed: no minimum was found from where the case starts "
        f"({solution.message.strip().rstrip('.')}). "
        "Start nearer, set bounds, or ask for more starts."
    )


def _rescaled(solution: Solution, ratio: float) -> Solution:
    return replace(
        solution,
        residuals=solution.residuals * ratio,
        jacobian=solution.jacobian * ratio,
        cost=solution.cost * ratio**2,
    )


def _scatter(misfit: Misfit, solution: Solution, loss: Loss) -> dict[str, float]:
    """Standard deviation of each kind of reading, from the residuals about the minimum.

    Each kind's share of the degrees of freedom is its readings less their leverage. With a robust
    loss, 1.4826 times the median absolute residual (Huber, Robust Statistics, 1981, chapter 5).
    """
    free = solution.free
    J = solution.jacobian[:, free]
    q, _ = np.linalg.qr(J) if J.shape[1] else (np.zeros((len(J), 0)), None)
    leverage = np.sum(q**2, axis=1)
    found = dict(misfit.estimates)
    start = 0
    rows: dict[str, list[int]] = {}
    for group, size in zip(misfit.groups, misfit.sizes, strict=True):
        if group:
            rows.setdefault(group, []).extend(range(start, start + size))
        start += size
    for group, places in rows.items():
        r = solution.residuals[places]
        if loss == "linear":
            left = max(len(places) - float(leverage[places].sum()), 1e-9)
            scatter = math.sqrt(float(r @ r) / left)
        else:
            scatter = 1.4826 * float(np.median(np.abs(r)))
        # Readings without any scatter (made up, or rounded to nothing) still need a deviation.
        found[group] = misfit.estimates[group] * max(scatter, 1e-9)
    return found


def _profiles(
    request: FitRequest, misfit: Misfit, solution: Solution, cov: Floats, scales: Scales
) -> list[Profile | None]:
    if not request.intervals or request.loss != "linear":
        return [None] * len(misfit.parameters)
    n = misfit.n_readings + len(misfit.priors) - len(misfit.parameters)
    threshold = quantile(n if any(misfit.groups) else None) ** 2
    return [
        profile(
            misfit, solution, cov, i, threshold, scales, MOST_FACTOR if p.logarithmic else math.inf
        )
        for i, p in enumerate(misfit.parameters)
    ]


def _told(
    request: FitRequest,
    misfit: Misfit,
    solution: Solution,
    cov: Floats,
    profiles: Sequence[Profile | None],
    T: float | None,
) -> Fit:
    freedom = misfit.n_readings + len(misfit.priors) - len(misfit.parameters)
    t = quantile(freedom if any(misfit.groups) else None)
    estimates = tuple(
        _estimate(p, float(solution.values[i]), float(cov[i, i]), t, profiles[i], bool(at))
        for i, (p, at) in enumerate(zip(misfit.parameters, solution.at_bound, strict=True))
    )
    tests, start = [], 0
    for size in misfit.sizes:
        tests.append(runs_test(solution.residuals[start : start + size]))
        start += size
    found = Fit(request, misfit, solution, cov, estimates, freedom, tuple(tests), (), T)
    return replace(found, findings=tuple(_findings(found)))


def _estimate(
    parameter: Parameter, u: float, variance: float, t: float, found: Profile | None, at: bool
) -> Estimate:
    sd = math.sqrt(variance) if variance >= 0 else math.nan
    value = parameter.outer(u)
    low, high = (u - t * sd, u + t * sd) if found is None else (found.low, found.high)
    if at and found is None:
        low = high = u
    ends = [
        (0.0 if end < 0 else math.inf)
        if parameter.logarithmic and not abs(end) < 700
        else parameter.outer(end)
        for end in (low, high)
    ]
    stderr = value * sd if parameter.logarithmic else sd
    return Estimate(parameter, value, math.nan if at else stderr, ends[0], ends[1], at, found)


def _has_limit(one: Estimate) -> bool:
    """True where a profile bounds an estimate on one side at least."""
    low_open = not one.low > (0.0 if one.parameter.logarithmic else -math.inf)
    return one.profile is not None and not (low_open and not one.high < math.inf)


def _findings(found: Fit) -> list[str]:
    """What a reader should know, the gravest first."""
    # On a plateau nothing changes with a number, yet its profile may find where that begins.
    limited = [one.parameter.address for one in found.estimates if _has_limit(one)]
    said = [
        text
        for text in judging.undetermined(found.solution, found.parameters)
        if not any(text.startswith(f"The readings do not depend on {name}:") for name in limited)
    ]
    named = " ".join(said)
    for one in found.estimates:
        name = one.parameter.address
        if one.at_bound:
            said.append(f"{name} rests on its bound, {one.value:g} {one.parameter.unit}.".strip())
        elif name not in named:
            low_open = not one.low > (0.0 if one.parameter.logarithmic else -math.inf)
            said.append(judging.open_interval(name, low_open, not one.high < math.inf))
    said += judging.moving_together(found.correlation, found.parameters)
    if not found.deviations_estimated and found.freedom > 0:
        said.append(judging.of_scatter(found.reduced_chi_square, found.freedom))
    for run, test in zip(found.request.runs, found.runs_tests, strict=True):
        said.append(judging.of_runs(run.name, test))
    said += [note for run in found.request.runs for note in run.readings.notes]
    if found.request.loss != "linear":
        said.append(
            f"A robust loss ({found.request.loss}) makes far readings count less; intervals come "
            "from standard errors."
        )
    return list(dict.fromkeys(text for text in said if text))
