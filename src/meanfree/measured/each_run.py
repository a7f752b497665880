"""The rate constant of one step from each run by itself: the points of every later plot."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from meanfree import units
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.measured.fits import FitRequest
from meanfree.measured.fitting import fit
from meanfree.measured.misfit import rate_constant_at
from meanfree.measured.parameters import Asked
from meanfree.measured.runs import MeasuredRun
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Point:
    """k of a step in one run (or one row of a table of rate constants).

    ``k`` per event [SI], ``error`` the standard error of ln k, nan where the readings do not tell
    it, ``freedom`` the degrees of freedom behind it (None: deviations given); ``temperature`` [K].
    """

    run: str
    temperature: float
    k: float
    error: float
    freedom: int | None


def step_named(experiment: Experiment, name: str, key: str) -> Step:
    """The step of that name. Raises InputError at ``key`` where there is none."""
    for step in experiment.steps:
        if step.name == name:
            return step
    names = ", ".join(step.name for step in experiment.steps)
    raise InputError.at(key, f'"{name}", no step of the case', f"one of {names}")


def points_of(request: FitRequest, name: str) -> tuple[Point, ...]:
    """k of a step at the temperature of each run, every run fitted by itself.

    Other parameters of the request that belong to the run (its fill, its offsets) are fitted along;
    those of rate laws are held. Tables of rate constants give a point a row.

    Raises InputError where a run has no constant temperature, ComputationError where a fit fails.
    """
    found: list[Point] = []
    for place, run in enumerate(request.runs):
        if run.readings.signal.is_rate_constant:
            found += _rows(run, name)
        else:
            found.append(_point(request, run, place, name))
    return tuple(found)


def _rows(run: MeasuredRun, name: str) -> list[Point]:
    readings = run.readings
    if readings.signal.step != name:
        return []
    errors = [math.nan] * len(readings)
    if readings.sd is not None:
        errors = [float(sd / k) for sd, k in zip(readings.sd, readings.values, strict=True)]
    return [
        Point(f"{run.name}, line {line}", float(T), float(k), error, None)
        for T, k, error, line in zip(
            readings.times, readings.values, errors, readings.lines, strict=True
        )
    ]


def _point(request: FitRequest, run: MeasuredRun, place: int, name: str) -> Point:
    own = with_fixed(run, name)
    T = own.experiment.constant_temperature
    assert T is not None, "with_fixed has looked"
    asked = [Asked(f"steps.{name}.k"), *_others(request, run, place)]
    try:
        found = fit(replace(request, runs=(own,), asked=tuple(asked), intervals=False))
    except ComputationError as failure:
        raise ComputationError(f"{run.name} by itself: {failure}") from None
    one = found.estimates[0]
    k = units.to_si(one.value, one.parameter.unit, one.parameter.dimension) / one.parameter.per
    error = one.stderr / one.value
    return Point(run.name, T, k, error, found.freedom if found.deviations_estimated else None)


def with_fixed(run: MeasuredRun, name: str) -> MeasuredRun:
    """The run with one step's law replaced by a number of its own: k at the run's temperature.

    Raises InputError where the temperature of the run changes.
    """
    experiment = run.experiment
    step = step_named(experiment, name, "fit.analyses")
    T = experiment.constant_temperature
    if T is None:
        found = f"{run.name}, whose temperature changes"
        raise InputError.at("fit.analyses", found, "runs at constant temperature each")
    k = float(rate_constant_at(experiment, name, np.array([T]))[0])
    counted = step.law.inputs().get(step.law.counted)
    order = step.order + (1.0 if step.bath is not None and not step.law.bath_inside else 0.0)
    dimension = units.rate_constant(order)
    per = counted.per if counted is not None else 1.0
    unit = counted.unit if counted is not None and counted.unit else units.si_unit(dimension)
    changed = replace(step, law=Fixed(Sourced(k, unit, "", dimension, per)))
    steps = tuple(changed if one.name == name else one for one in experiment.steps)
    return replace(run, experiment=replace(experiment, steps=steps))


def _others(request: FitRequest, run: MeasuredRun, place: int) -> Sequence[Asked]:
    """Parameters of the request that are this run's own: its fill and its offsets."""
    found = []
    for one in request.asked:
        address = one.address
        for head in (f"data.{run.name}.", f"data.{place}."):
            address = address.removeprefix(head)
        if address.startswith(("data.", "steps.", "gases.")):
            continue
        found.append(replace(one, address=address))
    return found
