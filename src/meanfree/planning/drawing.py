"""Runs from which samples are drawn, many times over: only the times of the samples change.

Equations, kernel and conditions are made once, so that a design costs milliseconds.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from meanfree.equations.build import build_system
from meanfree.equations.system import Floats
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.experiment.plan import Solver
from meanfree.experiment.samples import Sample
from meanfree.integrate.conditions import Block, blocks_of
from meanfree.integrate.observables import At, Found
from meanfree.integrate.single import integrate
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.status import Ending
from meanfree.kernel.watching import Functional
from meanfree.planning.readings import AT, Reading, read_off
from meanfree.sourced import Sourced

MOMENT = 1e-9
"""A sample at the very time of one that the case draws anyway comes before it by this share."""


def with_draws(experiment: Experiment, times: Floats, takes: float) -> Experiment:
    """The experiment with samples that take the fraction ``takes`` of everything at times [s].

    Of several at one time each takes that fraction of what the one before left.
    """
    samples = []
    moments, counts = np.unique(_apart(experiment, times), return_counts=True)
    for at, count in zip(moments, counts, strict=True):
        fraction = -np.expm1(float(count) * np.log1p(-takes))
        samples.append(
            Sample(
                Sourced(float(at), "s", dimension="time"),
                fraction=Sourced(float(fraction), "", dimension="fraction"),
            )
        )
    ordered = sorted([*experiment.samples, *samples], key=lambda sample: sample.at.value)
    return replace(experiment, samples=tuple(ordered))


def _apart(experiment: Experiment, times: Floats) -> Floats:
    """Times, a moment earlier where the case draws a sample of its own."""
    present = [sample.at.value for sample in experiment.samples]
    return np.where(np.isin(times, present), times * (1 - MOMENT), times)


class Drawing:
    """What is read of many conditions of an experiment, just before each sample is drawn.

    ``conditions`` maps addresses to values in the unit of the file, each of shape (n,). Each sample
    takes the fraction ``takes`` of everything; the run goes on with what is left. ``reading`` says
    what is read: a kind that `AT` names. Raises InputError where a condition is impossible.
    """

    def __init__(
        self,
        experiment: Experiment,
        conditions: Mapping[str, Floats],
        reading: Reading,
        takes: float,
        solver: Solver,
    ) -> None:
        self.experiment, self.conditions, self.reading = experiment, conditions, reading
        self.takes, self.solver = takes, solver
        self.quantity = At(AT[reading.kind], reading.gas)
        self.count = len(next(iter(conditions.values())))
        # What a volume takes of a piston depends on the run, so such runs are made one by one.
        self.alone = not experiment.vessel.is_rigid and any(
            sample.volume is not None for sample in experiment.samples
        )
        blocks = [] if self.alone else list(blocks_of(experiment, conditions, self.count))
        if takes > 0 and any(n[0] == "break" for b in blocks for n in b.variation.values):
            # Breaks of the case that differ from condition to condition: samples come between.
            self.alone, blocks = True, []
        self.blocks = [
            (block, Kernel(block.variation.system, varied=frozenset(block.variation.values)))
            for block in blocks
        ]

    def read(self, times: Floats) -> Floats:
        """The quantity at sorted times above 0 s [SI, shape (n, n_times)]; NaN where a run fails.

        Of samples at one time the later ones find what the earlier ones left.
        """
        times = _apart(self.experiment, times)
        moments, places = np.unique(times, return_inverse=True)
        found = np.full((self.count, len(moments)), np.nan)
        if self.alone:
            found[:] = [self._singly(row, times, moments) for row in range(self.count)]
        for block, kernel in self.blocks:
            found[block.rows] = self._run(block, kernel, times, moments)
        earlier = np.arange(len(times)) - np.searchsorted(times, times)
        return np.asarray(found[:, places] * self._left() ** earlier)

    def _singly(self, row: int, times: Floats, moments: Floats) -> Floats:
        """One condition by a run of its own."""
        changed = {address: float(column[row]) for address, column in self.conditions.items()}
        experiment = with_inputs(self.experiment, changed)
        if self.takes > 0:
            experiment = with_draws(experiment, times, self.takes)
        end = Sourced(float(moments[-1]), "s", dimension="time")
        plan = replace(experiment.plan, until=end, report_at=())
        run = integrate(replace(experiment, plan=plan), self.solver)
        return read_off(run, replace(self.reading, times=tuple(moments)))

    def _left(self) -> float:
        """The quantity just after a sample over that just before it."""
        shrinks = self.quantity.quantity == "amount" or self.experiment.vessel.is_rigid
        return 1.0 - self.takes if shrinks else 1.0

    def _run(self, block: Block, kernel: Kernel, times: Floats, moments: Floats) -> Floats:
        system = block.variation.system
        if self.takes > 0:
            # Nothing else of the equations depends on the samples, so the kernel stays.
            drawn = build_system(with_draws(block.experiment, times, self.takes))
            system = replace(system, segments=drawn.segments)
        kernel.system = system
        variation = Variation(system, block.variation.count, block.variation.values)
        size = kernel.program.layout.size
        task = Task(
            moments[-1:],
            rtol=self.solver.rtol,
            atol=self.solver.atol,
            functionals=tuple(Functional(((i, 1.0),)) for i in range(size)),
            grid=moments[None],
        )
        kept = kernel.run(variation, task)
        read = [
            self.quantity.value(system, variation, self._found(kernel, variation, states))
            for states in np.moveaxis(kept.values[:, :, -size:], 1, 0)
        ]
        found = np.stack([np.broadcast_to(column, variation.count) for column in read], axis=1)
        failed = ~np.isin(kept.marks[:, 0], [int(e) for e in Ending if e.is_good])
        found[failed] = np.nan
        return found

    @staticmethod
    def _found(kernel: Kernel, variation: Variation, states: Floats) -> Found:
        """The states of one moment, taken apart; what samples retained is not asked for."""
        system, ones = variation.system, np.ones(variation.count)
        T = states[:, -1] if kernel.program.layout.has_T else variation.get("T") * ones
        v = states[:, system.volume_index] if system.volume_varies else ones
        return Found(states[:, : system.n_gases], v, T, ones)
