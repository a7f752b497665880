"""The wall test: the same fill in vessels of different surface to volume.

k = k_gas + k_wall S/V for a loss of first order; the slope is what a unit of surface does.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.errors import InputError
from meanfree.measured.each_run import Point
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.straight_lines import Interval, Line, straight_line, widened


@dataclass(frozen=True)
class WallTest:
    """k of a step against S/V.

    ``gas`` [1/s] is k without walls, ``wall`` [m/s] what S/V [1/m] multiplies, ``shares`` [1] the
    part of each run's k that is wall. ``probability`` is that of such a slope by chance.
    """

    step: str
    runs: tuple[str, ...]
    line: Line
    gas: Interval
    wall: Interval
    shares: tuple[float, ...]
    probability: float
    words: str


def wall_test(step: str, runs: Sequence[MeasuredRun], points: Sequence[Point]) -> WallTest:
    """The line of k of a step [1/s per event] against S/V of the vessels.

    Raises InputError where a vessel has no shape, two S/V are not there, or temperatures differ.
    """
    by_name = {point.run: point for point in points}
    used = [run for run in runs if run.name in by_name]
    x = []
    for run in used:
        ratio = run.experiment.vessel.surface_to_volume
        if ratio is None:
            found = f"the vessel of {run.name}, whose surface is not known"
            raise InputError.at("fit.analyses", found, "vessel.shape for every run")
        x.append(ratio)
    if len(set(np.round(x, 6))) < 2 or len(x) < 3:
        found = f"{len(x)} runs in vessels of {len(set(np.round(x, 6)))} different S/V"
        raise InputError.at("fit.analyses", found, "three runs or more, two S/V or more")
    T = [by_name[run.name].temperature for run in used]
    if max(T) - min(T) > 0.5:
        found = f"runs from {min(T):g} to {max(T):g} K"
        raise InputError.at("fit.analyses", found, "runs at one temperature")
    k = np.array([by_name[run.name].k for run in used])
    errors = np.array([by_name[run.name].k * by_name[run.name].error for run in used])
    known = bool(np.all(np.isfinite(errors) & (errors > 0)))
    line = widened(straight_line(np.array(x), k, errors if known else None))
    return _told(step, used, line, k)


def _told(step: str, used: Sequence[MeasuredRun], line: Line, k: np.ndarray) -> WallTest:
    from scipy.stats import norm
    from scipy.stats import t as student

    gas, wall = line.intercept_interval, line.slope_interval
    ratio = abs(line.slope) / line.slope_error if line.slope_error > 0 else math.inf
    chance = norm.sf(ratio) if line.freedom is None else student.sf(ratio, line.freedom)
    shares = tuple(float(s) for s in line.slope * line.x / line.at(line.x))
    low, high = min(shares), max(shares)
    if wall.low > 0:
        words = (
            f"The walls take part: {100 * low:.0f} to {100 * high:.0f} % of k of {step} is theirs "
            "in these vessels. The intercept is what the gas does by itself."
        )
    elif wall.high < 0:
        words = (
            f"k of {step} falls with S/V, which no loss on walls does: chains that end on them, or "
            "heating that is worse in the larger vessels, may."
        )
    else:
        most = max(0.0, wall.high * float(line.x.max()) / float(line.at(line.x).max()))
        words = (
            f"No wall is seen: the slope is zero within its interval, and at most "
            f"{100 * min(most, 1.0):.0f} % of k of {step} could be wall at the largest S/V."
        )
    names = tuple(run.name for run in used)
    return WallTest(step, names, line, gas, wall, shares, float(2 * chance), words)
