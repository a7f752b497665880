"""Initial rates: how fast a run begins, against what was filled; the slope of the logarithms is
the order, from runs of any length and without a law to integrate.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.constants import N_A, R
from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.straight_lines import Interval, Line, straight_line, widened

LEAST = 4
"""Readings that a parabola with an error needs."""

SURE = 3.0
"""A cubic term of so many standard errors says that a parabola does not do."""


@dataclass(frozen=True)
class InitialRate:
    """How fast a gas is lost at the start of one run.

    ``rate`` [mol/m^3/s] with its standard error, at ``concentration`` [mol/m^3]; from ``count``
    readings. ``off`` [1] is by what share of itself the rate of a cubic is above it, 0 where the
    readings do not ask for a cubic.
    """

    run: str
    concentration: float
    rate: float
    error: float
    count: int
    off: float = 0.0


@dataclass(frozen=True)
class InitialRates:
    """ln(rate) against ln(concentration): ``order``, and ``k`` for the loss of the gas [SI]."""

    gas: str
    rates: tuple[InitialRate, ...]
    line: Line
    order: Interval
    ln_k: Interval
    words: tuple[str, ...]


def initial_rates(
    runs: Sequence[MeasuredRun], gas: str, until: float | None = None
) -> InitialRates:
    """Initial rates of loss of a gas, and its order from them.

    ``until`` [s] ends the readings that count; None: the first quarter of each run's, at least
    four. A parabola through them gives the slope at time zero.

    Raises InputError where there are fewer than three fills or too few readings.
    """
    found = [initial_rate(run, gas, until) for run in runs]
    if len({round(math.log(one.concentration), 6) for one in found}) < 3:
        text = f"{len(found)} runs in too few concentrations of {gas}"
        raise InputError.at("fit.analyses", text, "three different concentrations or more")
    lost = [one.run for one in found if one.rate <= 0]
    if lost:
        text = f"{lost[0]}, in which {gas} is not lost at the start"
        raise InputError.at("fit.analyses", text, "runs in which it falls")
    x = np.log([one.concentration for one in found])
    y = np.log([one.rate for one in found])
    sd = np.array([one.error / one.rate for one in found])
    middle = float(np.average(x, weights=1 / sd**2))
    line = widened(straight_line(x, y, sd))
    order, ln_k = line.slope_interval, line.intercept_interval
    words = [
        f"Initial rates of loss of {gas} rise with order {order.value:.2f} in it "
        f"(95 %: {order.low:.2f} to {order.high:.2f}), around {math.exp(middle):.3g} mol/m³."
    ]
    bent = [one for one in found if one.off != 0]
    if bent:
        names = ", ".join(one.run for one in bent)
        most = max(abs(one.off) for one in bent)
        words.append(
            f"Up to there the readings of {names} bend more than a parabola can: initial rates are "
            f"off by as much as {most:.2g} of themselves, and so is the order. Let fewer readings "
            "count, by an earlier until."
        )
    return InitialRates(gas, tuple(found), line, order, ln_k, tuple(words))


def initial_rate(run: MeasuredRun, gas: str, until: float | None) -> InitialRate:
    """The initial rate of one run."""
    readings, experiment = run.readings, run.experiment
    T = experiment.temperature.initial
    start = experiment.moles.get(gas, 0.0) / experiment.initial_volume
    if start <= 0:
        raise InputError.at(
            "fit.analyses", f"{gas}, which {run.name} does not fill", "a filled gas"
        )
    last = readings.times[-1] / 4 if until is None else until
    count = int(np.sum(readings.times <= last * (1 + 1e-12)))
    count = max(count, LEAST) if until is None else count
    if min(count, len(readings)) < LEAST:
        found = f"{count} readings of {run.name} up to {last:g} s"
        raise InputError.at("fit.analyses", found, f"at least {LEAST}")
    t, y = readings.times[:count], readings.values[:count]
    w = np.ones(count) if readings.sd is None else 1 / readings.sd[:count]
    known = readings.sd is not None
    coefficients, cov = _polynomial(t, y, w, 2, known)
    slope, error = float(coefficients[1]), math.sqrt(float(cov[1, 1]))
    off = 0.0
    if count > LEAST + 1:
        cubic, its = _polynomial(t, y, w, 3, known)
        if abs(float(cubic[3])) > SURE * math.sqrt(float(its[3, 3])) and slope != 0:
            off = float(cubic[1]) / slope - 1
    factor = _loss_per_signal(run, gas, T, start)
    return InitialRate(run.name, start, slope * factor, abs(error * factor), count, off)


def _polynomial(t: Floats, y: Floats, w: Floats, degree: int, known: bool) -> tuple[Floats, Floats]:
    """Coefficients, the lowest power first, and their covariance; weights are 1/sd where known."""
    width = float(t[-1]) or 1.0
    A = (t[:, None] / width) ** np.arange(degree + 1)
    coefficients, *_ = np.linalg.lstsq(A * w[:, None], y * w, rcond=None)
    cov = np.linalg.inv((A * w[:, None]).T @ (A * w[:, None]))
    if not known:
        r = y - A @ coefficients
        cov = cov * max(float(r @ r) / (len(t) - degree - 1), 1e-300)
    scale = width ** -np.arange(degree + 1.0)
    return np.asarray(coefficients * scale), np.asarray(cov * np.outer(scale, scale))


def _loss_per_signal(run: MeasuredRun, gas: str, T: float, start: float) -> float:
    """Loss of the gas [mol/m^3] a unit of signal gained."""
    signal = run.readings.signal
    if signal.kind == "total pressure":
        step = next((s for s in run.experiment.steps if s.net.get(gas, 0.0) < 0), None)
        change = 0.0 if step is None else step.change_of_moles
        if step is None or change == 0:
            found = f"the total pressure, which does not tell the loss of {gas}"
            raise InputError.at("fit.analyses", found, "another signal")
        return -step.net[gas] / change / (R * T)
    if signal.gases != (gas,):
        found = f"{signal.words}, which does not tell {gas} alone"
        raise InputError.at("fit.analyses", found, f"a signal of {gas}")
    factors = {
        "concentration": -1.0,
        "partial pressure": -1 / (R * T),
        "number density": -1 / N_A,
        "conversion": start,
    }
    if signal.kind not in factors:
        raise InputError.at("fit.analyses", signal.words, "a concentration, pressure or conversion")
    return factors[signal.kind]


def curve_of(rates: InitialRates, concentrations: Floats) -> Floats:
    """The fitted rate [mol/m^3/s] at concentrations [mol/m^3]."""
    return np.asarray(np.exp(rates.line.at(np.log(concentrations))))
