"""Which value of one number reaches a goal within a time: every root in a range, or why none."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.experiment.plan import Solver
from meanfree.integrate.run import Run
from meanfree.planning.goal import SHARP, Goal, carried_out, reach
from meanfree.planning.readings import Reading, read_many
from meanfree.planning.why_not import Reason, why_not
from meanfree.progress import Progress, silent

POINTS, MANY = 25, 121
"""Values at which the range is looked at before roots are sought between them: for a yield, and
for a conversion, which all runs give at once."""

BEYOND = 20.0
"""Runs go on to this many times the wanted time, so that slower ends have a time to show."""

ROUGH = Solver(rtol=1e-6, atol=1e-16)
"""Tolerances of the runs that only say between which values a root lies."""

GEOMETRIC = 5.0
"""Ratio of the ends of a range above which it is divided geometrically."""

_AT_ONCE = 1e-9  # a goal of the start itself


@dataclass(frozen=True)
class Root:
    """A value that reaches the goal exactly within the time; ``time`` [s] as run again."""

    value: float
    time: float
    run: Run


@dataclass(frozen=True)
class Sizing:
    """The answer to "which value reaches the goal within this time".

    ``values`` [shape (n,)] in the unit of the file; ``times`` [s, shape (n,)] to the goal, NaN
    where it is not reached in `BEYOND` times the wanted time or no run is possible; ``reached``
    [shape (n,)] the most within the time. ``rising[i]`` says whether reaching gets easier with the
    value at root i. ``reason`` is set where there is no root.
    """

    address: str
    unit: str
    within: float
    goal: Goal
    values: Floats
    times: Floats
    reached: Floats
    roots: tuple[Root, ...]
    rising: tuple[bool, ...]
    reason: Reason | None


def grid(low: float, high: float, count: int) -> Floats:
    """Values from ``low`` to ``high``, geometric where the range is wide and positive."""
    if low > 0 and high / low > GEOMETRIC:
        return np.geomspace(low, high, count)
    return np.linspace(low, high, count)


def size(
    experiment: Experiment,
    goal: Goal,
    within: float,
    address: str,
    low: float,
    high: float,
    unit: str = "",
    progress: Progress = silent,
) -> Sizing:
    """Every value of the number at ``address`` between ``low`` and ``high`` (in the unit of the
    file) at which the goal is reached exactly ``within`` that time [s].

    Raises
    ------
    InputError
        The range is empty, or none of its values makes a possible experiment.
    """
    if not low < high:
        raise InputError.at("--between", f"{low:g} {high:g}", "a lower and a higher value")
    values, times, reached = looked_over(experiment, goal, within, address, low, high, progress)
    if not np.isfinite(reached).any():
        raise InputError.at("--between", f"{low:g} {high:g} {unit}".strip(), "possible values")
    excess = reached - goal.level
    found = _roots(_function(experiment, goal, within, address), values, excess)
    roots = []
    for place, (value, _) in enumerate(found):
        progress(place, len(found), "running what was found")
        run = carried_out(with_inputs(experiment, {address: value}), goal, BEYOND * within, SHARP)
        time = reach(run, goal, within).time
        roots.append(Root(value, within if time is None else time, run))
    reason = None
    if not roots:
        ends = [i for i in (0, len(values) - 1) if np.isfinite(excess[i])]
        ends = ends or [int(np.nanargmax(excess))]
        near = min(ends, key=lambda i: abs(excess[i]))
        changed = with_inputs(experiment, {address: float(values[near])})
        reason = why_not(changed, goal, within, float(values[near]), bool(excess[near] >= 0))
    return Sizing(
        address=address,
        unit=unit,
        within=within,
        goal=goal,
        values=values,
        times=times,
        reached=reached,
        roots=tuple(roots),
        rising=tuple(rising for _, rising in found),
        reason=reason,
    )


def looked_over(
    experiment: Experiment,
    goal: Goal,
    within: float,
    address: str,
    low: float,
    high: float,
    progress: Progress = silent,
) -> tuple[Floats, Floats, Floats]:
    """Values over the range, the time to the goal [s] and the most reached within the time.

    A conversion is asked of all values at once; a yield, which may fall again, run by run.
    """
    if goal.kind == "conversion":
        values = grid(low, high, MANY)
        readings = [
            Reading("reaction time", goal.gas, goal.level),
            Reading("conversion", goal.gas, times=(within,)),
        ]
        until = BEYOND * within
        read = read_many(experiment, {address: values}, readings, until=until, solver=ROUGH)
        return values, read[0][:, 0], read[1][:, 0]
    values = grid(low, high, POINTS)
    times, reached = np.full(POINTS, np.nan), np.full(POINTS, np.nan)
    for i, value in enumerate(values):
        progress(i, POINTS, "looking over the range")
        run = _run(experiment, goal, within, address, float(value))
        if run is not None:
            found = reach(run, goal, within)
            times[i] = np.nan if found.time is None else found.time
            reached[i] = found.most
    return values, times, reached


def _run(
    experiment: Experiment, goal: Goal, within: float, address: str, value: float
) -> Run | None:
    """A run with another number; None where that is no possible experiment, or it fails."""
    try:
        changed = with_inputs(experiment, {address: value})
        return carried_out(changed, goal, BEYOND * within, ROUGH)
    except (InputError, ComputationError):
        return None


def _function(
    experiment: Experiment, goal: Goal, within: float, address: str
) -> Callable[[float], float]:
    """Most reached within the time less the goal, as a function of the value."""

    def excess(value: float) -> float:
        changed = with_inputs(experiment, {address: float(value)})
        return reach(carried_out(changed, goal, within, SHARP), goal, within).most - goal.level

    return excess


def _roots(
    excess: Callable[[float], float], values: Floats, known: Floats
) -> list[tuple[float, bool]]:
    """(value, whether the excess rises there) of every root, in order.

    Besides changes of sign on the grid, humps and dips that may cross between its points are
    looked into.
    """
    from scipy.optimize import brentq

    points = [(float(v), float(k)) for v, k in zip(values, known, strict=True) if np.isfinite(k)]
    for i in range(len(points) - 2, 0, -1):
        hidden = _hidden(excess, points[i - 1], points[i], points[i + 1])
        if hidden is not None:
            points.insert(i + (hidden[0] > points[i][0]), hidden)
    found: list[tuple[float, bool]] = []
    for (a, fa), (b, fb) in itertools.pairwise(points):
        if fa == 0.0:
            found.append((a, fb > 0))
        elif fa * fb < 0:
            low, high = excess(a), excess(b)
            if low * high > 0:  # the coarse run and the sharp one disagree: a root at the point
                found.append((a if abs(low) < abs(high) else b, fb > fa))
                continue
            root = brentq(excess, a, b, xtol=1e-13 * max(abs(a), abs(b)), rtol=1e-13)
            found.append((float(root), fb > fa))
    if points and points[-1][1] == 0.0:
        found.append((points[-1][0], points[-1][1] > points[-2][1]))
    return found


def _hidden(
    excess: Callable[[float], float],
    left: tuple[float, float],
    middle: tuple[float, float],
    right: tuple[float, float],
) -> tuple[float, float] | None:
    """A point between grid points on the other side of zero, where a hump or a dip has one."""
    from scipy.optimize import minimize_scalar

    same = left[1] * middle[1] > 0 and middle[1] * right[1] > 0
    sign = 1.0 if middle[1] > 0 else -1.0
    nearest = sign * middle[1] <= min(sign * left[1], sign * right[1])
    if not (same and nearest):
        return None
    # A parabola through the three says whether zero is in sight at all.
    slope = max(abs(middle[1] - left[1]), abs(right[1] - middle[1]))
    if abs(middle[1]) > slope:
        return None
    best = minimize_scalar(
        lambda v: sign * excess(v),
        bounds=(left[0], right[0]),
        method="bounded",
        options={"xatol": 1e-6 * abs(right[0] - left[0])},
    )
    value = sign * float(best.fun)
    return (float(best.x), value) if value * sign < 0 else None
