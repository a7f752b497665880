"""Predictions under changed inputs by the compiled integrator, prepared once for a whole fit.

A fit asks for the same run again and again, and for its derivatives by what it fits: the kernel
solves the variational equations beside the run, so a Jacobian costs little more than a prediction.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from meanfree.equations.system import Floats, System
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.integrate.conditions import Block
from meanfree.integrate.moves import moving
from meanfree.integrate.numbers import Numbers, numbers_of
from meanfree.integrate.slopes import SlopeRunner, Slopes, retained
from meanfree.kernel.moving import MovingVariation
from meanfree.kernel.parameters import Variation
from meanfree.kernel.slots import Name
from meanfree.kernel.status import Ending
from meanfree.measured.prediction import SOLVER, Prediction, kept_at
from meanfree.measured.signals import Change

SLOPES = (1e-9, 1e-16)
"""Tolerances of derivatives, relative and absolute (over the total): those of a fit need eight
digits or so, since they only show the way to its minimum."""


@dataclass(frozen=True)
class Differentiated:
    """A prediction with its changes by every input (file's unit), and by time [1/s]."""

    prediction: Prediction
    by_input: Mapping[str, Change]
    by_time: Change


class Predictor:
    """What the gas in the vessel does when some inputs of its experiment change."""

    def __init__(self, experiment: Experiment, keys: Sequence[str]) -> None:
        # How long a run lasts follows from the times that are asked for.
        self.experiment = replace(experiment, plan=replace(experiment.plan, until=None))
        self.keys = tuple(keys)
        self.base = numbers_of(self.experiment)
        self.system = self.base.system
        self.runners: dict[int, SlopeRunner] = {}

    def many(
        self, rows: Sequence[Mapping[str, float]], times: Sequence[Floats]
    ) -> list[Prediction]:
        """The gas under every row of changed inputs (file's unit), each at times of its own [s].

        All rows ask for equally many times. Raises ComputationError where a run failed or where
        the rows differ in more than numbers, InputError for an impossible value.
        """
        built = [numbers_of(with_inputs(self.experiment, row)) for row in rows]
        variation = self._variation(built)
        found = self._run(MovingVariation(self.system, len(rows), variation, ()), times)
        return [
            self._prediction(one.system, y, t)
            for one, y, t in zip(built, found.y, times, strict=True)
        ]

    def differentiated(self, row: Mapping[str, float], times: Floats) -> Differentiated:
        """The gas under one row of changed inputs, with its derivatives.

        Raises as `many`.
        """
        changed = with_inputs(self.experiment, row)
        built = numbers_of(changed)
        values = self._variation([built])
        plain = Variation(self.system, 1, values)
        block = Block(changed, np.array([0]), plain, None, self.base.structure, None)
        part = moving(block, {}, self.keys)
        found = self._run(part, [times])
        prediction = self._prediction(built.system, found.y[0], times)
        wide = np.concatenate([found.y[0], found.s[0].reshape(len(times), -1)], axis=1)
        rate = self.runners[len(part.moves)].motion.at(part, wide, times).y
        left = retained(part, times)[1]
        by_input = {
            key: self._change(part, k, found.s[0][:, k], prediction.temperature, left[k])
            for k, key in enumerate(self.keys)
        }
        still = self._of_states(rate, np.zeros(1), float(part.get("dead")[0]))
        return Differentiated(prediction, by_input, still)

    def _variation(self, built: Sequence[Numbers]) -> dict[Name, Floats]:
        """The numbers that differ from those the kernel was made with."""
        if any(one.structure != self.base.structure for one in built):
            raise ComputationError("the rows differ in more than numbers")
        table = np.array([one.values for one in built])
        same = (table == self.base.values) | np.isnan(table)
        return {
            name: table[:, place]
            for place, name in enumerate(self.base.names)
            if name != ("end",) and not same[:, place].all()
        }

    def _run(self, part: MovingVariation, times: Sequence[Floats]) -> Slopes:
        kind, table = len(part.moves), np.array(times)
        runner = self.runners.get(kind)
        if runner is None or not runner.serves(part):
            runner = SlopeRunner(part, SLOPES if kind else (SOLVER.rtol, SOLVER.atol))
            self.runners[kind] = runner
        end = np.maximum(table.max(axis=1), 1e-30)
        found = runner.run(part, table, end)
        if np.any(found.marks[:, 0] != Ending.REACHED):
            raise ComputationError("a run under changed inputs failed")
        return found

    def _prediction(self, system: System, y: Floats, times: Floats) -> Prediction:
        """States [shape (n_times, states)] in the words of the trade."""
        n = system.n_gases
        T = (
            y[:, -1]
            if system.mode != "isothermal"
            else np.full(len(times), system.initial_temperature)
        )
        v = y[:, system.volume_index] if system.volume_varies else np.ones(len(times))
        return Prediction(system, y[:, :n].T, v + system.dead * T, T, kept_at(system, times))

    def _change(self, part: MovingVariation, k: int, s: Floats, T: Floats, left: Floats) -> Change:
        dead = float(part.get("dead")[0])
        moved = self._of_states(s, part.moved(k, "T"), dead)
        filled = [float(part.moved(k, "x", i)[0]) for i in range(self.system.n_gases)]
        spread = moved.spread + part.moved(k, "dead") * T
        return replace(moved, spread=spread, filled=np.array(filled), retained=left)

    def _of_states(self, s: Floats, by_T: Floats, dead: float) -> Change:
        """A change of the states [shape (n_times, states)]; ``by_T`` where T is none of them."""
        system, none = self.system, np.zeros(len(s))
        T = s[:, -1] if system.mode != "isothermal" else none + by_T
        v = s[:, system.volume_index] if system.volume_varies else none
        n = system.n_gases
        return Change(s[:, :n].T, v + dead * T, T, none, np.zeros(n))
