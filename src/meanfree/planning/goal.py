"""What is to be reached: a conversion of a filled gas, or a yield of a product."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from meanfree.equations.system import Floats
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.plan import Solver
from meanfree.integrate.events import first_crossing
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.sourced import Sourced

SHARP = Solver(rtol=1e-10, atol=1e-22)
"""Tolerances of runs that are inverted: two orders finer than the 1e-8 promised."""


@dataclass(frozen=True)
class Goal:
    """A conversion of ``gas``, or its yield: moles formed per mole filled of ``basis``."""

    kind: Literal["conversion", "yield"]
    gas: str
    level: float
    basis: str = ""

    def value(self, run: Run, t: Floats) -> Floats:
        """What is reached at times [s]; a fraction for a conversion, mol/mol for a yield."""
        if self.kind == "conversion":
            return run.conversion(self.gas, t)
        amounts = run.amounts(t)[run.index(self.gas)] / run.retained(t)
        start = run.experiment.moles
        return np.asarray((amounts - start[self.gas]) / start[self.basis])


@dataclass(frozen=True)
class Reach:
    """How far a run came: when it reached the goal [s], the most it reached and when [s]."""

    time: float | None
    most: float
    most_at: float


def reach(run: Run, goal: Goal, within: float | None = None) -> Reach:
    """The first time at which a run reaches a goal, and the most it reaches ``within`` a time."""
    time = first_crossing(run.trajectory, lambda t: goal.value(run, t), goal.level)
    end = run.end if within is None else min(within, run.end)
    grid = run.trajectory.fine_times
    grid = np.append(grid[grid < end], end)
    values = goal.value(run, grid)
    i = int(np.argmax(values))
    if i == len(grid) - 1 or i == 0:
        return Reach(time, float(values[i]), float(grid[i]))
    from scipy.optimize import minimize_scalar

    best = minimize_scalar(
        lambda t: -float(goal.value(run, np.array([t]))[0]),
        bounds=(grid[i - 1], grid[i + 1]),
        method="bounded",
        options={"xatol": 1e-10 * end},
    )
    return Reach(time, max(-float(best.fun), float(values[i])), float(best.x))


def carried_out(
    experiment: Experiment, goal: Goal, until: float | None, solver: Solver | None = None
) -> Run:
    """A run of the experiment to ``until`` [s], or by itself with the goal's gas watched."""
    plan = experiment.plan
    watch = plan.watch
    if goal.kind == "conversion":
        watch = goal.gas
    end = None if until is None else Sourced(until, "s", dimension="time")
    plan = replace(plan, until=end, watch=watch, report_at=())
    return integrate(replace(experiment, plan=plan), solver or plan.solver)
