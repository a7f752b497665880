"""How far a set of parameters is from all readings, in units of their standard deviation."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.measured.batches import predict_many
from meanfree.measured.parameters import (
    SIGNAL_OFFSET,
    TIME_OFFSET,
    Parameter,
    applied,
    changes,
    offset_of,
)
from meanfree.measured.prediction import Prediction, is_exact, predict
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.signals import predicted

HOPELESS = 1e140
"""Residual of a prediction that cannot be computed: any step back is an improvement."""


FEWEST_TOGETHER = 3
"""Fewer predictions than this are integrated one by one: a call for many costs about two."""


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
    exact: bool | None = None,
) -> list[Floats]:
    """`curve` for several sets of values, integrated together where there is no formula.

    ``exact`` says whether there is one, where that is known already.

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
            _predictions(run, place, parameters, rows, since, exact), rows, strict=True
        )
    ]


def _predictions(
    run: MeasuredRun,
    place: int,
    parameters: Sequence[Parameter],
    rows: Sequence[Floats],
    times: Sequence[Floats],
    exact: bool | None,
) -> list[Prediction]:
    changed = changes(place, parameters, rows[0])
    if exact is None:
        exact = is_exact(run.experiment)
    if changed and not exact and len(rows) >= FEWEST_TOGETHER:
        try:
            return predict_many(
                run.experiment, [changes(place, parameters, row) for row in rows], times
            )
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
        self.exact = tuple(
            run.readings.signal.is_rate_constant or is_exact(run.experiment) for run in runs
        )
        self.priors = tuple((i, p) for i, p in enumerate(parameters) if p.prior is not None)

    @property
    def n_readings(self) -> int:
        """Number of readings; priors come after them."""
        return sum(self.sizes)

    def with_deviations(self, estimates: Mapping[str, float]) -> Misfit:
        """The same residuals with other estimated deviations."""
        return Misfit(self.runs, self.parameters, estimates)

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
        values = [self.natural(inner) for inner in rows]
        found: list[list[Floats]] = [[] for _ in rows]
        for place, run in enumerate(self.runs):
            try:
                with np.errstate(all="ignore"):
                    shown = curves(run, place, self.parameters, values, None, self.exact[place])
            except (ComputationError, InputError, ArithmeticError, ValueError):
                shown = [np.full(len(run.readings), np.nan) for _ in rows]
            for each, one in zip(found, shown, strict=True):
                if run.readings.signal.is_rate_constant:
                    one = np.log(np.maximum(one, 1e-300))
                difference = _value(run) - one
                each.append(np.where(np.isfinite(difference), difference, HOPELESS))
        return found

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


def _value(run: MeasuredRun) -> Floats:
    values = run.readings.values
    return np.log(values) if run.readings.signal.is_rate_constant else values
