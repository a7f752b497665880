"""One run with its derivatives by any inputs, with scipy: the variational equations beside the run.

The equations, their Jacobian and the breaks are those of a single run; df/dp is differenced to
sixth order from the equations of Systems built at a few values of each input. It is the check on
the compiled integrator, which differentiates its own arithmetic, and serves where one run alone is
asked.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.integrate import Radau

from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.build import build_system
from meanfree.equations.system import Floats, Segment, System
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.experiment.plan import Solver
from meanfree.integrate.moves import known_addresses, stencil
from meanfree.integrate.stepping import MOST_STEPS, Equations, drawn, equations_for, tolerances


@dataclass(frozen=True)
class Followed:
    """A run with derivatives: ``system`` and its state and derivatives as functions of time.

    ``size`` states are followed by their derivatives, address after address, in the unit of the
    file.
    """

    system: System
    addresses: tuple[str, ...]
    starts: tuple[float, ...]
    pieces: tuple[tuple[Floats, tuple[object, ...]], ...]
    equations: _Variational

    @property
    def end(self) -> float:
        """Length of the run [s]."""
        return float(self.pieces[-1][0][-1])

    def _all(self, t: float) -> Floats:
        place = max(int(np.searchsorted(self.starts, t, "left")) - 1, 0)
        times, dense = self.pieces[place]
        i = min(max(int(np.searchsorted(times, t)) - 1, 0), len(dense) - 1)
        return np.asarray(dense[i](t))  # type: ignore[operator]

    def state(self, t: float) -> Floats:
        """The state at a time [shape (size,)], as a single run has it."""
        return self._all(t)[: self.system.size]

    def slopes(self, t: float) -> Floats:
        """Its derivatives [shape (n_addresses, size)]."""
        return self._all(t)[self.system.size :].reshape(len(self.addresses), self.system.size)

    def rates(self, t: float) -> tuple[Floats, Floats]:
        """d/dt of both: [shape (size,)] and [shape (n_addresses, size)]."""
        place = max(int(np.searchsorted(self.starts, t, "left")) - 1, 0)
        found = self.equations.derivative(t, self._all(t), place)
        size = self.system.size
        return found[:size], found[size:].reshape(len(self.addresses), size)

    def time_slope(self, weights: Floats, t: float, explicit: Floats | float = 0.0) -> Floats:
        """Derivatives of the time t at which sum(weights y) meets a level [s, (n_addresses,)].

        ``explicit`` is how the level itself follows the addresses [shape (n_addresses,)].
        """
        change = self.slopes(t) @ weights - explicit
        return np.asarray(-change / float(self.rates(t)[0] @ weights))

    def turn_slope(self, weights: Floats, t: float) -> Floats:
        """Derivatives of the time t at which sum(weights y) is greatest or least.

        Its second derivative by time is differenced along the run.
        """
        change = self.rates(t)[1] @ weights
        h = 1e-4 * t
        later, before = (float(self.rates(t + sign * h)[0] @ weights) for sign in (1, -1))
        return np.asarray(-change * 2 * h / (later - before))


def follow(
    experiment: Experiment,
    addresses: Sequence[str],
    end: float,
    solver: Solver | None = None,
) -> Followed:
    """Integrate an experiment to ``end`` [s] with its derivatives by some addresses.

    Derivatives count in the choice of steps: their tolerance is rtol times the size of the state
    over that of the input.

    Raises
    ------
    InputError
        An address is not there.
    ComputationError
        The integrator failed.
    """
    solver = experiment.plan.solver if solver is None else solver
    system = build_system(experiment)
    whole = _Variational(experiment, system, addresses)
    y, pieces = whole.start, list[tuple[Floats, tuple[object, ...]]]()
    starts: list[float] = []
    for place, segment in enumerate(system.segments):
        if segment.start >= end:
            break
        if place or segment.retained != 1.0:
            y = whole.over_break(place, y)
        piece, y = _stretch(whole, place, y, min(segment.end, end), solver)
        starts.append(segment.start)
        pieces.append(piece)
    return Followed(system, tuple(addresses), tuple(starts), tuple(pieces), whole)


def _stretch(
    whole: _Variational, place: int, y: Floats, end: float, solver: Solver
) -> tuple[tuple[Floats, tuple[object, ...]], Floats]:
    start = whole.system.segments[place].start
    of_state = tolerances(whole.system, solver)
    size = whole.system.size
    state = np.maximum(np.abs(y[:size]), 1e-3 * whole.system.total_concentration)
    if whole.system.temperature_varies:
        state[whole.system.temperature_index] = y[whole.system.temperature_index]
    atol = [of_state, *(of_state + solver.rtol * 1e-3 * state / h for h in whole.sizes)]
    integrator: Any = Radau(
        lambda t, z: whole.derivative(t, z, place),
        start,
        y,
        end,
        rtol=solver.rtol,
        atol=np.concatenate(atol),  # type: ignore[arg-type]
        jac=lambda t, z: whole.jacobian(t, z, place),
    )
    times, dense = [start], []
    while integrator.status == "running" and len(times) < MOST_STEPS:
        message = integrator.step()
        if integrator.status == "failed":
            raise ComputationError(f"Radau gave up at t = {times[-1]:g} s: {message}")
        times.append(float(integrator.t))
        dense.append(integrator.dense_output())
    return (np.array(times), tuple(dense)), np.asarray(integrator.y)


class _Variational:
    """y and s with dy/dt = f(y, p), ds/dt = J s + df/dp."""

    def __init__(self, experiment: Experiment, system: System, addresses: Sequence[str]) -> None:
        self.system = system
        self.equations: Equations = equations_for(system)
        self.shifted: list[tuple[tuple[System, ...], tuple[ArrayEquations, ...], Floats]] = []
        self.sizes = []
        for at in known_addresses(experiment, addresses).values():
            tried = stencil(at, at.value)
            systems = tuple(
                build_system(with_inputs(experiment, {at.address: float(v)})) for v in tried.values
            )
            readers = tuple(ArrayEquations(one) for one in systems)
            self.shifted.append((systems, readers, tried.weights))
            self.sizes.append(max(abs(at.value), 1e-3))
        starts = [
            weights @ np.array([one.initial_state for one in systems])
            for systems, _, weights in self.shifted
        ]
        self.start = np.concatenate([system.initial_state, *starts])

    def derivative(self, t: float, z: Floats, place: int) -> Floats:
        """d/dt of state and derivatives, in the segment at ``place``."""
        size, segment = self.system.size, self.system.segments[place]
        y = z[:size]
        J = self.equations.jacobian(t, y, segment)
        parts = [self.equations.derivative(t, y, segment)]
        for k, (systems, readers, weights) in enumerate(self.shifted):
            s = z[size * (1 + k) : size * (2 + k)]
            moved = [
                reader.derivative(t, y, one.segments[place])
                for one, reader in zip(systems, readers, strict=True)
            ]
            parts.append(np.asarray(J @ s) + weights @ (np.array(moved) - parts[0]))
        return np.concatenate(parts)

    def jacobian(self, t: float, z: Floats, place: int) -> Floats:
        """J for the state and for each of its derivatives.

        What couples them is left out: Newton's method then takes a step or two more and meets the
        same solution.
        """
        J = self.equations.jacobian(t, z[: self.system.size], self.system.segments[place])
        dense = J.toarray() if hasattr(J, "toarray") else J
        return np.kron(np.eye(1 + len(self.shifted)), dense)

    def over_break(self, place: int, z: Floats) -> Floats:
        """State and derivatives just after a break: s+ = G_y (s- + f- t') + G_p - f+ t'."""
        system, size = self.system, self.system.size
        here, before = system.segments[place], system.segments[max(place - 1, 0)]
        y = z[:size]
        after = drawn(system, y, here)
        old = self.equations.derivative(here.start, y, before)
        new = self.equations.derivative(here.start, after, here)
        parts = [after]
        for k, (systems, _, weights) in enumerate(self.shifted):
            s = z[size * (1 + k) : size * (2 + k)]
            moved = float(weights @ [one.segments[place].start for one in systems])
            total = s + old * moved
            # How the draw follows the state and the inputs: it is linear in the state.
            carried = drawn(system, total, here)
            if system.volume_varies and here.retained != 1.0:
                lost = (1 - here.retained) * system.dead * self._T(y, here)
                carried[system.volume_index] += lost
            explicit = weights @ np.array([drawn(one, y, one.segments[place]) for one in systems])
            parts.append(carried + explicit - new * moved)
        return np.concatenate(parts)

    def _T(self, y: Floats, segment: Segment) -> float:
        if self.system.temperature_varies:
            return float(y[self.system.temperature_index])
        return segment.temperature
