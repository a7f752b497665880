"""At which times a run is shown, and whether time is shown linear or logarithmic."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.integrate.run import Run
from meanfree.report.run_models import RunSummary
from meanfree.report.wording import DAY, HOUR, MINUTE, YEAR

SPREAD = 40.0
"""Ratio of run length to the fastest half-change above which time is shown logarithmic."""

DECADES_BEFORE = 2.0
"""How long before the fastest half-change a logarithmic axis begins, in powers of ten."""

POINTS = 300
"""Evenly spaced points of a curve."""

ROWS = 200
"""Evenly spaced rows of a table, before the times that someone asked about."""


@dataclass(frozen=True)
class TimeAxis:
    """The time axis of a run's figures: from ``start`` to ``end`` [s], shown in ``unit``."""

    logarithmic: bool
    start: float
    end: float
    unit: str
    seconds: float

    def times(self, count: int) -> Floats:
        """That many times on the axis [s], evenly spaced as the axis shows them."""
        if self.logarithmic:
            inner = np.geomspace(self.start, self.end, count)
            inner[-1] = self.end
            return inner
        return np.linspace(0.0, self.end, count)


def time_axis(run: Run) -> TimeAxis:
    """Linear where one time scale rules, logarithmic where several do."""
    fastest, end = fastest_half_change(run), float(run.end)
    if fastest is None or end <= SPREAD * fastest:
        return TimeAxis(False, 0.0, end, *unit_for(end))
    start = min(fastest * 10.0**-DECADES_BEFORE, end * 1e-2)
    return TimeAxis(True, start, end, *unit_for(float(np.sqrt(fastest * end))))


def unit_for(seconds: float) -> tuple[str, float]:
    """Name and length [s] of the unit in which such a time is best read."""
    for above, name, size in (
        (3 * YEAR, "years", YEAR),
        (3 * DAY, "d", DAY),
        (3 * HOUR, "h", HOUR),
        (3 * MINUTE, "min", MINUTE),
        (0.3, "s", 1.0),
        (3e-4, "ms", 1e-3),
    ):
        if seconds >= above:
            return name, size
    return "µs", 1e-6


def fastest_half_change(run: Run) -> float | None:
    """Earliest time [s] at which some gas has made half of all its changes; None at rest."""
    times = run.trajectory.times
    if len(times) < 2:
        return None
    amounts = run.amounts(times)
    travelled = np.cumsum(np.abs(np.diff(amounts, axis=1)), axis=1)
    total = travelled[:, -1]
    moving = np.flatnonzero(total > 1e-9 * amounts.max())
    if not len(moving):
        return None
    halves = [float(np.interp(0.5 * total[i], travelled[i], times[1:])) for i in moving]
    return min(half for half in halves if half > 0)


def figure_times(run: Run, axis: TimeAxis) -> Floats:
    """Times at which curves are drawn [s]: even on the axis, and where the integrator stepped."""
    steps = run.trajectory.times
    thinned = steps[:: max(1, len(steps) // POINTS)]
    breaks = [segment.start for segment in run.system.segments]
    every = np.concatenate([axis.times(POINTS), thinned, breaks])
    return np.unique(every[(every >= axis.start) & (every <= axis.end)])


def table_times(run: Run, summary: RunSummary) -> Floats:
    """Times of the rows of `profiles.csv` [s]: even, and every time that an answer names."""
    axis = time_axis(run)
    asked = [0.0, axis.end]
    asked += [time.value for time in run.experiment.plan.report_at if time.value <= axis.end]
    asked += [segment.start for segment in run.system.segments if segment.start <= axis.end]
    for answer in summary.gases:
        asked += [entry.time_s for entry in answer.reaction_times if entry.time_s is not None]
        elapsed = 0.0
        for lasted in answer.half_lives_s:
            if lasted is not None:
                elapsed += lasted
                asked.append(elapsed)
    every = np.concatenate([axis.times(ROWS + 1), np.array(asked)])
    return np.unique(np.clip(every, 0.0, axis.end))
