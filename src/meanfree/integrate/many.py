"""Many runs of one experiment: addresses in, observables out, in memory that does not grow with
time.

The kernel integrates; only what is asked is kept of each run. Chunks go to threads, which do not
wait for each other because the kernel gives Python's lock away.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import TYPE_CHECKING, Any

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.chunks import Chunk, Runner
from meanfree.integrate.conditions import Block, Conditions, as_table
from meanfree.integrate.observables import (
    QUANTITIES,
    At,
    EndTime,
    HalfLife,
    HighestPressure,
    Observable,
    ReactionTime,
)
from meanfree.kernel.status import Ending
from meanfree.progress import Progress, silent

if TYPE_CHECKING:
    import pandas as pd

    from meanfree.integrate.slopes_of_observables import SlopingRunner

__all__ = ["ENDING", "Chunk", "Runner", "Runs", "many"]

CHUNK = 20_000
"""Conditions that one thread takes at a time."""

SHARE = 64
"""Fewer conditions than this are not worth another thread."""

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
    unless given; ``workers`` threads share the work, by default one for each core. Whoever calls
    again and again keeps a `Runs`.

    Raises
    ------
    InputError
        An address, a value or an observable is impossible.
    """
    runs = Runs(
        experiment,
        observables,
        sensitivities=sensitivities,
        rtol=rtol,
        atol=atol,
        workers=workers,
    )
    return runs.frame(conditions, progress)


class Runs:
    """The same experiment and the same questions under conditions that come table after table.

    What the first table takes (Systems to see how numbers follow addresses, the kernel) serves the
    next. Any address may vary. A condition costs microseconds, except where something switches
    between conditions (the form of a wall law, samples in another order): those few are built one
    by one, at some 0.4 ms each. Arguments and errors are those of `many`.
    """

    def __init__(
        self,
        experiment: Experiment,
        observables: Sequence[Observable],
        *,
        sensitivities: Sequence[str] = (),
        rtol: float | None = None,
        atol: float | None = None,
        workers: int | None = None,
    ) -> None:
        _refuse(experiment, observables, bool(sensitivities))
        solver = experiment.plan.solver
        self.observables = tuple(observables)
        self.sensitivities = tuple(sensitivities)
        self.precision = (
            solver.rtol if rtol is None else rtol,
            solver.atol if atol is None else atol,
        )
        self.workers = workers or os.cpu_count() or 1
        self.conditions = Conditions(experiment)

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns of the observables, then of their derivatives."""
        plain = [name for o in self.observables for name in o.columns]
        slopes = [f"d_{name}_by_{address}" for name in plain for address in self.sensitivities]
        return (*plain, *slopes)

    def arrays(
        self, conditions: Mapping[str, Any], progress: Progress = silent
    ) -> tuple[Floats, np.ndarray]:
        """Observables [shape (n_columns, n_conditions)] and `Ending`s as numbers [(n_conditions,)].

        NaN is what was not reached.
        """
        return self._arrays(*as_table(conditions), progress)

    def frame(self, conditions: Mapping[str, Any], progress: Progress = silent) -> pd.DataFrame:
        """Conditions, observables and endings as a table; see `many`."""
        import pandas as pd

        table, count = as_table(conditions)
        results, endings = self._arrays(table, count, progress)
        words = pd.Index([ending.sentence for ending in Ending])
        # A column that is asked for twice, by times that are the same, is there once.
        first = {name: place for place, name in reversed(list(enumerate(self.columns)))}
        names = list(dict.fromkeys(self.columns))
        if len(names) < len(results):
            results = results[[first[name] for name in names]]
        parts = [
            pd.DataFrame(np.array(list(table.values())).T, columns=list(table), copy=False),
            pd.DataFrame(results.T, columns=names, copy=False),
            pd.DataFrame({ENDING: pd.Categorical.from_codes(endings, words)}),
        ]
        return pd.concat(parts, axis=1)

    def _arrays(
        self, table: Mapping[str, Floats], count: int, progress: Progress
    ) -> tuple[Floats, np.ndarray]:
        results = np.full((len(self.columns), count), np.nan)
        endings = np.zeros(count, np.int64)
        done = 0
        for block in self.conditions.blocks(table, count):
            for rows, values, marks in self._carried_out(block, table):
                results[:, rows] = values
                endings[rows] = marks
                done += len(marks)
                progress(done, count, "runs")
        return results, endings

    def _carried_out(self, block: Block, table: Mapping[str, Floats]) -> Iterator[Chunk]:
        """(rows, values, endings) of chunk after chunk."""
        count = len(block.rows)
        threads = max(1, min(self.workers, -(-count // SHARE)))
        size = min(CHUNK, max(SHARE, -(-count // threads)))
        runner = self._runner(block, table)
        runner.prepare(size)
        if threads == 1:
            for start in range(0, count, size):
                yield runner.run(start, start + size)
            return
        # What is still to be compiled is compiled before threads start.
        runner.run(0, 1)
        with ThreadPoolExecutor(threads) as pool:
            # A few chunks ahead of what is taken, so that results do not pile up.
            pending: list[Any] = []
            for start in range(0, count, size):
                pending.append(pool.submit(runner.run, start, start + size))
                if len(pending) > 2 * threads:
                    yield pending.pop(0).result()
            for future in pending:
                yield future.result()

    def _runner(self, block: Block, table: Mapping[str, Floats]) -> Runner | SlopingRunner:
        if not self.sensitivities:
            return Runner(block, self.observables, self.precision)
        from meanfree.integrate.slopes_of_observables import SlopingRunner

        return SlopingRunner(block, table, self.observables, self.precision, self.sensitivities)


def _counts_conversion(o: Observable) -> bool:
    """Whether an observable counts what reaction consumed, apart from what flowed out."""
    return isinstance(o, ReactionTime | HalfLife) or getattr(o, "quantity", "") == "conversion"


def _refuse(experiment: Experiment, observables: Sequence[Observable], sloping: bool) -> None:
    gases = set(experiment.gas_named)
    leaving = {gas for step in experiment.flow_steps for gas, _ in step.reactants}
    problems = []
    if not experiment.vessel.is_rigid and any(s.volume is not None for s in experiment.samples):
        expected = "samples as fractions: what a volume takes of a piston differs from run to run"
        problems.append(Problem("samples", "a volume drawn from a piston", expected))
    for o in observables:
        if isinstance(o, HighestPressure):
            moves = experiment.vessel.is_rigid and experiment.constant_temperature is None
            if moves or sloping:
                found = "the highest pressure " + ("as T changes" if moves else "with derivatives")
                problems.append(Problem("observables", found, "total pressures at times"))
            continue
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
        elif gas in leaving and _counts_conversion(o):
            # What outflow left of the gas is an integral over the run that lanes do not carry.
            found = f"conversions of {gas}, which also flows out"
            expected = "amounts or concentrations; `run` follows such conversions, one by one"
            problems.append(Problem("observables", found, expected))
    if problems:
        raise InputError(problems)
