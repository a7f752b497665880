"""The time that a reaction takes by its own measure: what other times are held against."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.integrate.events import first_crossing
from meanfree.integrate.run import Run


@dataclass(frozen=True)
class OwnTime:
    """A time [s] and what it is, in words; ``gas`` is the gas it is measured on."""

    seconds: float
    words: str
    gas: str


def own_time(run: Run) -> OwnTime | None:
    """The first half-life of the watched gas, else half of the way that it goes in the run.

    None where nothing moves.
    """
    gas = run.experiment.watched
    if gas is None or run.system.initial_x[run.index(gas)] <= 0:
        return None
    half = run.half_lives(gas)[0].duration
    if half is not None:
        return OwnTime(half, "half-life", gas)
    end = float(run.remaining(gas, run.end)[0])
    if run.settled_state is not None:
        i = run.index(gas)
        end = float(run.settled_state[i] / run.system.initial_x[i])
    if abs(1.0 - end) < 1e-9:
        return None

    def left(t: np.ndarray) -> np.ndarray:
        return np.asarray(run.remaining(gas, t))

    time = first_crossing(run.trajectory, left, 0.5 * (1.0 + end))
    words = "half of the way to where it settles"
    if run.settled_state is None:
        words = "half of the way that the run goes"
    return None if time is None else OwnTime(time, words, gas)
