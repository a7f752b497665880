"""Predictions for many sets of parameters in one call of the compiled integrator.

A derivative by differences needs the same run at a dozen nearby parameters: together they cost
little more than one run by itself.
"""

from __future__ import annotations

import warnings
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from meanfree.constants import R
from meanfree.equations.build import build_system
from meanfree.equations.system import Floats
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.measured.prediction import SOLVER, Prediction, kept_at
from meanfree.sourced import Sourced


def predict_many(
    experiment: Experiment, rows: Sequence[Mapping[str, float]], times: Sequence[Floats]
) -> list[Prediction]:
    """The gas under every row of changed inputs (file's unit), each at times of its own [s].

    Every row names the same addresses. Raises ComputationError where a run failed or where the
    rows cannot be carried out together, InputError for an impossible value.
    """
    from pandas.errors import PerformanceWarning

    from meanfree.integrate.many import many
    from meanfree.integrate.observables import At

    grid = np.unique(np.concatenate(times))
    gases = [gas.name for gas in experiment.gases]
    whole = ("temperature", "total pressure")
    asked = [At(quantity, time=float(t)) for quantity in whole for t in grid]
    asked += [At("amount", gas, float(t)) for gas in gases for t in grid]
    names = [name for one in asked for name in one.columns]
    if len(set(names)) < len(names):
        raise ComputationError("times that lie too close together to be told apart")
    until = Sourced(float(grid[-1]), "s", "the readings", "time")
    timed = replace(experiment, plan=replace(experiment.plan, until=until))
    columns = {address: np.array([row[address] for row in rows]) for address in rows[0]}
    with warnings.catch_warnings():
        # A frame of a hundred columns is what is asked for here.
        warnings.simplefilter("ignore", PerformanceWarning)
        frame = many(timed, columns, asked, rtol=SOLVER.rtol, atol=SOLVER.atol, workers=1)
    found = frame[names].to_numpy(float).reshape(len(rows), 2 + len(gases), len(grid))
    if not np.all(np.isfinite(found)):
        raise ComputationError("a run under changed inputs failed")
    return [
        _taken_apart(with_inputs(experiment, row), each[:, np.searchsorted(grid, t)], t)
        for row, each, t in zip(rows, found, times, strict=True)
    ]


def _taken_apart(experiment: Experiment, found: Floats, times: Floats) -> Prediction:
    """T, p and amounts [shape (2 + n_gases, n_times)] as a Prediction."""
    system = build_system(experiment)
    T, p, amounts = found[0], found[1], found[2:]
    x = amounts / system.initial_volume
    spread = x.sum(axis=0) * R * T / p
    return Prediction(system, x, spread, T, kept_at(system, times))
