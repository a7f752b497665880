"""When an open-ended run is done: its watched gas is gone, or nothing moves any more."""

from __future__ import annotations

import numpy as np

from meanfree.equations.bearing import NOISE, bearing_on, turnovers
from meanfree.equations.system import Floats, System

CONVERTED = 0.999
"""Fraction of the watched gas, or of the way to where it settles, that ends an automatic run."""

WINDOW = 100.0
"""Nothing may move between t/WINDOW and t for a run to count as settled."""

STILL = 1e-6
"""Change, over the most that was ever there, that counts as no movement."""

BOUND = 1e9
"""Growth of the amount of all gases at which an automatic run is given up."""

HORIZON = 1e17
"""The longest automatic run [s]: about three billion years."""


MOST_STEPS = 30_000
"""Steps after which an automatic run is ended as it is: one that swings for ever never rests.

Ordinary runs take some hundreds; common practice, no source.
"""


class Settling:
    """Watches a run after each step; remembers why it ended it.

    Compared with the most that was ever there of each gas, not with the total: a gas that is
    only just appearing grows by as much as there is of it, so an induction period is never
    taken for rest. Nor is the pause before a slow step that follows a fast equilibrium, however
    far apart the two are. A run does not end before ``at_least`` [s].
    """

    def __init__(self, system: System, watched: int | None, at_least: float = 0.0) -> None:
        self.system, self.watched, self.at_least = system, watched, at_least
        self.times: list[float] = [0.0]
        self.states: list[Floats] = [system.initial_state]
        self.most = np.abs(system.initial_state)
        self.reason = ""
        gases = list(range(system.n_gases)) if watched is None else bearing_on(system, watched)
        self.bearing = gases
        self.turnovers = turnovers(system, gases)
        self.kept = np.r_[gases, system.volume_index : system.size].astype(np.intp)
        # n/(theta n0) is what counts: drawn samples take their share without converting it.
        self.goal = (1.0 - CONVERTED) * float(np.prod([s.retained for s in system.segments]))

    def __call__(self, t: float, y: Floats, last_segment: bool) -> bool:
        """True when the run is done; ``reason`` then says why."""
        self.times.append(t)
        self.states.append(y)
        np.maximum(self.most, np.abs(y), out=self.most)
        if self.watched is not None:
            start = self.system.initial_x[self.watched]
            if start > 0 and y[self.watched] <= self.goal * start:
                self.reason = "converted"
                return last_segment and t >= self.at_least
        at_end = last_segment and t >= self.at_least
        if at_end and self._still(t, y) and not self._waits(t, y):
            self.reason = "settled"
            return True
        if y[: self.system.n_gases].sum() > BOUND * self.system.total_concentration:
            self.reason = "unbounded"
            return True
        if len(self.times) > MOST_STEPS:
            self.reason = "restless"
            return True
        return False

    def _still(self, t: float, y: Floats) -> bool:
        begin = int(np.searchsorted(self.times, t / WINDOW))
        start = self.system.segments[-1].start
        if self.times[begin] <= start or len(self.times) - begin < 3:
            # A vessel in which nothing happens takes giant steps at once.
            return len(self.times) > 5 and bool(np.all(self._movement(1, y) == 0))
        # One state that differs will do to say no: all of them are asked only near the end, or
        # the time taken would go with the square of the steps.
        for some in (begin, (begin + len(self.times)) // 2):
            if np.any(self._movement(some, y, some + 1) > STILL):
                return False
        return bool(np.all(self._movement(begin, y) <= STILL))

    def _movement(self, begin: int, y: Floats, end: int | None = None) -> Floats:
        """Largest change of each gas (and v, T) since some steps, over the most ever there."""
        since = np.array(self.states[begin:end])[:, self.kept]
        most = self.most[self.kept]
        change = np.abs(since - y[self.kept]).max(axis=0)
        return np.asarray(change / np.where(most > 0, most, 1.0), float)

    def _waits(self, t: float, y: Floats) -> bool:
        """True while a step that is out of balance has not yet had the time to act.

        That is what it takes to use up what is there of its scarcest gas at its present rate.
        """
        if not self.turnovers:
            return False
        from meanfree.equations.arrays import ArrayEquations

        system, equations = self.system, ArrayEquations(self.system)
        v = float(y[system.volume_index]) if system.volume_varies else 1.0
        rates = v * equations.rates(t, y, system.segments[-1])
        for one in self.turnovers:
            back = rates[one.reverse] if one.reverse >= 0 else 0.0
            net, both = rates[one.step] - back, rates[one.step] + back
            taken = one.left if net > 0 else one.right
            if abs(net) <= NOISE * both or not taken:
                continue
            if any(y[gas] <= STILL * self.most[gas] for gas, _ in taken):
                continue
            time = min(y[gas] / number for gas, number in taken) / abs(net)
            if t < time < HORIZON:
                return True
        return False
