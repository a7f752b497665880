"""How far a set of parameters is from all readings, in units of their standard deviation."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.measured.parameters import (
    SIGNAL_OFFSET,
    TIME_OFFSET,
    Parameter,
    applied,
    offset_of,
)
from meanfree.measured.prediction import predict
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.signals import predicted

HOPELESS = 1e140
"""Residual of a prediction that cannot be computed: any step back is an improvement."""


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
    readings, experiment = run.readings, applied(run, place, parameters, values)
    asked = readings.times if times is None else times
    if readings.signal.is_rate_constant:
        return rate_constant_at(experiment, readings.signal.step, asked)
    since = asked - offset_of(TIME_OFFSET, place, parameters, values)
    # Before its start the gas is as it was filled.
    shown = predicted(readings.signal, predict(experiment, np.maximum(since, 0.0)))
    return shown + offset_of(SIGNAL_OFFSET, place, parameters, values)


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
        values = self.natural(inner)
        found = []
        for place, run in enumerate(self.runs):
            try:
                with np.errstate(all="ignore"):
                    shown = curve(run, place, self.parameters, values)
            except (ComputationError, InputError, ArithmeticError, ValueError):
                found.append(np.full(len(run.readings), HOPELESS))
                continue
            if run.readings.signal.is_rate_constant:
                shown = np.log(np.maximum(shown, 1e-300))
            found.append(_value(run) - shown)
        return found

    def __call__(self, inner: Floats) -> Floats:
        """Residuals of all readings, then of the priors, in standard deviations."""
        parts = [
            difference / self.deviation(place)
            for place, difference in enumerate(self.differences(inner))
        ]
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
