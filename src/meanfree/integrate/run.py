"""The Run: a trajectory with everything that can be read off it."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from meanfree.constants import R
from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.powers import STOP
from meanfree.equations.system import Floats, System
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.integrate.checks import Invariants
from meanfree.integrate.events import crossings, first_crossing
from meanfree.integrate.retention import Outflow
from meanfree.integrate.stepping import Counters
from meanfree.integrate.trajectory import Trajectory
from meanfree.rates.law import StepContext

MOST_HALF_LIVES = 10

EXHAUSTED = 10 * STOP
"""Fraction of the initial total below which a rate of order below one has left its power law."""


class Status(Enum):
    """Why a run ended. There are no others."""

    REACHED = "reached the stated time"
    CONVERTED = "99.9 % of the watched gas was converted"
    SETTLED = "99.9 % of the way to where it settles"
    HORIZON = "still moving at the longest time an automatic run takes"
    RESTLESS = "still moving after the most steps an automatic run takes"
    FAILED = "the integrator failed"


@dataclass(frozen=True)
class HalfLife:
    """The ``ordinal``-th half-life of a gas: where it starts and how long it lasts [s].

    ``duration`` is None where the run did not reach its end.
    """

    gas: str
    ordinal: int
    start: float
    duration: float | None


@dataclass(frozen=True)
class Run:
    """One integrated experiment.

    Times are in s; every method takes an array of times and gives one entry a time along the
    last axis, SI units. ``beyond`` says where energies were used a little beyond their range, or
    as far as the case allows. ``settled_state`` is where the vessel comes to rest, where that is
    known; NaN for a gas that goes on after the watched one has come to rest.
    """

    experiment: Experiment
    system: System
    trajectory: Trajectory
    status: Status
    message: str
    counters: Counters
    method: str
    rtol: float
    invariants: Invariants
    settled_state: Floats | None = None
    beyond: tuple[str, ...] = ()

    @property
    def end(self) -> float:
        """Length of the run [s]."""
        return self.trajectory.end

    @cached_property
    def _arrays(self) -> ArrayEquations:
        return ArrayEquations(self.system)

    def index(self, gas: str) -> int:
        """Position of a gas."""
        return self.system.gases.index(gas)

    def state(self, t: ArrayLike) -> Floats:
        """The integrator's state [shape (size, n_times)]."""
        return self.trajectory(t)

    def temperature(self, t: ArrayLike) -> Floats:
        """Temperature of the gas [K]."""
        times = np.atleast_1d(np.asarray(t, float))
        if self.system.temperature_varies:
            return np.asarray(self.state(times)[self.system.temperature_index])
        segments = [s.segment for s in self.trajectory.stretches]
        where = self.trajectory.stretch_of(times)
        start = np.array([s.start for s in segments])[where]
        value = np.array([s.temperature for s in segments])[where]
        return np.asarray(value + np.array([s.slope for s in segments])[where] * (times - start))

    def volume_ratio(self, t: ArrayLike) -> Floats:
        """V/V(0)."""
        times = np.atleast_1d(np.asarray(t, float))
        if self.system.volume_varies:
            return np.asarray(self.state(times)[self.system.volume_index])
        return np.ones(len(times))

    def volume(self, t: ArrayLike) -> Floats:
        """Volume of the hot part [m^3]."""
        return self.volume_ratio(t) * self.system.initial_volume

    def amounts(self, t: ArrayLike) -> Floats:
        """Amount of each gas, vessel and dead space together [mol], shape (n_gases, n_times)."""
        return self.state(t)[: self.system.n_gases] * self.system.initial_volume

    def concentrations(self, t: ArrayLike) -> Floats:
        """Concentration of each gas [mol/m^3], shape (n_gases, n_times)."""
        spread = self.volume_ratio(t) + self.system.dead * self.temperature(t)
        return self.state(t)[: self.system.n_gases] / spread

    def partial_pressures(self, t: ArrayLike) -> Floats:
        """Partial pressure of each gas [Pa], shape (n_gases, n_times)."""
        return self.concentrations(t) * R * self.temperature(t)

    def pressure(self, t: ArrayLike) -> Floats:
        """Total pressure [Pa]."""
        return np.asarray(self.partial_pressures(t).sum(axis=0))

    def rates(self, t: ArrayLike) -> Floats:
        """Rate of each one-way step [mol/m^3/s], shape (n_steps, n_times)."""
        times = np.atleast_1d(np.asarray(t, float))
        states, where = self.state(times), self.trajectory.stretch_of(times)
        segments = [s.segment for s in self.trajectory.stretches]
        columns = [
            self._arrays.rates(float(time), states[:, i], segments[where[i]])
            for i, time in enumerate(times)
        ]
        return np.array(columns).T

    def retained(self, t: ArrayLike) -> Floats:
        """Fraction of the contents that drawn samples left behind."""
        times = np.atleast_1d(np.asarray(t, float))
        kept = np.cumprod([s.segment.retained for s in self.trajectory.stretches])
        return np.asarray(kept[self.trajectory.stretch_of(times)])

    @cached_property
    def _outflows(self) -> dict[str, Outflow]:
        """Of each gas that flows out, the integral of its rate constant over time."""
        leaving: dict[str, list[tuple[Step, StepContext]]] = {}
        for step in self.experiment.flow_steps:
            for gas, _ in step.reactants:
                leaving.setdefault(gas, []).append((step, self.experiment.context(step)))

        def constant(steps: list[tuple[Step, StepContext]], t: Floats) -> Floats:
            T, v = self.temperature(t), self.volume_ratio(t)
            k = sum(step.law.rate_constant(context, T) for step, context in steps)
            return np.asarray(k * v / (v + self.system.dead * T))

        times = self.trajectory.times
        return {
            gas: Outflow(times, lambda t, steps=steps: constant(steps, t))  # type: ignore[misc]
            for gas, steps in leaving.items()
        }

    def retained_of(self, gas: str, t: ArrayLike) -> Floats:
        """theta: what samples and outflow would have left of a gas that does not react."""
        times = np.atleast_1d(np.asarray(t, float))
        if gas not in self._outflows:
            return self.retained(times)
        return np.asarray(self.retained(times) * np.exp(-self._outflows[gas](times)))

    def remaining(self, gas: str, t: ArrayLike) -> Floats:
        """n/(theta n0) of a filled gas: what reaction left of it."""
        start = self.system.initial_x[self.index(gas)]
        return np.asarray(self.state(t)[self.index(gas)] / (start * self.retained_of(gas, t)))

    def conversion(self, gas: str, t: ArrayLike) -> Floats:
        """X = 1 - n/(theta n0) of a filled gas."""
        return 1.0 - self.remaining(gas, t)

    @cached_property
    def consumed(self) -> tuple[str, ...]:
        """Filled gases that some step consumes, in order."""
        net = self.system.net
        losing = {int(i) for i, n in zip(net.column, net.value, strict=True) if n < 0}
        return tuple(
            gas
            for i, gas in enumerate(self.system.gases)
            if i in losing and self.system.initial_x[i] > 0
        )

    @cached_property
    def ran_out(self) -> tuple[tuple[str, float], ...]:
        """(gas, time [s]) where a rate of order below one, or none, stopped because a gas ran out.

        Below `EXHAUSTED` of the initial total such a rate leaves its power law and stops smoothly.
        """
        system, found = self.system, []
        below_one = set(system.orders.column[(system.orders.value > 0) & (system.orders.value < 1)])
        level = EXHAUSTED * system.total_concentration
        for i in sorted({int(j) for j in below_one | set(system.guards.column)}):

            def amount(t: Floats, i: int = i) -> Floats:
                return np.asarray(self.state(t)[i])

            time = first_crossing(self.trajectory, amount, level)
            if time is not None and time > 0:
                found.append((system.gases[i], time))
        return tuple(found)

    @cached_property
    def notes(self) -> tuple[str, ...]:
        """What the reader must know about this run beside its numbers."""
        stopped = (
            f"{gas} ran out at {time:.6g} s; a rate of order below one in it stops smoothly at zero"
            for gas, time in self.ran_out
        )
        return (*self.beyond, *stopped)

    def reaction_time(self, gas: str, conversion: float) -> float | None:
        """First time [s] at which a filled gas reaches a conversion; None if it does not.

        None as well for a gas that was not filled, which has no conversion.
        """
        if not self.system.initial_x[self.index(gas)] > 0:
            return None
        return first_crossing(self.trajectory, lambda t: self.remaining(gas, t), 1.0 - conversion)

    def half_lives(self, gas: str) -> list[HalfLife]:
        """Successive half-lives of a filled gas; the last entry is the one not finished.

        None at all for a gas that was not filled.
        """
        found: list[HalfLife] = []
        if not self.system.initial_x[self.index(gas)] > 0:
            return found
        start = 0.0
        for ordinal in range(1, MOST_HALF_LIVES + 1):
            level = 0.5**ordinal
            end = first_crossing(self.trajectory, lambda t: self.remaining(gas, t), level)
            found.append(HalfLife(gas, ordinal, start, None if end is None else end - start))
            if end is None:
                break
            start = end
        return found

    def peak(self, gas: str) -> tuple[float, float]:
        """(time [s], amount [mol]) of the most there is of a gas."""
        times = self.trajectory.times
        grid = np.unique(np.concatenate([times, 0.5 * (times[1:] + times[:-1])]))
        amounts = self.amounts(grid)[self.index(gas)]
        at = int(np.argmax(amounts))
        low, high = grid[max(at - 1, 0)], grid[min(at + 1, len(grid) - 1)]
        from scipy.optimize import minimize_scalar

        if not 0 < at < len(grid) - 1:
            return float(grid[at]), float(amounts[at])
        best = minimize_scalar(
            lambda t: -float(self.amounts(t)[self.index(gas)][0]),
            bounds=(low, high),
            method="bounded",
            options={"xatol": 1e-10 * high},
        )
        return float(best.x), -float(best.fun)

    def crossings(self, gas: str, amount: float) -> list[float]:
        """Times [s] at which a gas has a stated amount [mol]."""
        i = self.index(gas)
        return crossings(self.trajectory, lambda t: self.amounts(t)[i], amount)
