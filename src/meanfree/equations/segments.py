"""The breaks of a run: corners of a temperature program, lamps switched, samples drawn.

Between two breaks nothing changes abruptly, so the integrator restarts at each.
"""

from __future__ import annotations

import bisect
import itertools
import math
from collections.abc import Sequence

import numpy as np

from meanfree.equations.system import Floats, Segment
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Program


def segments(experiment: Experiment, steps: Sequence[Step]) -> tuple[Segment, ...]:
    """Stretches between breaks; the last one has no end.

    ``steps`` is the step behind each one-way step.
    """
    samples = {sample.at.value: sample for sample in experiment.samples}
    switched = any(step.law.switch_times() for step in steps)
    times = {0.0, *samples, *(t for step in steps for t in step.law.switch_times())}
    if isinstance(experiment.temperature, Program):
        times.update(experiment.temperature.breaks)
    ends = [*sorted(times), math.inf]
    found = []
    for start, end in itertools.pairwise(ends):
        temperature, slope = _temperature(experiment, start)
        switches = _switches(steps, start) if switched else None
        left = _left(experiment, samples.get(start), temperature)
        found.append(Segment(start, end, temperature, slope, switches, *left))
    return tuple(found)


def _left(experiment: Experiment, sample: Sample | None, temperature: float) -> tuple[float, float]:
    """(fraction retained, volume drawn over V0 where the fraction depends on the state then)."""
    if sample is None:
        return 1.0, 0.0
    if sample.fraction is not None:
        return 1.0 - sample.fraction.value, 0.0
    assert sample.volume is not None
    drawn = sample.volume.value / experiment.initial_volume
    if not experiment.vessel.is_rigid:
        return 1.0, drawn
    # v c of (V + V_d T/T_d) c
    dead = experiment.dead_capacity / experiment.initial_volume
    return 1.0 - drawn / (1.0 + dead * temperature), 0.0


def _temperature(experiment: Experiment, t: float) -> tuple[float, float]:
    """Temperature [K] and its slope [K/s] just after ``t`` [s]."""
    mode = experiment.temperature
    if not isinstance(mode, Program):
        return mode.initial, 0.0
    points = [(time.value, T.value) for time, T in mode.points]
    place = bisect.bisect_right([time for time, _ in points], t) - 1
    if place == len(points) - 1:
        return points[-1][1], 0.0
    (t0, T0), (t1, T1) = points[place], points[place + 1]
    slope = (T1 - T0) / (t1 - t0)
    # at a point itself exactly the number that was given
    return T0 + slope * (t - t0), slope


def _switches(steps: Sequence[Step], t: float) -> Floats:
    """1 for each step that is on just after ``t`` [s], else 0."""
    return np.array([1.0 if step.law.is_on(t) else 0.0 for step in steps])
