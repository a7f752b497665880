"""Why a goal is not reached in time: equilibrium, another step, the limit of collisions."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from meanfree.errors import ComputationError
from meanfree.experiment.equilibrium import equilibrium
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.run import Run
from meanfree.planning.factors import factored, scaled
from meanfree.planning.goal import Goal, Reach, carried_out, reach
from meanfree.rates.ceiling import ceiling

Why = Literal[
    "reached sooner", "equilibrium", "another gas", "another step", "limit of collisions", "slow"
]

GONE = 0.01
"""A reactant counts as used up where less than this share of it is left."""


@dataclass(frozen=True)
class Reason:
    """Why there is no root, at the end of the range that comes nearest.

    ``at`` is that end, in the unit of the file; ``most`` what is reached there within the time,
    ``eventually`` what is ever reached, ``time`` [s] to the goal there (None: never).
    ``named`` is the gas or the step in the way; ``at_limit`` [s] the time to the goal if every
    encounter reacted, None where it does not apply or is never.
    """

    why: Why
    at: float
    most: float
    eventually: float
    time: float | None
    named: str = ""
    at_limit: float | None = None


def why_not(experiment: Experiment, goal: Goal, within: float, at: float, sooner: bool) -> Reason:
    """The reason at one end of a range; ``sooner`` where the goal is reached before the time."""
    run = carried_out(experiment, goal, None)
    whole = reach(run, goal)
    most = reach(run, goal, within).most
    if sooner:
        return Reason("reached sooner", at, most, whole.most, whole.time)
    resting = at_equilibrium(experiment, goal)
    if resting is not None and resting < goal.level and goal.kind == "conversion":
        return Reason("equilibrium", at, most, resting, None)
    if whole.time is None:
        return _never(run, goal, at, most, whole, resting)
    limit = at_collision_limit(experiment, goal)
    if limit is not None and (limit.time is None or limit.time > within):
        reason: Why = "limit of collisions"
        return Reason(reason, at, most, whole.most, whole.time, at_limit=limit.time)
    time = None if limit is None else limit.time
    return Reason("slow", at, most, whole.most, whole.time, at_limit=time)


def at_equilibrium(experiment: Experiment, goal: Goal) -> float | None:
    """What the goal's quantity is at equilibrium; None where there is none to state."""
    try:
        resting = equilibrium(experiment)
    except ComputationError:
        return None
    if resting is None:
        return None
    start = experiment.moles
    if goal.kind == "conversion":
        return 1.0 - resting.moles[goal.gas] / start[goal.gas]
    return (resting.moles[goal.gas] - start[goal.gas]) / start[goal.basis]


def _never(
    run: Run, goal: Goal, at: float, most: float, whole: Reach, resting: float | None
) -> Reason:
    """The goal is never reached: a partner runs out, or another step takes what was wanted."""
    gas = goal.gas if goal.kind == "conversion" else goal.basis
    for other in run.consumed:
        if other != gas and float(run.remaining(other, run.end)[0]) < GONE:
            return Reason("another gas", at, most, whole.most, None, other)
    if resting is not None and resting < goal.level:
        return Reason("equilibrium", at, most, whole.most, None)
    return Reason("another step", at, most, whole.most, None, _rival(run, goal))


def _rival(run: Run, goal: Goal) -> str:
    """The step that takes most of the wanted gas, or of what it is made of."""
    times = run.trajectory.times
    rates = run.rates(times) * run.volume(times)
    extents = 0.5 * (rates[:, 1:] + rates[:, :-1]) @ np.diff(times)
    wanted, source = run.index(goal.gas), run.index(goal.basis or goal.gas)
    taken: dict[str, float] = {}
    for j, step in enumerate(run.system.steps):
        net = dict(run.system.net.row(j))
        lost = -net.get(wanted, 0.0) if goal.kind == "yield" else net.get(wanted, 0.0)
        if goal.kind == "yield" and net.get(wanted, 0.0) == 0:
            lost = -net.get(source, 0.0)
        if lost > 0:
            taken[step] = lost * float(extents[j])
    return max(taken, key=lambda name: taken[name]) if taken else ""


def at_collision_limit(experiment: Experiment, goal: Goal) -> Reach | None:
    """How the goal would be reached if every encounter that uses up the gas reacted.

    None where no such step is an encounter of two gases of known mass and diameter.
    """
    changed, any_limit = factored(experiment), False
    gas = goal.gas if goal.kind == "conversion" else goal.basis
    T = experiment.temperature.initial
    for place in range(len(changed.steps)):
        step = changed.steps[place]
        if step.net.get(gas, 0.0) >= 0 or gas not in step.partners:
            continue
        limit = ceiling(tuple(changed.gas_named[name] for name in step.partners), T)
        k = float(step.law.rate_constant(changed.context(step), T, changed.initial_pressure, 1.0))
        if limit is None or not 0 < k < limit.Z:
            continue
        raised = scaled(changed, step, limit.Z / k)
        if raised is not None:
            changed, any_limit = raised, True
    if not any_limit:
        return None
    return reach(carried_out(changed, goal, None), goal)
