"""Many runs of one experiment: addresses in, observables out, in memory that does not grow with
time.

The kernel integrates; only what is asked is kept of each run. Chunks go to threads, which do not
wait for each other because the kernel gives Python's lock away.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.checks import DRIFT, composition
from meanfree.integrate.conditions import Block, as_table, blocks_of
from meanfree.integrate.observables import (
    QUANTITIES,
    At,
    EndTime,
    Found,
    HalfLife,
    Observable,
    Peak,
    ReactionTime,
    levels_of,
)
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.records import Kept
from meanfree.kernel.status import Ending
from meanfree.kernel.watching import Functional
from meanfree.progress import Progress, silent

if TYPE_CHECKING:
    import pandas as pd

    from meanfree.integrate.slopes_of_observables import SlopingRunner

CHUNK = 20_000
"""Conditions that one thread takes at a time."""

ENDING = "ending"
"""The column that says how each run ended."""


def many(
    experiment: Experiment,
    conditions: Mapping[str, Any],
    observables: Sequence[Observable],
    *,
    sensitivities: Sequence[str] = (),
    rtol: float | None = None,
    atol: float | None = None,
    workers: int | None = None,
    progress: Progress = silent,
) -> pd.DataFrame:
    """Integrate an experiment under many conditions.

    ``conditions`` maps addresses to columns (a DataFrame does), in the unit and convention of the
    case; every row is one run. The frame returned has the conditions, then a column for each
    observable (its name ends in its unit, NaN is what was not reached), then ``ending`` in words.
    A run that failed has NaN everywhere and says why. ``sensitivities`` are addresses: for each
    of them come a column ``d_COLUMN_by_ADDRESS`` for every column, the derivative by the number at
    the address in the unit of the case; events and ends that move are followed.

    ``rtol`` and ``atol`` (over the initial concentration) are those of the experiment's solver
    unless given; ``workers`` threads share the work, by default one for each core.

    Raises
    ------
    InputError
        An address, a value or an observable is impossible.
    """
    import pandas as pd

    _refuse(experiment, observables)
    table, count = as_table(conditions)
    solver = experiment.plan.solver
    precision = (solver.rtol if rtol is None else rtol, solver.atol if atol is None else atol)
    names = [name for o in observables for name in o.columns]
    names += [f"d_{name}_by_{address}" for name in names for address in sensitivities]
    results = np.full((len(names), count), np.nan)
    endings = np.zeros(count, np.int64)
    done = 0
    for rows, values, marks in _carried_out(
        experiment, table, count, observables, precision, workers, tuple(sensitivities)
    ):
        results[:, rows] = values
        endings[rows] = marks
        done += len(marks)
        progress(done, count, "runs")
    words = pd.Index([ending.sentence for ending in Ending])
    said = {ENDING: pd.Categorical.from_codes(endings, words)}
    return pd.DataFrame({**table, **dict(zip(names, results, strict=True)), **said}, copy=False)


def _refuse(experiment: Experiment, observables: Sequence[Observable]) -> None:
    gases = set(experiment.gas_named)
    problems = []
    if not experiment.vessel.is_rigid and any(s.volume is not None for s in experiment.samples):
        expected = "samples as fractions: what a volume takes of a piston differs from run to run"
        problems.append(Problem("samples", "a volume drawn from a piston", expected))
    for o in observables:
        gas = getattr(o, "gas", "")
        needs = not isinstance(o, At) or "{}" in QUANTITIES.get(o.quantity, ("{}",))[0]
        if isinstance(o, At) and o.quantity not in QUANTITIES:
            expected = "one of " + ", ".join(QUANTITIES)
            problems.append(Problem("observables", repr(o.quantity), expected))
        elif needs and not isinstance(o, EndTime) and gas not in gases:
            expected = "one of " + ", ".join(sorted(gases))
            problems.append(Problem("observables", f"the gas {gas!r}", expected))
        elif isinstance(o, ReactionTime) and not 0 < o.conversion < 1:
            problems.append(
                Problem("observables", f"conversion {o.conversion:g}", "between 0 and 1")
            )
    if problems:
        raise InputError(problems)


Chunk = tuple[np.ndarray, Floats, np.ndarray]


def _carried_out(
    experiment: Experiment,
    table: Mapping[str, Floats],
    count: int,
    observables: Sequence[Observable],
    precision: tuple[float, float],
    workers: int | None,
    sensitivities: tuple[str, ...],
) -> Iterator[Chunk]:
    """(rows, values, endings) of chunk after chunk."""
    threads = max(1, min(workers or os.cpu_count() or 1, -(-count // 64)))
    with ThreadPoolExecutor(threads) as pool:
        for block in blocks_of(experiment, table, count):
            size = min(CHUNK, max(64, -(-len(block.rows) // threads)))
            runner: Runner | SlopingRunner = Runner(block, observables, precision)
            if sensitivities:
                from meanfree.integrate.slopes_of_observables import SlopingRunner

                runner = SlopingRunner(block, table, observables, precision, sensitivities)
            runner.prepare(size)
            starts = range(0, len(block.rows), size)
            # A few chunks ahead of what is taken, so that results do not pile up.
            pending: list[Any] = []
            for start in starts:
                pending.append(pool.submit(runner.run, start, start + size))
                if len(pending) > 2 * threads:
                    yield pending.pop(0).result()
            for future in pending:
                yield future.result()


@dataclass
class Runner:
    """Carries out chunks of one block."""

    block: Block
    observables: Sequence[Observable]
    precision: tuple[float, float]

    def __post_init__(self) -> None:
        system = self.system = self.block.variation.system
        self.kernel = Kernel(system, varied=frozenset(self.block.variation.values))
        watched = self.block.experiment.watched
        self.watched = -1 if watched is None else system.gases.index(watched)
        self.times = sorted(
            {o.time for o in self.observables if isinstance(o, At) and o.time is not None}
        )
        self.names, self.table = composition(self.block.experiment)

    def prepare(self, size: int) -> None:
        """Compile, where that pays for all chunks together, before threads start."""
        self.kernel.settle(len(self.block.rows), min(size, len(self.block.rows)))
        self.kernel.run(
            self.block.variation.part(0, 1), self._task(self.block.variation.part(0, 1), 0, 1)
        )

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
            functionals=tuple(self._functionals(part)),
            grid=np.array([self.times]) if self.times else None,
        )

    def _functionals(self, part: Variation) -> Iterator[Functional]:
        """Levels, maxima, then every state of a moment, in a fixed order."""
        for gas, fractions in self._fractions().items():
            yield levels_of(self.system.gases.index(gas), fractions, part)
        for o in self._peaks():
            yield Functional(((self.system.gases.index(o.gas), 1.0),), peak=True)
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

    def _peaks(self) -> list[Peak]:
        return [o for o in self.observables if isinstance(o, Peak)]

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
        for segment in system.segments:
            retained = np.where(times > segment.start, retained * segment.retained, retained)
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
