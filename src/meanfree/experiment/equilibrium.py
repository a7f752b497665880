"""Where a reversible mechanism must end, from its equilibrium constants alone.

Computed without integrating anything, so that a run can be held against it: at fixed
temperature and volume the concentrations minimise a convex function of one multiplier for each
conserved quantity; pressure and temperature are then found around that.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import Adiabatic, Exchange, Program
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import Thermochemistry

Floats = NDArray[np.float64]

CYCLE = 1e-6
"""Largest mismatch of ln K around a cycle of steps that still counts as closed."""


@dataclass(frozen=True)
class Equilibrium:
    """The vessel at rest.

    ``moles`` by gas [mol], ``temperature`` [K], ``volume`` [m^3], ``pressure`` [Pa].
    """

    moles: dict[str, float]
    temperature: float
    volume: float
    pressure: float


@lru_cache(maxsize=4096)
def _gibbs(thermochemistry: Thermochemistry, T: float) -> float:
    """G at 1 bar [J/mol]; steps share gases, and the points of a map temperatures."""
    return float(thermochemistry.gibbs(T))


def ln_K(step: Step, gas_named: Mapping[str, Gas], T: float) -> float:
    """ln K of a reversible step at T [K], standard state 1 bar.

    Raises
    ------
    ValueError
        The step has no reverse, or a gas has no thermochemistry.
    """
    if step.reverse is None:
        raise ValueError(f"step {step.name} has no reverse")
    if isinstance(step.reverse, GivenEquilibrium):
        return _given_ln_K(step, step.reverse, T)
    gibbs = 0.0
    for name, number in step.net.items():
        thermochemistry = gas_named[name].thermochemistry
        if thermochemistry is None:
            raise ValueError(f"{name} has no thermochemistry")
        gibbs += number * _gibbs(thermochemistry, T)
    return -gibbs / (R * T)


def _given_ln_K(step: Step, given: GivenEquilibrium, T: float) -> float:
    at, change = given.at.value, step.change_of_moles
    lnK = math.log(given.constant.value)
    if given.kind == "Kp":
        lnK -= change * math.log(STANDARD_PRESSURE)
    elif given.kind == "Kc":
        lnK += change * math.log(R * at / STANDARD_PRESSURE)
    if given.enthalpy is not None:
        lnK -= given.enthalpy.value / R * (1 / T - 1 / at)
    return lnK


def why_none(experiment: Experiment) -> str:
    """Why an experiment has no equilibrium that could be stated; empty where it has one."""
    active = _active(experiment)
    if not active:
        return "no step can run"
    one_way = [step.name for step in active if step.reverse is None]
    if one_way:
        return "one-way steps: " + ", ".join(one_way)
    if isinstance(experiment.temperature, Adiabatic):
        if any(step.heat is not None for step in active):
            return "a stated heat of reaction: no energies of the gases to balance"
        lacking = [g.name for g in experiment.gases if g.thermochemistry is None]
        if lacking:
            return "no thermochemistry of " + ", ".join(lacking)
    return ""


def equilibrium(experiment: Experiment) -> Equilibrium | None:
    """Where the vessel ends; None where `why_none` has a reason.

    A programmed temperature ends at its last value, exchanged heat at the surroundings.

    Raises
    ------
    ComputationError
        The iteration failed, or equilibrium constants around a cycle contradict each other.
    """
    if why_none(experiment):
        return None
    mode = experiment.temperature
    if isinstance(mode, Adiabatic):
        return _adiabatic(experiment)
    T = mode.initial
    if isinstance(mode, Program):
        T = mode.points[-1][1].value
    elif isinstance(mode, Exchange):
        T = mode.surroundings.value
    return _at_temperature(experiment, T)


def _active(experiment: Experiment) -> list[Step]:
    """Steps whose reactants are there or can be made."""
    there, active = _reachable(experiment), []
    for step in experiment.steps:
        forward = all(gas in there for gas in step.orders)
        back = step.reverse is not None and all(gas in there for gas in step.reverse_orders)
        if forward or back:
            active.append(step)
    return active


def _reachable(experiment: Experiment) -> set[str]:
    there = {gas for gas, n in experiment.moles.items() if n > 0}
    while True:
        more = set(there)
        for step in experiment.steps:
            if all(gas in there for gas in step.orders):
                more.update(gas for gas, _ in step.products)
            if step.reverse is not None and all(gas in there for gas in step.reverse_orders):
                more.update(gas for gas, _ in step.reactants)
        if more == there:
            return there
        there = more


def _at_temperature(experiment: Experiment, T: float) -> Equilibrium:
    """Equilibrium at one temperature [K], in the vessel's own volume or at its own pressure."""
    vessel = experiment.vessel
    there = _reachable(experiment)
    names = [gas.name for gas in experiment.gases if gas.name in there]
    start = np.array([experiment.moles[name] for name in names])
    problem = _Concentrations(experiment, names, T)
    if vessel.is_rigid:
        volume = vessel.volume.value
        spread = volume + experiment.dead_capacity * T
        c = problem.solve(start / spread)
    else:
        from scipy.optimize import brentq

        p = experiment.held_pressure

        def excess(log_spread: float) -> float:
            return math.log(problem.solve(start / math.exp(log_spread)).sum() * R * T / p)

        middle = math.log(start.sum() * R * T / p)
        spread = math.exp(brentq(excess, middle - 3, middle + 3, xtol=1e-15, rtol=1e-15))
        c = problem.solve(start / spread)
        volume = spread - experiment.dead_capacity * T
    at_rest = {name: float(value * spread) for name, value in zip(names, c, strict=True)}
    moles = dict(experiment.moles) | at_rest
    return Equilibrium(moles, T, volume, float(c.sum()) * R * T)


class _Concentrations:
    """Equilibrium concentrations at one temperature for any totals.

    ln c = -g + B^T lambda: g any solution of N^T g = -ln K_c, B the conserved quantities; lambda
    minimises sum(c) - lambda . B c0 (convex). Source: the dual of Gibbs-energy minimisation,
    Smith and Missen, Chemical Reaction Equilibrium Analysis, 1982, chapter 3.
    """

    def __init__(self, experiment: Experiment, names: Sequence[str], T: float) -> None:
        from scipy.linalg import null_space

        steps = _active(experiment)
        net = np.array([[step.net.get(name, 0.0) for name in names] for step in steps])
        lnKc = np.array(
            [
                ln_K(step, experiment.gas_named, T)
                + step.change_of_moles * math.log(STANDARD_PRESSURE / (R * T))
                for step in steps
            ]
        )
        self.g, *_ = np.linalg.lstsq(net, -lnKc, rcond=None)
        mismatch = float(np.max(np.abs(net @ self.g + lnKc)))
        if mismatch > CYCLE:
            raise ComputationError(
                "equilibrium constants around a cycle contradict each other "
                f"by {mismatch:.1e} in ln K"
            )
        self.conserved = null_space(net).T

    def solve(self, start: Floats) -> Floats:
        """Concentrations [mol/m^3] with the conserved quantities of ``start``."""
        B, g = self.conserved, self.g
        totals = B @ start
        scale = float(start.sum())
        guess = np.log(np.maximum(start, 1e-3 * scale)) + g
        lam, *_ = np.linalg.lstsq(B.T, guess, rcond=None)
        # exp() of what the guess asks may overflow: come down from where all gases are scarce.
        lam -= B @ (np.ones(len(g)) * max(0.0, float(np.max(B.T @ lam - g)) - math.log(scale)))
        for _ in range(500):
            c = np.exp(B.T @ lam - g)
            gradient = B @ c - totals
            hessian = (B * c) @ B.T
            step = -np.linalg.lstsq(hessian, gradient, rcond=1e-14)[0]
            change = float(np.max(np.abs(B.T @ step)))
            lam = lam + step * min(1.0, 2.0 / max(change, 1e-300))
            if change < 1e-13 * max(1.0, float(np.max(np.abs(B.T @ lam)))):
                return np.asarray(np.exp(B.T @ lam - g))
        raise ComputationError("the equilibrium composition was not found in 500 iterations")


def _adiabatic(experiment: Experiment) -> Equilibrium:
    """The temperature at which the equilibrium mixture has the energy of the fill."""
    from scipy.optimize import brentq

    gases = {gas.name: gas for gas in experiment.gases}
    initial = experiment.temperature.initial
    rigid = experiment.vessel.is_rigid

    def energy(moles: dict[str, float], T: float) -> float:
        total = 0.0
        for name, n in moles.items():
            thermochemistry = gases[name].thermochemistry
            assert thermochemistry is not None, "why_none has looked"
            total += n * (float(thermochemistry.enthalpy(T)) - (R * T if rigid else 0.0))
        return total

    goal = energy(dict(experiment.moles), initial)

    def excess(T: float) -> float:
        return energy(_at_temperature(experiment, T).moles, T) - goal

    low, high = _bracket(excess, initial, experiment)
    return _at_temperature(experiment, float(brentq(excess, low, high, xtol=1e-10, rtol=1e-14)))


def _bracket(
    excess: Callable[[float], float], initial: float, experiment: Experiment
) -> tuple[float, float]:
    """Two temperatures between which the energy balance changes sign."""
    domains = [g.thermochemistry.domain for g in experiment.gases if g.thermochemistry is not None]
    lowest, highest = max(d[0] for d in domains), min(d[1] for d in domains)
    factor = 1.02 if excess(initial) < 0 else 1 / 1.02
    before, T = initial, initial
    while lowest < T * factor < highest:
        before, T = T, T * factor
        if (excess(T) < 0) != (factor > 1):
            return min(before, T), max(before, T)
    raise ComputationError(
        f"the adiabatic end temperature lies outside {lowest:.0f} to {highest:.0f} K, "
        "the range of the gases' thermochemistry"
    )
