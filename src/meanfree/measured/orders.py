"""Is it second order at all? A step's order in a gas, ranked among the usual ones and fitted."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.measured.evidence import Candidate, evidence, ranked
from meanfree.measured.fits import Fit, FitRequest, quantile
from meanfree.measured.fitting import fit
from meanfree.measured.parameters import Asked
from meanfree.rates.law import Law

USUAL: Final[tuple[float, ...]] = (0.0, 0.5, 1.0, 1.5, 2.0, 3.0)
LOWEST, HIGHEST = -1.0, 5.0


@dataclass(frozen=True)
class OrderTest:
    """The order of a step in a gas.

    ``candidates`` are the ranked orders. ``order`` is the best one, with its standard error and
    the limits of its 95 % interval (profile likelihood; infinite: open); ``points`` are the
    (order, excess of the sum of squares) met on the way.
    """

    step: str
    gas: str
    candidates: tuple[Candidate, ...]
    order: float
    error: float
    low: float
    high: float
    points: tuple[tuple[float, float], ...]
    words: str


def applicable(request: FitRequest) -> tuple[str, str] | None:
    """(step, gas) of a fit with one step and one reactant, whose order is worth asking about."""
    if not request.runs or any(run.readings.signal.is_rate_constant for run in request.runs):
        return None
    experiment = request.runs[0].experiment
    if len(experiment.steps) != 1 or experiment.steps[0].reverse is not None:
        return None
    step = experiment.steps[0]
    orders = {gas: order for gas, order in step.orders.items() if order != 0}
    if len(orders) != 1 or not _has_one_constant(step.law):
        return None
    gas = next(iter(orders))
    address = f"steps.{step.name}.{step.law.counted}"
    asked = address in {one.address for one in request.asked}
    return (step.name, gas) if asked and step.net.get(gas, 0.0) < 0 else None


def order_test(
    request: FitRequest, step: str, gas: str, orders: Sequence[float] = USUAL
) -> OrderTest:
    """Rank orders of a step in a gas, and find the best order with its interval.

    Raises
    ------
    InputError
        There is no such step, its rate constant is several numbers or is not fitted, or it does
        not use the gas.
    ComputationError
        None of the orders could be fitted.
    """
    _check(request, step, gas)
    search = _Search(request, step, gas)
    tried: list[tuple[str, Fit]] = []
    for order in orders:
        found = search.fit_at(order)
        if found is not None:
            tried.append((f"order {order:g}", found))
    if not tried:
        raise ComputationError("The order could not be tested: no order could be fitted.")
    candidates = ranked(tried)
    best, error, low, high = search.interval()
    words = evidence(candidates)
    return OrderTest(
        step, gas, candidates, best, error, low, high, tuple(sorted(search.seen.items())), words
    )


def _check(request: FitRequest, step: str, gas: str) -> None:
    for run in request.runs:
        named = {one.name: one for one in run.experiment.steps}
        if step not in named:
            raise InputError.at("fit.order.step", f'"{step}"', f"one of {', '.join(named)}")
        law = named[step].law
        address = f"steps.{step}.{law.counted}"
        if law.counted and not _has_one_constant(law):
            found = f'"{step}" with law = "{law.word}", whose rate constant is several numbers'
            expected = 'a step with one k or A, such as law = "fixed" or "arrhenius"'
            raise InputError.at("fit.order.step", found, expected)
        if not law.counted or address not in {one.address for one in request.asked}:
            expected = f"a fitted {address}" if law.counted else "a step with a k or an A"
            raise InputError.at("fit.order.step", f'"{step}", whose k is not fitted', expected)
        if named[step].net.get(gas, 0.0) >= 0:
            raise InputError.at("fit.order.gas", f'"{gas}"', f"a gas that {step} uses up")


def _has_one_constant(law: Law) -> bool:
    """True where one number of the law carries the unit of its rate constant.

    Another order asks for another unit: all numbers of a table or of two limits would change.
    """
    return bool(law.counted) and "." not in law.counted


class _Search:
    """Fits of a request with the order of one step changed, each order once."""

    def __init__(self, request: FitRequest, step: str, gas: str) -> None:
        self.request, self.step, self.gas = request, step, gas
        self.seen: dict[float, float] = {}
        start = [_start(run.experiment, gas) for run in request.runs]
        self.reference = math.exp(float(np.mean(np.log(start))))
        own = next(s for s in request.runs[0].experiment.steps if s.name == step)
        self.written = own.orders.get(gas, 0.0)
        self.fits: dict[float, Fit | None] = {}

    def fit_at(self, order: float) -> Fit | None:
        """The fit at an order; None where there is none."""
        if order not in self.fits:
            runs = tuple(
                replace(run, experiment=self._changed(run.experiment, order))
                for run in self.request.runs
            )
            plain = replace(
                self.request, runs=runs, asked=self._asked(), intervals=False, loss="linear"
            )
            try:
                self.fits[order] = fit(plain)
            except ComputationError:
                self.fits[order] = None
        return self.fits[order]

    def _asked(self) -> tuple[Asked, ...]:
        """The same parameters; what was known of k in another unit is left out."""
        head = f"steps.{self.step}."
        return tuple(
            Asked(one.address) if one.address.startswith(head) else one
            for one in self.request.asked
        )

    def _changed(self, experiment: Experiment, order: float) -> Experiment:
        steps = tuple(
            self._with_order(step, order) if step.name == self.step else step
            for step in experiment.steps
        )
        return replace(experiment, steps=steps)

    def _with_order(self, step: Step, order: float) -> Step:
        orders = {**step.orders, self.gas: order}
        stated = tuple((gas, n) for gas, n in orders.items() if n != 0)
        counted = step.law.inputs()[step.law.counted]
        # At the reference concentration the rate stays what it was; the number is SI without a
        # name for its unit, which any order between two whole ones would need.
        value = counted.value * self.reference ** (self.written - order)
        quantity = replace(counted, value=value, unit="", dimension="pure")
        law = replace(step.law, **{step.law.counted: quantity})  # type: ignore[type-var]
        return replace(step, stated_orders=stated, law=law)

    def squares(self, order: float) -> float:
        """Sum of squares over the variance of the best fit so far; infinite where none."""
        found = self.fit_at(order)
        if found is None:
            return math.inf
        if found.deviations_estimated:
            # Deviations differ from fit to fit: only the likelihood compares.
            return -2 * found.log_likelihood
        return found.chi_square

    def interval(self) -> tuple[float, float, float, float]:
        """(best order, standard error, low, high)."""
        from scipy.optimize import minimize_scalar

        grid = [order for order, found in self.fits.items() if found is not None]
        start = min(grid, key=self.squares)
        low, high = max(LOWEST, start - 0.75), min(HIGHEST, start + 0.75)
        found = minimize_scalar(
            self.squares, bounds=(low, high), method="bounded", options={"xatol": 1e-4}
        )
        best = float(found.x) if found.fun <= self.squares(start) else start
        least = self.squares(best)
        example = self.fit_at(best)
        assert example is not None, "it has just been fitted"
        n = example.misfit.n_readings
        freedom = max(n - len(example.parameters) - 1, 1)
        if example.deviations_estimated:
            t = quantile(freedom)
            threshold = n * math.log1p(t**2 / freedom)
        else:
            t = quantile(None)
            threshold = t**2
        ends = [self._end(best, sign, least, threshold) for sign in (-1.0, 1.0)]
        self.seen = {
            order: self.squares(order) - least
            for order, fitted in self.fits.items()
            if fitted is not None
        }
        error = (ends[1] - ends[0]) / (2 * t) if math.isfinite(ends[1] - ends[0]) else math.nan
        return best, error, ends[0], ends[1]

    def _end(self, best: float, sign: float, least: float, threshold: float) -> float:
        from scipy.optimize import brentq

        def excess(order: float) -> float:
            return min(self.squares(order) - least, 1e6) - threshold

        inner, width = best, 0.05
        while LOWEST <= best + sign * width <= HIGHEST:
            outer = best + sign * width
            if excess(outer) >= 0:
                return float(brentq(excess, inner, outer, xtol=1e-4))
            inner, width = outer, width * 2
        return sign * math.inf


def _start(experiment: Experiment, gas: str) -> float:
    """Concentration of a gas at the start [mol/m^3]; that of all gas where there is none."""
    there = experiment.moles[gas] or sum(experiment.moles.values())
    return there / experiment.initial_volume


def in_words(test: OrderTest) -> str:
    """The fitted order and what it says, in a sentence."""
    if not (math.isfinite(test.low) and math.isfinite(test.high)):
        return f"The readings do not determine the order in {test.gas}."
    inside = [order for order in USUAL if test.low <= order <= test.high]
    text = f"Order in {test.gas}: {test.order:.2f} (95 %: {test.low:.2f} to {test.high:.2f})"
    if len(inside) == 1:
        return f"{text}; of the usual orders only {inside[0]:g} lies inside."
    if not inside:
        near = min(USUAL, key=lambda order: abs(order - test.order))
        return (
            f"{text}. None of the usual orders lies inside (the nearest is {near:g}): either the "
            "step is not simple, or the readings are off by more than their scatter."
        )
    return f"{text}; {' and '.join(f'{order:g}' for order in inside)} lie inside."
