"""The integrator's own loop: step by step through the segments, watching for the end.

scipy's solver objects take the steps; this file decides which equations they see, where they
restart, and when a run whose length was left open is done.
"""

from __future__ import annotations

import warnings
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any, Protocol

import numpy as np
from scipy.integrate import BDF, LSODA, Radau

from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.system import Floats, Segment, System
from meanfree.errors import ComputationError
from meanfree.experiment.plan import Solver
from meanfree.integrate.trajectory import Stretch, Trajectory

METHODS: dict[str, Any] = {"Radau": Radau, "BDF": BDF, "LSODA": LSODA}

SYMBOLIC_GASES, SYMBOLIC_STEPS = 50, 150
"""Above either of these a mechanism is evaluated with sparse arrays instead of compiled sympy."""

OF_ITS_OWN = 1e-12
"""Absolute tolerance of a filled gas over its own fill, where that is less than over the total."""

MOST_STEPS = 200_000
"""Steps after which a run is given up; common practice, no source."""


class Equations(Protocol):
    """What the loop needs of a reader of the System."""

    system: System

    def derivative(self, t: float, y: Floats, segment: Segment) -> Floats:
        """dy/dt [shape (size,)]."""
        ...

    def jacobian(self, t: float, y: Floats, segment: Segment) -> Any:
        """d(dy/dt)/dy, dense or sparse [shape (size, size)]."""
        ...


@dataclass
class Counters:
    """Work done by the solver."""

    nfev: int = 0
    njev: int = 0
    nlu: int = 0
    n_steps: int = 0


@dataclass(frozen=True)
class Stepped:
    """What the loop returns: the solution, the work, and why it stopped.

    ``stopped`` is True where the watcher ended it; ``failure`` is empty unless it failed.
    """

    trajectory: Trajectory
    counters: Counters
    stopped: bool
    failure: str = ""


Watcher = Callable[[float, Floats, bool], bool]
"""Called after every step with (time, state, in the last segment); True ends the run."""


def equations_for(system: System) -> Equations:
    """Compiled sympy for what people read, sparse arrays for what they do not."""
    if system.n_gases <= SYMBOLIC_GASES and system.n_steps <= SYMBOLIC_STEPS:
        from meanfree.equations.compiled import CompiledEquations

        return CompiledEquations(system)
    return ArrayEquations(system)


def step_through(
    equations: Equations, solver: Solver, end: float, watcher: Watcher | None = None
) -> Stepped:
    """Integrate from time zero to ``end`` [s], segment by segment."""
    system = equations.system
    counters, stretches = Counters(), []
    y = system.initial_state
    for index, segment in enumerate(system.segments):
        if segment.start >= end:
            break
        segment = as_drawn(system, y, segment)
        y = drawn(system, y, segment)
        last = index == len(system.segments) - 1
        stretch = Stretch(segment, [segment.start], [y.copy()])
        stretches.append(stretch)
        watch = None if watcher is None else _bound(watcher, last)
        until = min(segment.end, end)
        stopped, failure = _one_segment(equations, solver, stretch, until, counters, watch)
        if stopped or failure:
            return Stepped(Trajectory(stretches), counters, stopped, failure)
        y = stretch.states[-1]
    return Stepped(Trajectory(stretches), counters, False)


def _bound(watcher: Watcher, last: bool) -> Callable[[float, Floats], bool]:
    return lambda t, y: watcher(t, y, last)


def as_drawn(system: System, y: Floats, segment: Segment) -> Segment:
    """The segment with what its sample leaves, where that was stated as a volume.

    A volume v at vessel conditions takes v c of what is V0 w c, vessel and dead space together.
    """
    if segment.drawn == 0.0:
        return segment
    retained = 1.0 - segment.drawn / _spread(system, y, segment.temperature)
    if retained <= 0:
        volume = segment.drawn * system.initial_volume
        raise ComputationError(
            f"the sample at {segment.start:g} s, {volume:.3g} m^3, is more than the vessel holds"
        )
    return replace(segment, retained=retained, drawn=0.0)


def drawn(system: System, y: Floats, segment: Segment) -> Floats:
    """The state just after the segment's sample was drawn; its temperature stays."""
    if segment.retained == 1.0:
        return y
    y = y.copy()
    if system.volume_varies:
        # n and v + dead T shrink alike; the dead space keeps its size.
        spread = _spread(system, y, segment.temperature)
        y[system.volume_index] -= (1 - segment.retained) * spread
    y[: system.n_gases] *= segment.retained
    return y


def _spread(system: System, y: Floats, temperature: float) -> float:
    """w = v + dead T, the volume over V0 at which all the gas would have the vessel's c."""
    T = float(y[system.temperature_index]) if system.temperature_varies else temperature
    return (float(y[system.volume_index]) if system.volume_varies else 1.0) + system.dead * T


def tolerances(system: System, solver: Solver) -> Floats:
    """Absolute tolerance of every state [shape (size,)]; v and T are near one, never near zero.

    A filled trace is kept to `OF_ITS_OWN` of its own fill, however little of the whole that is.
    """
    atol = np.full(system.size, solver.atol * system.total_concentration)
    filled = system.initial_x > 0
    gases = atol[: system.n_gases]
    gases[filled] = np.minimum(gases[filled], OF_ITS_OWN * system.initial_x[filled])
    atol[system.n_gases :] = 1e-12 * system.total_concentration
    if system.exchanges_heat:
        atol[system.volume_index - 1] = 1e-9 * system.total_concentration * 8.3 * 300
    if system.volume_varies:
        atol[system.volume_index] = 1e-14
    if system.temperature_varies:
        atol[system.temperature_index] = 1e-11
    return atol


def _one_segment(
    equations: Equations,
    solver: Solver,
    stretch: Stretch,
    end: float,
    counters: Counters,
    watch: Callable[[float, Floats], bool] | None,
) -> tuple[bool, str]:
    """Steps of one segment, appended to ``stretch``; (stopped by the watcher, failure)."""
    segment = stretch.segment
    system = equations.system
    options: dict[str, Any] = {"rtol": solver.rtol, "atol": tolerances(system, solver)}
    jacobian = equations.jacobian
    if solver.method == "LSODA":
        options["jac"] = lambda t, y: _dense(jacobian(t, y, segment))
    else:
        options["jac"] = lambda t, y: jacobian(t, y, segment)
    failure = ""
    with warnings.catch_warnings(), np.errstate(all="ignore"):
        warnings.simplefilter("ignore")
        try:
            integrator = METHODS[solver.method](
                lambda t, y: equations.derivative(t, y, segment),
                segment.start,
                stretch.states[0],
                end,
                **options,
            )
            stopped = _advance(integrator, stretch, counters, watch)
            if integrator.status == "failed":
                failure = "the step size became smaller than the spacing of numbers"
            elif counters.n_steps >= MOST_STEPS:
                failure = f"more than {MOST_STEPS} steps"
        except (ValueError, ArithmeticError, RuntimeError, np.linalg.LinAlgError) as error:
            return False, f"{solver.method} could not go on at t = {stretch.times[-1]:g} s: {error}"
    counters.nfev += int(integrator.nfev)
    counters.njev += int(integrator.njev)
    counters.nlu += int(integrator.nlu)
    if failure:
        failure = f"{solver.method} gave up at t = {stretch.times[-1]:g} s: {failure}"
    return stopped, failure


def _advance(
    integrator: Any,
    stretch: Stretch,
    counters: Counters,
    watch: Callable[[float, Floats], bool] | None,
) -> bool:
    while integrator.status == "running" and counters.n_steps < MOST_STEPS:
        integrator.step()
        if integrator.status == "failed":
            return False
        counters.n_steps += 1
        stretch.times.append(float(integrator.t))
        stretch.states.append(integrator.y.copy())
        stretch.pieces.append(integrator.dense_output())
        if watch is not None and watch(stretch.times[-1], stretch.states[-1]):
            return True
    return False


def _dense(matrix: Any) -> Any:
    return matrix.toarray() if hasattr(matrix, "toarray") else matrix
