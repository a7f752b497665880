"""One chunk of conditions after the other: what is asked of the kernel, and what is made of it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.integrate.checks import DRIFT, composition
from meanfree.integrate.conditions import Block
from meanfree.integrate.kernels import kernel_for
from meanfree.integrate.observables import (
    At,
    Found,
    HalfLife,
    HighestPressure,
    Observable,
    Peak,
    ReactionTime,
    levels_of,
)
from meanfree.kernel.engine import Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.records import Kept
from meanfree.kernel.status import Ending
from meanfree.kernel.watching import Functional

Chunk = tuple[np.ndarray, Floats, np.ndarray]
"""Rows of the table, values of the columns [shape (n_columns, n_rows)], endings."""


@dataclass
class Runner:
    """Carries out chunks of one block."""

    block: Block
    observables: Sequence[Observable]
    precision: tuple[float, float]

    def __post_init__(self) -> None:
        system = self.system = self.block.variation.system
        self.kept = kernel_for(self.block)
        self.kernel = self.kept.kernel
        gas = self.block.watched
        self.watched = -1 if gas is None else system.gases.index(gas)
        self.times = sorted(
            {o.time for o in self.observables if isinstance(o, At) and o.time is not None}
        )
        self.names, self.table = composition(self.block.experiment)

    def prepare(self, size: int) -> None:
        """Choose how to carry out all chunks together; compile, where that pays."""
        rows = len(self.block.rows)
        self.kept.settle(rows, min(size, rows))

    def run(self, start: int, stop: int) -> Chunk:
        """Integrate some conditions and work out what was asked of them."""
        stop = min(stop, len(self.block.rows))
        part = self.block.variation.part(start, stop)
        task = self._task(part, start, stop)
        kept = self.kernel.run(part, task)
        endings = self._checked(part, kept)
        values = (
            np.vstack(list(self._columns(part, task, kept)))
            if self.observables
            else np.zeros((0, stop - start))
        )
        failed = ~np.isin(endings, [int(e) for e in Ending if e.is_good])
        values[:, failed] = np.nan
        return self.block.rows[start:stop], values, endings

    def _task(self, part: Variation, start: int, stop: int) -> Task:
        end = self.block.end
        if end is not None and len(end) > 1:
            end = end[start:stop]
        return Task(
            end,
            rtol=self.precision[0],
            atol=self.precision[1],
            watched=self.watched,
            at_least=max((t.value for t in self.block.experiment.plan.report_at), default=0.0),
            functionals=tuple(self._functionals(part)),
            grid=np.array([self.times]) if self.times else None,
        )

    def _functionals(self, part: Variation) -> Iterator[Functional]:
        """Levels, maxima, then every state of a moment, in a fixed order."""
        for gas, fractions in self._fractions().items():
            yield levels_of(self.system.gases.index(gas), fractions, part)
        for o in self._peaks():
            which = (
                range(self.system.n_gases)
                if isinstance(o, HighestPressure)
                else (self.system.gases.index(o.gas),)
            )
            yield Functional(tuple((i, 1.0) for i in which), peak=True)
        if self.times:
            size = self.kernel.program.layout.size
            yield from (Functional(((i, 1.0),)) for i in range(size))

    def _fractions(self) -> dict[str, list[float]]:
        """For each gas the fractions of its start whose times are asked."""
        found: dict[str, set[float]] = {}
        for o in self.observables:
            if isinstance(o, ReactionTime):
                found.setdefault(o.gas, set()).add(1.0 - o.conversion)
            elif isinstance(o, HalfLife):
                levels = {0.5**k for k in range(1, o.ordinal + 1)}
                found.setdefault(o.gas, set()).update(levels)
        return {gas: sorted(levels, reverse=True) for gas, levels in found.items()}

    def _peaks(self) -> list[Peak | HighestPressure]:
        return [o for o in self.observables if isinstance(o, Peak | HighestPressure)]

    def _columns(self, part: Variation, task: Task, kept: Kept) -> Iterator[Floats]:
        fractions, peaks = self._fractions(), self._peaks()
        for o in self.observables:
            if isinstance(o, ReactionTime | HalfLife):
                place, levels = list(fractions).index(o.gas), fractions[o.gas]
                times = kept.events[:, place]
                if isinstance(o, ReactionTime):
                    yield times[:, levels.index(1.0 - o.conversion)]
                else:
                    end = times[:, levels.index(0.5**o.ordinal)]
                    begin = times[:, levels.index(0.5 ** (o.ordinal - 1))] if o.ordinal > 1 else 0.0
                    yield end - begin
            elif isinstance(o, Peak):
                place = len(fractions) + peaks.index(o)
                yield kept.peaks[:, place, 0]
                yield kept.peaks[:, place, 1] * part.get("V")
            elif isinstance(o, HighestPressure):
                yield o.value(part, kept.peaks[:, len(fractions) + peaks.index(o), 1])
            elif isinstance(o, At):
                yield np.broadcast_to(
                    o.value(self.system, part, self._at(o, part, kept)), part.count
                )
            else:
                yield kept.ends[:, -1]

    def _at(self, o: At, part: Variation, kept: Kept) -> Found:
        """The states at a moment, taken apart."""
        system, size = self.system, self.kernel.program.layout.size
        if o.time is None:
            states, times = kept.ends[:, :size], kept.ends[:, size]
        else:
            states = kept.values[:, self.times.index(o.time), -size:]
            times = np.full(part.count, o.time)
        ones = np.ones(part.count)
        T = states[:, -1] if self.kernel.program.layout.has_T else part.get("T") * ones
        v = states[:, system.volume_index] if system.volume_varies else ones
        retained = ones.copy()
        for place in range(1, len(system.segments)):
            start, left = (part.get("break", place, kind) for kind in ("start", "retained"))
            retained = np.where(times > start, retained * left, retained)
        return Found(states[:, : system.n_gases], v, T, retained)

    def _checked(self, part: Variation, kept: Kept) -> np.ndarray:
        """Endings, with runs that lost or made atoms marked."""
        endings, system = kept.marks[:, 0].copy(), self.system
        if not self.names or any(s.retained != 1 for s in system.segments):
            return endings
        n = system.n_gases
        start = np.stack([np.broadcast_to(part.get("x", i), part.count) for i in range(n)], axis=1)
        brought = np.zeros((part.count, len(self.names)))
        for column, j in enumerate(system.open_steps):
            for gas, number in system.net.row(int(j)):
                brought += np.outer(kept.ends[:, n + column] * number, self.table[:, gas])
        drift = np.abs(kept.ends[:, :n] @ self.table.T - start @ self.table.T - brought)
        scale = start @ np.abs(self.table).T + np.abs(brought)
        lost = np.any(drift > DRIFT * scale, axis=1)
        good = np.isin(endings, [int(e) for e in Ending if e.is_good])
        endings[good & lost] = int(Ending.DRIFTED)
        return endings
