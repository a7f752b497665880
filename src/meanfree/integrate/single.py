"""Integrate one experiment: choose, step, stop, check, and hand over a Run."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from meanfree.equations.build import build_system
from meanfree.equations.system import Floats, System
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.plan import Solver
from meanfree.integrate.checks import check
from meanfree.integrate.events import last_crossing
from meanfree.integrate.ranges import beyond_known_energies, beyond_laws
from meanfree.integrate.run import Run, Status
from meanfree.integrate.settling import BOUND, CONVERTED, HORIZON, Settling
from meanfree.integrate.stepping import Stepped, equations_for, step_through


def integrate(experiment: Experiment, solver: Solver | None = None) -> Run:
    """Integrate an experiment to the time it states, or until it is done.

    Raises
    ------
    ComputationError
        The integrator failed, the run did not keep what it must keep, or it left the temperatures
        at which its rate laws or the energies of its gases are known.
    """
    solver = experiment.plan.solver if solver is None else solver
    system = build_system(experiment)
    equations = equations_for(system)
    settled: Floats | None = None
    if experiment.plan.until is not None:
        stepped = step_through(equations, solver, experiment.plan.until.value)
        status = Status.REACHED
    else:
        stepped, status, settled = _open_ended(experiment, system, equations, solver)
    if stepped.failure:
        raise ComputationError(stepped.failure)
    invariants = check(experiment, system, stepped.trajectory, solver.rtol)
    if invariants.failures:
        raise ComputationError("the run failed its own checks: " + "; ".join(invariants.failures))
    states = stepped.trajectory(np.array([0.0, stepped.trajectory.end]))[: system.n_gases]
    moved = bool(np.any(states[:, 0] != states[:, -1]))
    beyond = [
        *beyond_known_energies(experiment, system, stepped.trajectory),
        *beyond_laws(experiment, system, stepped.trajectory),
    ]
    errors = [text for text, error in beyond if error]
    if errors:
        raise ComputationError("; ".join(errors))
    return Run(
        experiment,
        system,
        stepped.trajectory,
        status,
        _message(experiment, status, moved),
        stepped.counters,
        solver.method,
        solver.rtol,
        invariants,
        settled,
        tuple(text for text, _ in beyond),
    )


def _open_ended(
    experiment: Experiment, system: System, equations: object, solver: Solver
) -> tuple[Stepped, Status, Floats | None]:
    """Run until the watched gas is gone or everything rests, then cut at 99.9 % of the way."""
    watched = experiment.watched
    place = None if watched is None else system.gases.index(watched)
    if place is not None and system.initial_x[place] <= 0:
        place = None
    extra = max((t.value for t in experiment.plan.report_at), default=0.0)
    settling = Settling(system, place, extra)
    stepped = step_through(equations, solver, HORIZON, settling)  # type: ignore[arg-type]
    if stepped.failure:
        return stepped, Status.FAILED, None
    trajectory = stepped.trajectory
    if settling.reason == "converted" and place is not None:
        goal = system.initial_x[place] * settling.goal
        end = last_crossing(trajectory, lambda t: trajectory(t)[place], goal)
        assert end is not None, "the watcher saw the crossing"
        cut = replace(stepped, trajectory=trajectory.cut(max(end, min(extra, trajectory.end))))
        return cut, Status.CONVERTED, None
    if settling.reason == "unbounded":
        raise ComputationError(
            f"the amount of gas grew {BOUND:g} times by {trajectory.end:.4g} s, and nothing in the "
            'case ends it: state a time under [run] until instead of "auto"'
        )
    if settling.reason != "settled":
        restless = settling.reason == "restless"
        return stepped, Status.RESTLESS if restless else Status.HORIZON, None
    status, rest = Status.SETTLED, trajectory(trajectory.end)[:, 0]
    rest[np.setdiff1d(np.arange(system.n_gases), settling.bearing)] = np.nan
    end = _way_to_rest(system, stepped, rest, place)
    if end is None:
        return stepped, status, rest
    end = max(end, min(extra, trajectory.end), system.segments[-1].start)
    return replace(stepped, trajectory=trajectory.cut(end)), status, rest


def _way_to_rest(system: System, stepped: Stepped, rest: Floats, place: int | None) -> float | None:
    """When 99.9 % of the way to rest is done, of the watched gas or of all that moves."""
    trajectory, left = stepped.trajectory, 1 - CONVERTED
    start = system.initial_x
    moving = [place] if place is not None and abs(start[place] - rest[place]) > 0 else None
    if moving is None:
        far = np.nan_to_num(np.abs(start - rest[: system.n_gases]))
        moving = [int(i) for i in np.flatnonzero(far > 1e-6 * max(far.max(), 1e-300))]
    times = []
    for i in moving:

        def far_from_rest(t: Floats, i: int = i) -> Floats:
            return np.asarray(np.abs(trajectory(t)[i] - rest[i]))

        time = last_crossing(trajectory, far_from_rest, left * abs(start[i] - rest[i]))
        if time is not None:
            times.append(time)
    return max(times, default=None)


def _message(experiment: Experiment, status: Status, moved: bool) -> str:
    watched = experiment.watched
    if status is Status.CONVERTED:
        return f"stopped when 99.9 % of {watched} was converted"
    if status is Status.SETTLED and not moved:
        return "stopped: nothing moves"
    if status is Status.SETTLED and watched is not None:
        return f"stopped when {watched} had gone 99.9 % of the way to where it settles"
    return f"stopped: {status.value}"
