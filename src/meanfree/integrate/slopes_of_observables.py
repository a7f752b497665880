"""Derivatives of observables by addresses, from states and derivatives at the times that matter.

An event g(y(t*), p) = 0 moves by t*' = -(g_y s + g_p)/(g_y f); a maximum of y by
-(ds/dt)/(d2y/dt2). What is read at a time that moves follows it: s + f t'.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.integrate.conditions import Block
from meanfree.integrate.many import Chunk, Runner
from meanfree.integrate.moves import moving
from meanfree.integrate.observables import At, EndTime, HalfLife, Observable, Peak, ReactionTime
from meanfree.integrate.slopes import SlopeRunner, retained
from meanfree.kernel.motion import Moment
from meanfree.kernel.moving import BREAK
from meanfree.kernel.resting import LEFT
from meanfree.kernel.status import Ending

BEYOND = 300.0
"""A run that comes to rest is followed this many times its length to see how its rest moves."""


class SlopingRunner:
    """Carries out chunks of one block: observables, then their derivatives by every address."""

    def __init__(
        self,
        block: Block,
        table: Mapping[str, Floats],
        observables: Sequence[Observable],
        precision: tuple[float, float],
        addresses: Sequence[str],
    ) -> None:
        self.observables = observables
        self.events = list(dict.fromkeys(_events(observables)))
        asked = [*observables, *self.events, EndTime()]
        self.inner = Runner(block, asked, precision)
        self.variation = moving(block, table, addresses)
        self.slopes = SlopeRunner(self.variation, precision)
        self.names = [name for o in observables for name in o.columns]

    def prepare(self, size: int) -> None:
        """Compile, where that pays for all chunks together, before threads start."""
        self.inner.prepare(size)
        rows = len(self.inner.block.rows)
        self.slopes.kernel.settle(rows, min(size, rows))

    def run(self, start: int, stop: int) -> Chunk:
        """Integrate some conditions, and once more with derivatives to the times that matter."""
        rows, values, endings = self.inner.run(start, stop)
        events = values[len(self.names) : -1]
        here = _Here(self, start, start + len(rows), events, values[-1], endings)
        slopes = [slope for o in self.observables for slope in here.slopes(o)]
        endings = here.endings
        wide = np.vstack([values[: len(self.names)], *slopes])
        wide[:, ~np.isin(endings, [int(e) for e in Ending if e.is_good])] = np.nan
        return rows, wide, endings


def _events(observables: Sequence[Observable]) -> Iterator[Observable]:
    """What must be known of the plain runs: times of levels and of maxima."""
    for o in observables:
        if isinstance(o, HalfLife):
            yield from (ReactionTime(o.gas, 1 - 0.5**k) for k in range(1, o.ordinal + 1))
        elif isinstance(o, ReactionTime | Peak):
            yield o


class _Here:
    """States and derivatives of some conditions at the times of their events, and what follows."""

    def __init__(
        self,
        runner: SlopingRunner,
        start: int,
        stop: int,
        events: Floats,
        ends: Floats,
        endings: np.ndarray,
    ) -> None:
        self.runner, self.ends = runner, ends
        self.part = runner.variation.part(start, stop)
        self.system, self.before = self.part.system, endings
        self.automatic = runner.inner.block.end is None
        times: dict[object, Floats] = {"end": ends}
        row = 0
        for event in runner.events:
            times[event] = events[row]
            row += len(event.columns)
        for o in runner.observables:
            if isinstance(o, At) and o.time is not None:
                times[o.time] = np.full(len(ends), o.time)
        finish = np.where(endings == Ending.SETTLED, BEYOND * ends, ends)
        finish = np.where(np.isfinite(finish) & (finish > 0), finish, 1e-30)
        times["finish"] = finish
        self.places = {key: place for place, key in enumerate(times)}
        self.found = runner.slopes.run(self.part, np.array(list(times.values())).T, finish)
        marks = self.found.marks[:, 0]
        good = np.isin(endings, [int(e) for e in Ending if e.is_good])
        self.endings = np.where(good & (marks != Ending.REACHED), marks, endings)
        self.moments: dict[object, Moment] = {}

    def slopes(self, o: Observable) -> Iterator[Floats]:
        """Derivatives of each column of an observable [shape (n_addresses, count)]."""
        if isinstance(o, ReactionTime):
            yield self._level(o)
        elif isinstance(o, HalfLife):
            end, begin = (ReactionTime(o.gas, 1 - 0.5**k) for k in (o.ordinal, o.ordinal - 1))
            yield self._level(end) - (self._level(begin) if o.ordinal > 1 else 0.0)
        elif isinstance(o, Peak):
            yield from self._peak(o)
        elif isinstance(o, At):
            yield self._at(o)
        else:
            yield self._end()

    def _moment(self, key: object) -> Moment:
        if key not in self.moments:
            place = self.places[key]
            self.moments[key] = self.runner.slopes.moment(self.part, self.found, place)
        return self.moments[key]

    def _s(self, key: object) -> Floats:
        """Derivatives of the state at a time that stays [shape (n_addresses, count, states)]."""
        return np.asarray(np.moveaxis(self.found.s[:, self.places[key]], 1, 0))

    def _y(self, key: object) -> Floats:
        return np.asarray(self.found.y[:, self.places[key]])

    def _moved(self, *name: str | int) -> Floats:
        """Derivatives of a number of the System [shape (n_addresses, 1 or count)]."""
        each = [self.part.moved(k, *name) for k in range(len(self.part.moves))]
        return np.array([np.broadcast_to(one, self.part.count) for one in each])

    def _level(self, o: ReactionTime) -> Floats:
        """A level of what is left of a gas: g = x - level theta x0."""
        i, level = self.system.gases.index(o.gas), 1.0 - o.conversion
        times = self.found.times[:, self.places[o]]
        left, slope = retained(self.part, times)
        x0, dx0 = self.part.get("x", i), self._moved("x", i)
        change = self._s(o)[:, :, i] - level * (left * dx0 + slope * x0)
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(-change / self._moment(o).y[:, i])

    def _at_break(self, times: Floats, inside: Floats) -> Floats:
        """``inside``, but what happens at a break moves with it, and at time zero not at all."""
        slope = np.where(times <= 0, 0.0, inside)
        for place in range(1, len(self.system.segments)):
            start = self.part.get(BREAK, place, "start")
            near = np.abs(times - start) <= 1e-12 * start
            slope = np.where(near, self._moved(BREAK, place, "start"), slope)
        return slope

    def _peak(self, o: Peak) -> Iterator[Floats]:
        i, times = self.system.gases.index(o.gas), self.found.times[:, self.places[o]]
        moment = self._moment(o)
        with np.errstate(divide="ignore", invalid="ignore"):
            inside = -np.moveaxis(moment.s, 1, 0)[:, :, i] / moment.y_slope[:, i]
        slope = self._at_break(times, inside)
        at_end = times >= self.ends * (1 - 1e-12)
        slope = np.where(at_end & ~np.isnan(times), self._end(), slope)
        yield slope
        y, V = self._y(o)[:, i], self.part.get("V")
        total = self._s(o)[:, :, i] + moment.y[:, i] * slope
        yield total * V + y * self._moved("V")

    def _end(self) -> Floats:
        """The end of a run: as stated, or as the run itself finds it."""
        if not self.automatic:
            return self._moved("end")
        slope = np.zeros((len(self.part.moves), self.part.count))
        moment, s, y = self._moment("end"), self._s("end"), self._y("end")
        watched = self.runner.inner.watched
        if watched >= 0:
            change = s[:, :, watched] - LEFT * self._moved("x", watched)
            with np.errstate(divide="ignore", invalid="ignore"):
                inside = -change / moment.y[:, watched]
            slope = np.where(self.before == Ending.CONVERTED, inside, slope)
        n = self.system.n_gases
        start = np.stack(
            [np.broadcast_to(self.part.get("x", i), self.part.count) for i in range(n)], axis=1
        )
        rest, s_rest = self._y("finish")[:, :n], self._s("finish")[:, :, :n]
        way = np.abs(start - rest)
        with np.errstate(divide="ignore", invalid="ignore"):
            # The gas that arrives last is the one that is just arriving.
            off = np.abs(np.abs(y[:, :n] - rest) / way - LEFT)
        gas = np.argmin(np.where(np.isfinite(off), off, np.inf), axis=1)
        pick = np.arange(self.part.count)
        part = np.sign(y[pick, gas] - rest[pick, gas]) * LEFT * np.sign(start - rest)[pick, gas]
        dx0 = np.stack([self._moved("x", i) for i in range(n)], axis=2)
        change = s[:, pick, gas] - s_rest[:, pick, gas]
        change = change - part * (dx0 - s_rest)[:, pick, gas]
        with np.errstate(divide="ignore", invalid="ignore"):
            inside = -change / moment.y[pick, gas]
        return np.where(self.before == Ending.SETTLED, inside, slope)

    def _at(self, o: At) -> Floats:
        """A quantity at a time that stays, or at the end, which may move."""
        key = "end" if o.time is None else o.time
        s, y, part, n = self._s(key), self._y(key), self.part, self.system.n_gases
        times = self.found.times[:, self.places[key]]
        if key == "end":
            s = s + self._moment(key).y * self._end()[:, :, None]
        layout = self.runner.slopes.layout
        ones, none = np.ones(part.count), np.zeros(s.shape[:2])
        T, dT = part.get("T") * ones, self._moved("T")
        if layout.has_T:
            T, dT = y[:, layout.T_index], s[:, :, layout.T_index]
        v, dv = ones, none
        if self.system.volume_varies:
            v, dv = y[:, self.system.volume_index], s[:, :, self.system.volume_index]
        if o.quantity == "temperature":
            return dT
        V, dV = part.get("V"), self._moved("V")
        if o.quantity == "volume":
            return dv * V + v * dV
        spread = v + part.get("dead") * T
        d_spread = dv + part.get("dead") * dT + self._moved("dead") * T
        total, d_total = y[:, :n].sum(axis=1), s[:, :, :n].sum(axis=2)
        if o.quantity == "total pressure":
            p = R * T * total / spread
            return np.asarray(R * (T * d_total + dT * total) / spread - p * d_spread / spread)
        i = self.system.gases.index(o.gas)
        x, dx = y[:, i], s[:, :, i]
        if o.quantity == "amount":
            return dx * V + x * dV
        if o.quantity in ("concentration", "partial pressure"):
            c, dc = x / spread, dx / spread - x * d_spread / spread**2
            return dc if o.quantity == "concentration" else R * (dc * T + c * dT)
        with np.errstate(divide="ignore", invalid="ignore"):
            if o.quantity == "mole fraction":
                return np.asarray(dx / total - x * d_total / total**2)
            left, d_left = retained(part, times)
            start = left * part.get("x", i)
            d_start = left * self._moved("x", i) + d_left * part.get("x", i)
            return np.asarray(-dx / start + x * d_start / start**2)
