"""What the gas in the vessel does at given times, for fits that ask for it thousands of times.

One function, `predict`. Where the equations have an integrated law it is used, exact and at once;
else they are integrated with plain arrays, without any compilation.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.constants import R
from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.build import build_system
from meanfree.equations.closed_forms import recognise
from meanfree.equations.system import Floats, System
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.plan import Solver

CONSECUTIVE = "consecutive first order"
"""The name under which that integrated law is recognised."""

SOLVER = Solver("LSODA", rtol=1e-10, atol=1e-16)
"""LSODA reaches 1e-9 or so at this: differences of 1e-4 in a parameter then keep four digits."""


@dataclass(frozen=True)
class Prediction:
    """Amounts over V(0) ``x`` [mol/m^3, shape (n_gases, n_times)] and what follows from them.

    ``spread`` is v + dead T, the volume over V(0) that the amounts are spread over, ``temperature``
    [K], and ``retained`` what drawn samples left, each of shape (n_times,).
    """

    system: System
    x: Floats
    spread: Floats
    temperature: Floats
    retained: Floats

    def amount(self, gas: str) -> Floats:
        """Amount of a gas over V(0) [mol/m^3, shape (n_times,)]."""
        return np.asarray(self.x[self.system.gases.index(gas)])

    def filled(self, gas: str) -> float:
        """Amount of a gas over V(0) at time zero [mol/m^3]."""
        return float(self.system.initial_x[self.system.gases.index(gas)])

    def concentration(self, gas: str) -> Floats:
        """Concentration of a gas [mol/m^3, shape (n_times,)]."""
        return self.amount(gas) / self.spread

    @property
    def total_concentration(self) -> Floats:
        """Concentration of all gases [mol/m^3, shape (n_times,)]."""
        return np.asarray(self.x.sum(axis=0) / self.spread)

    @property
    def pressure(self) -> Floats:
        """Total pressure [Pa, shape (n_times,)]: that of vessel and dead space alike."""
        return np.asarray(self.total_concentration * R * self.temperature)


def predict(experiment: Experiment, times: Floats) -> Prediction:
    """The gas at ``times`` [s, shape (n_times,), at least 0, in any order].

    Raises ComputationError where the equations cannot be integrated.
    """
    system = build_system(experiment)
    return (
        _by_closed_form(system, times)
        or _of_order_zero(system, times)
        or _by_integration(system, times)
    )


def is_exact(experiment: Experiment) -> bool:
    """True where `predict` has a formula, good to rounding; else it is good to 1e-9 or so."""
    system, start = build_system(experiment), np.zeros(1)
    try:
        with np.errstate(all="ignore"):
            return (_by_closed_form(system, start) or _of_order_zero(system, start)) is not None
    except ComputationError:
        return False


def _by_closed_form(system: System, times: Floats) -> Prediction | None:
    """One reaction with an integrated law: all gases follow from the one it gives."""
    if system.n_steps > 2:
        return None
    form = recognise(system)
    if form is None:
        return None
    if form.name == CONSECUTIVE:
        return _consecutive(system, form.amount(times), system.gases.index(form.gas), times)
    place = system.gases.index(form.gas)
    net = np.zeros(system.n_gases)
    for gas, number in system.net.row(0):
        net[gas] = number
    extent = (form.amount(times) - system.initial_x[place]) / net[place]
    x = system.initial_x[:, None] + net[:, None] * extent
    if not np.all(np.isfinite(x)):
        raise ComputationError("the integrated rate law gives no finite number")
    T = np.full(len(times), system.initial_temperature)
    spread = 1.0 + system.dead * T
    if system.volume_varies:
        spread = R * T / system.held_pressure * x.sum(axis=0)
    return Prediction(system, x, spread, T, np.ones(len(times)))


def _consecutive(system: System, second: Floats, place: int, times: Floats) -> Prediction:
    """A → B → …, both first order: B is given, A decays by itself, the rest follows."""
    T = np.full(len(times), system.initial_temperature)
    k = ArrayEquations(system).coefficients(float(T[0]), 1.0, np.ones(2)).k
    first = system.orders.row(0)[0][0]
    one, two = dict(system.net.row(0)), dict(system.net.row(1))
    left = float(system.initial_x[first]) * np.exp(one[first] * k[0] * times)
    extent = (left - system.initial_x[first]) / one[first]
    further = (second - system.initial_x[place] - one[place] * extent) / two[place]
    x = np.repeat(system.initial_x[:, None], len(times), axis=1)
    for gas in range(system.n_gases):
        x[gas] += one.get(gas, 0.0) * extent + two.get(gas, 0.0) * further
    return Prediction(system, x, np.ones(len(times)), T, np.ones(len(times)))


def _of_order_zero(system: System, times: Floats) -> Prediction | None:
    """One step of order zero: even progress until the first of its gases is gone.

    The equations stop smoothly over the last 1e-10 or so of the gas, which no reading shows.
    """
    alone = system.n_steps == 1 and not system.orders.row(0) and not len(system.open_steps)
    if not alone or system.volume_varies or system.bath[0] >= 0 or system.mode != "isothermal":
        return None
    used = [(gas, -number) for gas, number in system.net.row(0) if number < 0]
    equations = ArrayEquations(system)
    if not equations.constant or not used or len(system.segments) > 1:
        return None
    T = system.initial_temperature
    k = float(equations.coefficients(T, 1.0, np.ones(1)).k[0])
    most = min(float(system.initial_x[gas]) / number for gas, number in used)
    # The rate is of the gas where it is: over V(0), that is k as it stands.
    extent = np.minimum(k * times, most)
    x = np.repeat(system.initial_x[:, None], len(times), axis=1)
    for gas, number in system.net.row(0):
        x[gas] = x[gas] + number * extent
    full = np.full(len(times), T)
    return Prediction(system, x, 1.0 + system.dead * full, full, np.ones(len(times)))


def _by_integration(system: System, times: Floats) -> Prediction:
    from meanfree.integrate.stepping import step_through

    end = float(np.max(times, initial=0.0))
    if end <= 0:
        T = np.full(len(times), system.initial_temperature)
        x = np.repeat(system.initial_x[:, None], len(times), axis=1)
        return Prediction(system, x, 1.0 + system.dead * T, T, np.ones(len(times)))
    stepped = step_through(ArrayEquations(system), SOLVER, end)
    if stepped.failure:
        raise ComputationError(stepped.failure)
    state = stepped.trajectory(times)
    segments = [stretch.segment for stretch in stepped.trajectory.stretches]
    where = stepped.trajectory.stretch_of(times)
    if system.temperature_varies:
        T = state[system.temperature_index]
    else:
        start = np.array([s.temperature for s in segments])[where]
        slope = np.array([s.slope for s in segments])[where]
        T = start + slope * (times - np.array([s.start for s in segments])[where])
    v = state[system.volume_index] if system.volume_varies else np.ones(len(times))
    kept = kept_at(system, times)
    return Prediction(system, state[: system.n_gases], v + system.dead * T, np.asarray(T), kept)


def kept_at(system: System, times: Floats) -> Floats:
    """Fraction of the contents that drawn samples left behind [shape (n_times,)]."""
    kept = np.ones(len(times))
    for segment in system.segments:
        kept = np.where(times > segment.start, kept * segment.retained, kept)
    return kept
