"""The figure `compare`: the watched gas in one vessel under three kinetics, readings over them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from matplotlib.figure import Figure

from meanfree.equations.system import Floats
from meanfree.measured.comparison import Comparison, Scenario
from meanfree.measured.runs import MeasuredRun
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.sampling import unit_for

POINTS: Final[int] = 300
MANY: Final[float] = 1e5
"""Ratio of the ends of the time axis above which it is in seconds, whatever its length."""


def figure(found: Comparison, runs: Sequence[MeasuredRun]) -> Figure:
    """What is left of the watched gas against time, logarithmic in time."""
    start, end = _span(found, runs)
    times = np.geomspace(start, end, POINTS)
    unit, seconds = unit_for(end) if end < MANY * start else ("s", 1.0)
    names = [scenario.name for scenario in found.scenarios]
    drawn, (ax,) = style.panels([3.4], beside=0.3, above=0.3 + 0.2 * len(names))
    for n, scenario in enumerate(found.scenarios):
        left = _left(scenario, found.watched, times)
        ax.plot(times / seconds, left, label=scenario.name, **style.style_of(n))
    for n, run in enumerate(runs):
        shown = remaining(run, found.watched)
        if shown is None:
            continue
        t = run.readings.times
        ax.plot(
            t[t > 0] / seconds,
            shown[t > 0],
            "osD^vP<>"[n % 8],
            color=style.INK,
            markersize=3.5,
            markerfacecolor="white",
            linestyle="none",
            label=wording.clean(run.name),
        )
    ax.set_xscale("log")
    ax.set_xlim(start / seconds, end / seconds)
    style.plain_decades(ax.xaxis)
    style.set_linear(ax, 0.0, 1.0)
    name = wording.chemical(found.experiment.gas_named[found.watched])
    style.label(ax, x=f"Time ({unit})", y=f"Left of {name}, n/n0")
    ax.legend(
        loc="lower left",
        bbox_to_anchor=(0.0, 1.01),
        frameon=False,
        fontsize=8.5,
        handlelength=3.2,
        borderaxespad=0.0,
        ncols=2,
    )
    assert len(names) < labels.MOST_LABELS
    return drawn


def _span(found: Comparison, runs: Sequence[MeasuredRun]) -> tuple[float, float]:
    """From well before the fastest half-life to the longest of runs and readings [s]."""
    ends = [scenario.run.end for scenario in found.scenarios]
    halves = [one.time for one in found.scenarios if one.time is not None]
    fastest = min(halves, default=min(ends) / 10)
    longest = max(halves, default=max(ends))
    last = max([float(run.readings.times[-1]) for run in runs], default=0.0)
    return fastest / 30, max(20 * longest, last) * 1.1


def _left(scenario: Scenario, gas: str, times: Floats) -> Floats:
    """n/n0; beyond the end of a run it stays where it ended."""
    run = scenario.run
    return run.remaining(gas, np.minimum(times, run.end))


def remaining(run: MeasuredRun, gas: str) -> Floats | None:
    """n/n0 of a gas out of the readings of a run, None where they do not tell it.

    A total pressure tells it where one step alone changes the number of molecules.
    """
    from meanfree.constants import N_A, R

    readings, experiment = run.readings, run.experiment
    if not experiment.vessel.is_rigid or readings.signal.is_rate_constant:
        return None
    T = experiment.constant_temperature
    kind, values = readings.signal.kind, readings.values
    spread = experiment.initial_volume + experiment.dead_capacity * experiment.temperature.initial
    start = experiment.moles.get(gas, 0.0) / spread
    if T is None or start <= 0:
        return None
    if kind == "total pressure":
        if len(experiment.steps) != 1:
            return None
        step = experiment.steps[0]
        if step.change_of_moles == 0 or step.net.get(gas, 0.0) == 0:
            return None
        p0 = experiment.initial_pressure
        gained = (values - p0) / (R * T) / step.change_of_moles
        return np.asarray(1 + step.net[gas] * gained / start)
    if readings.signal.gases != (gas,):
        return None
    factors = {"concentration": 1.0, "partial pressure": 1 / (R * T), "number density": 1 / N_A}
    if kind == "conversion":
        return np.asarray(1 - values)
    return np.asarray(values * factors[kind] / start) if kind in factors else None
