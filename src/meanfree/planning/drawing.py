"""Runs from which samples are drawn: after each, the rest goes on from what is left."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from meanfree.equations.system import Floats
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.plan import Solver
from meanfree.integrate.single import integrate
from meanfree.planning.readings import Reading, read_off
from meanfree.sourced import Sourced

INSTANT = 1e-9
"""Time between two samples at once, over the time of the first."""


def drawn_signals(experiment: Experiment, reading: Reading, takes: float, solver: Solver) -> Floats:
    """The signal at each of the reading's times [SI, shape (n_times,)], just before the sample.

    Each sample takes the fraction ``takes`` of everything; the gas stays at its temperature.
    Raises ValueError where that varies, for a run cannot be taken up again then.
    """
    if experiment.constant_temperature is None:
        raise ValueError("samples are drawn from runs at one temperature")
    found: list[float] = []
    now, before = experiment, 0.0
    for time in reading.times:
        # Two samples at one time: the second a moment later, so that there is a run to read.
        until = Sourced(max(time - before, INSTANT * time), "s", dimension="time")
        run = integrate(replace(now, plan=replace(now.plan, until=until, report_at=())), solver)
        found.append(float(read_off(run, replace(reading, times=(run.end,)))[0]))
        amounts = run.amounts(run.end)[:, 0] * (1.0 - takes)
        now = _filled(now, dict(zip(run.system.gases, amounts, strict=True)))
        before = time
    return np.array(found)


def _filled(experiment: Experiment, amounts: dict[str, float]) -> Experiment:
    """The experiment with these amounts [mol] in it, at the pressure that it holds."""
    gases = {
        gas: Portion(Sourced(max(float(n), 0.0), "mol", dimension="amount"), "amount")
        for gas, n in amounts.items()
    }
    vessel = experiment.vessel
    if not vessel.is_rigid:
        held = Sourced(experiment.held_pressure, "Pa", dimension="pressure")
        vessel = replace(vessel, pressure=held)
    return replace(experiment, fill=Fill(gases, at=experiment.fill.at), vessel=vessel)
