"""How far a set of parameters is from all readings, in units of their standard deviation."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.measured.least_squares import Scales, differences
from meanfree.measured.parameters import (
    SIGNAL_OFFSET,
    TIME_OFFSET,
    Parameter,
    applied,
    changes,
    offset_of,
    unit_of,
)
from meanfree.measured.prediction import Prediction, is_exact, predict
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.signals import changed, predicted

if TYPE_CHECKING:
    from meanfree.measured.predictor import Predictor

HOPELESS = 1e140
"""Residual of a prediction that cannot be computed: any step back is an improvement."""

STEP_OF_INTEGRATION = 1e-3
"""Step of differences where predictions are integrated one by one to 1e-10: 1e-7 by either error.
Only where the kernel cannot give derivatives."""


def rate_constant_at(experiment: Experiment, name: str, temperatures: Floats) -> Floats:
    """k of a step per event [SI, shape (n,)] at temperatures [K], in the bath as filled."""
    step = next(step for step in experiment.steps if step.name == name)
    context = experiment.context(step)
    M = 0.0
    if step.bath is not None:
        spread = experiment.initial_volume
        M = sum(n * step.bath.efficiency(g) for g, n in experiment.moles.items()) / spread
    p = experiment.initial_pressure
    return np.array([float(step.law.rate_constant(context, float(T), p, M)) for T in temperatures])


def curve(
    run: MeasuredRun,
    place: int,
    parameters: Sequence[Parameter],
    values: Floats,
    times: Floats | None = None,
) -> Floats:
    """What a run's instrument would show [SI, shape (n,)] with parameters at ``values``.

    ``times`` [s] on the run's clock (temperatures [K] of rate constants); None: the readings'.
    """
    return curves(run, place, parameters, [values], times)[0]


def curves(
    run: MeasuredRun,
    place: int,
    parameters: Sequence[Parameter],
    rows: Sequence[Floats],
    times: Floats | None = None,
    predictor: Predictor | None = None,
) -> list[Floats]:
    """`curve` for several sets of values; a ``predictor`` integrates them together.

    Raises ComputationError or InputError where one of them cannot be had.
    """
    readings = run.readings
    asked = readings.times if times is None else times
    if readings.signal.is_rate_constant:
        return [
            rate_constant_at(applied(run, place, parameters, row), readings.signal.step, asked)
            for row in rows
        ]
    # Before its start the gas is as it was filled.
    since = [
        np.maximum(asked - offset_of(TIME_OFFSET, place, parameters, row), 0.0) for row in rows
    ]
    return [
        predicted(readings.signal, found) + offset_of(SIGNAL_OFFSET, place, parameters, row)
        for found, row in zip(
            _predictions(run, place, parameters, rows, since, predictor), rows, strict=True
        )
    ]


def _predictions(
    run: MeasuredRun,
    place: int,
    parameters: Sequence[Parameter],
    rows: Sequence[Floats],
    times: Sequence[Floats],
    predictor: Predictor | None,
) -> list[Prediction]:
    if predictor is not None:
        try:
            return predictor.many([changes(place, parameters, row) for row in rows], times)
        except ComputationError:
            pass  # one by one, then: another integrator may do what the compiled one could not
    return [
        predict(applied(run, place, parameters, row), t) for row, t in zip(rows, times, strict=True)
    ]


class Misfit:
    """The residuals of a fit.

    Readings without a standard deviation share, kind by kind, one that is estimated: ``groups``
    names the kind of every such run, and `with_deviations` sets the estimates. Rate constants are
    compared by their logarithms, since they scatter by a factor.
    """

    def __init__(
        self,
        runs: Sequence[MeasuredRun],
        parameters: Sequence[Parameter],
        estimates: Mapping[str, float] | None = None,
        predictors: Sequence[Predictor | None] | None = None,
    ) -> None:
        self.runs, self.parameters = tuple(runs), tuple(parameters)
        self.groups = tuple(
            run.readings.signal.kind if run.readings.sd is None else "" for run in runs
        )
        self.estimates = dict(estimates or {})
        for run, group in zip(self.runs, self.groups, strict=True):
            if group and group not in self.estimates:
                # Any number does: it is put right by the scatter about the first fit.
                self.estimates[group] = 0.01 * float(np.ptp(_value(run)))
        self.sizes = tuple(len(run.readings) for run in self.runs)
        if predictors is None:
            predictors = [self._predictor(place) for place in range(len(self.runs))]
        self.predictors = tuple(predictors)
        self.priors = tuple((i, p) for i, p in enumerate(parameters) if p.prior is not None)

    def _predictor(self, place: int) -> Predictor | None:
        """The compiled integrator of a run, None where there is a formula."""
        run = self.runs[place]
        if run.readings.signal.is_rate_constant or is_exact(run.experiment):
            return None
        from meanfree.measured.predictor import Predictor

        keys = changes(place, self.parameters, np.ones(len(self.parameters)))
        return Predictor(run.experiment, tuple(keys))

    @property
    def n_readings(self) -> int:
        """Number of readings; priors come after them."""
        return sum(self.sizes)

    def with_deviations(self, estimates: Mapping[str, float]) -> Misfit:
        """The same residuals with other estimated deviations."""
        return Misfit(self.runs, self.parameters, estimates, self.predictors)

    def natural(self, inner: Floats) -> Floats:
        """Values in the file's unit of inner coordinates."""
        return np.array([p.outer(float(u)) for p, u in zip(self.parameters, inner, strict=True)])

    def deviation(self, place: int) -> Floats:
        """Standard deviation of each reading of a run, as compared [shape (n,)]."""
        readings, group = self.runs[place].readings, self.groups[place]
        if group:
            return np.full(len(readings), self.estimates[group])
        assert readings.sd is not None
        return readings.sd / readings.values if readings.signal.is_rate_constant else readings.sd

    def differences(self, inner: Floats) -> list[Floats]:
        """Reading less prediction of each run, as compared: SI, or ln of a rate constant."""
        return self._differences([inner])[0]

    def _differences(self, rows: Sequence[Floats]) -> list[list[Floats]]:
        each = [self.of_run(place, rows) for place in range(len(self.runs))]
        return [list(of_runs) for of_runs in zip(*each, strict=True)]

    def of_run(self, place: int, rows: Sequence[Floats]) -> list[Floats]:
        """Reading less prediction of one run, at several sets of inner coordinates."""
        run, values = self.runs[place], [self.natural(inner) for inner in rows]
        predictor = self.predictors[place]
        try:
            with np.errstate(all="ignore"):
                shown = curves(run, place, self.parameters, values, None, predictor)
        except (ComputationError, InputError, ArithmeticError, ValueError):
            shown = [np.full(len(run.readings), np.nan) for _ in rows]
        if run.readings.signal.is_rate_constant:
            shown = [np.log(np.maximum(one, 1e-300)) for one in shown]
        found = [_value(run) - one for one in shown]
        return [np.where(np.isfinite(one), one, HOPELESS) for one in found]

    def __call__(self, inner: Floats) -> Floats:
        """Residuals of all readings, then of the priors, in standard deviations."""
        return self.together([inner])[0]

    def together(self, rows: Sequence[Floats]) -> list[Floats]:
        """Residuals at several sets of inner coordinates, predicted in one go where that pays."""
        return [
            self._weighted(inner, differences)
            for inner, differences in zip(rows, self._differences(rows), strict=True)
        ]

    def _weighted(self, inner: Floats, differences: Sequence[Floats]) -> Floats:
        parts = [difference / self.deviation(place) for place, difference in enumerate(differences)]
        values = self.natural(inner)
        for i, parameter in self.priors:
            assert parameter.prior is not None
            parts.append(np.array([(values[i] - parameter.prior.value) / parameter.prior.sd]))
        return np.concatenate(parts)

    def jacobian(self, inner: Floats, scales: Scales) -> Floats:
        """Derivatives of the residuals by the inner coordinates [shape (m, n)].

        By the variational equations where a run is integrated, by differences of the formula where
        there is one; ``scales`` are those of the coordinates.
        """
        values = self.natural(inner)
        by_inner = np.array(
            [v if p.logarithmic else 1.0 for p, v in zip(self.parameters, values, strict=True)]
        )
        parts = []
        for place in range(len(self.runs)):
            slopes = self._of_integrated(place, values)
            if slopes is None:
                step = scales.step if self.predictors[place] is None else STEP_OF_INTEGRATION
                of_run = _OfRun(self, place)
                part = differences(of_run, inner, replace(scales, step=step))
            else:
                part = -slopes * by_inner
            parts.append(part / self.deviation(place)[:, None])
        for i, parameter in self.priors:
            assert parameter.prior is not None
            row = np.zeros((1, len(inner)))
            row[0, i] = by_inner[i] / parameter.prior.sd
            parts.append(row)
        found = np.vstack(parts)
        return np.where(np.isfinite(found), found, 0.0)

    def _of_integrated(self, place: int, values: Floats) -> Floats | None:
        """Derivatives of what a run shows, by the values in the file's unit [shape (m, n)].

        None where the kernel has none to give.
        """
        predictor, run, parameters = self.predictors[place], self.runs[place], self.parameters
        if predictor is None:
            return None
        signal, times = run.readings.signal, run.readings.times
        since = np.maximum(times - offset_of(TIME_OFFSET, place, parameters, values), 0.0)
        try:
            with np.errstate(all="ignore"):
                found = predictor.differentiated(changes(place, parameters, values), since)
        except (ComputationError, InputError, ArithmeticError, ValueError):
            return None
        slopes = np.zeros((len(times), len(parameters)))
        for i, parameter in enumerate(parameters):
            if place not in parameter.runs:
                continue
            if not parameter.is_offset:
                by = found.by_input[parameter.key]
                slopes[:, i] = changed(signal, found.prediction, by)
                continue
            slopes[:, i] = unit_of(parameter)
            if parameter.key == TIME_OFFSET:
                rate = changed(signal, found.prediction, found.by_time)
                slopes[:, i] *= np.where(since > 0, -rate, 0.0)
        return slopes

    def log_likelihood(self, residuals: Floats) -> float:
        """ln L of Gaussian readings; estimated deviations at their most likely value."""
        total, start = 0.0, 0
        squares: dict[str, tuple[float, int]] = {}
        for place, size in enumerate(self.sizes):
            r, sd = residuals[start : start + size], self.deviation(place)
            start += size
            group = self.groups[place]
            if group:
                before, n = squares.get(group, (0.0, 0))
                squares[group] = (before + float(np.sum((r * sd) ** 2)), n + size)
            else:
                total -= float(
                    0.5 * r @ r + np.sum(np.log(sd)) + 0.5 * size * math.log(2 * math.pi)
                )
        for sum_of_squares, n in squares.values():
            total -= 0.5 * n * (math.log(2 * math.pi * max(sum_of_squares, 1e-300) / n) + 1)
        return total


class _OfRun:
    """Reading less prediction of one run, one point at a time or several together."""

    def __init__(self, misfit: Misfit, place: int) -> None:
        self.misfit, self.place = misfit, place

    def __call__(self, inner: Floats) -> Floats:
        return self.together([inner])[0]

    def together(self, rows: Sequence[Floats]) -> list[Floats]:
        return self.misfit.of_run(self.place, rows)


def _value(run: MeasuredRun) -> Floats:
    values = run.readings.values
    return np.log(values) if run.readings.signal.is_rate_constant else values
