"""Heat that a reaction releases, and what it does where it cannot leave fast enough.

Rates are worked out here from the laws themselves at any temperature, so that heat release can
be asked for at a wall temperature that the run never had.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.experiment.equilibrium import ln_K
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.experiment.temperature import Exchange, Program
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.thermochemistry import Thermochemistry
from meanfree.integrate.run import Run

Floats = NDArray[np.float64]

SLAB, CYLINDER, SPHERE = 0.8785, 2.0, 3.3220
"""Critical values of the Frank-Kamenetskii parameter [1]: the largest delta for which
theta'' + (j/x) theta' + delta exp(theta) = 0, theta'(0) = theta(1) = 0, has a solution, for
j = 0, 1, 2. Source: D. A. Frank-Kamenetskii, Diffusion and Heat Transfer in Chemical Kinetics
(1969), chapter 6 (0.88, 2.00, 3.32); the tests solve the problem again."""

SEMENOV = math.exp(-1.0)
"""Critical value of V q E/(G R T_s^2) [1] for a gas of uniform temperature: tangency of the heat
release exp(theta) with the loss. Source: N. N. Semenov, Z. Phys. 48, 571 (1928)."""

MOMENTS, EVALUATIONS = 200, 6000
"""Times of a run at which its heat release is looked at, at most; times steps, at most."""


@dataclass(frozen=True)
class Release:
    """Heat released per volume at one moment.

    ``power`` [W/m^3], positive where heat is released; ``energy`` E = R T^2 d ln q/dT [J/mol],
    at ``temperature`` of the wall [K]; ``time`` [s].
    """

    power: float
    energy: float
    temperature: float
    time: float


def wall_temperature(experiment: Experiment, t: float) -> float:
    """Temperature of the wall [K] at a time [s]: what the gas is held at or cooled by."""
    mode = experiment.temperature
    if isinstance(mode, Exchange):
        return mode.surroundings.value
    if isinstance(mode, Program):
        times = [time.value for time, _ in mode.points]
        return float(np.interp(t, times, [T.value for _, T in mode.points]))
    return mode.initial


def one_way_rates(
    experiment: Experiment, step: Step, c: Mapping[str, float], T: float
) -> tuple[float, float]:
    """Rate of a step and of its reverse [mol/m^3/s] at concentrations [mol/m^3] and T [K]."""
    p = R * T * sum(c.values())
    M = 0.0
    if step.bath is not None:
        M = sum(step.bath.efficiency(gas) * amount for gas, amount in c.items())
    k = float(step.law.rate_constant(experiment.context(step), T, p, M))
    if step.bath is not None and not step.law.bath_inside:
        k *= M
    forward = k * _product(c, step.orders, [gas for gas, _ in step.reactants])
    if step.reverse is None:
        return forward, 0.0
    lnKc = ln_K(step, experiment.gas_named, T)
    lnKc += step.change_of_moles * math.log(STANDARD_PRESSURE / (R * T))
    consumed = [gas for gas, n in step.net.items() if n > 0]
    return forward, k * math.exp(-lnKc) * _product(c, step.reverse_orders, consumed)


def _product(c: Mapping[str, float], orders: Mapping[str, float], consumed: list[str]) -> float:
    """Product of concentration powers; nothing runs on a gas that is not there."""
    if any(c[gas] <= 0 for gas in (*consumed, *orders)):
        return 0.0
    return float(math.prod(c[gas] ** order for gas, order in orders.items()))


class Energies:
    """Energies of the gases of an experiment; ``lacking`` names those that have none."""

    def __init__(self, experiment: Experiment) -> None:
        self.experiment = experiment
        T = experiment.temperature.initial
        self.of: dict[str, Thermochemistry | None] = {
            gas.name: thermochemistry_of(gas, T, T) for gas in experiment.gases
        }
        needed = {
            gas
            for step in experiment.steps
            if step.heat is None
            for gas, n in step.net.items()
            if n
        }
        self.lacking = tuple(sorted(gas for gas in needed if self.of[gas] is None))
        self.is_open = any(not step.reactants or not step.products for step in experiment.steps)

    def released(self, step: Step, T: float) -> float:
        """Heat released by one mole of events [J/mol], as the energy balance of the vessel has it:
        -dU in a rigid vessel, -dH in a piston."""
        light = 0.0 if step.photon is None else step.photon.value
        if step.heat is not None:
            dH = -step.heat.value
        else:
            dH = sum(n * float(self._known(gas).enthalpy(T)) for gas, n in step.net.items())
        rigid = self.experiment.vessel.is_rigid
        return light - dH + (step.change_of_moles * R * T if rigid else 0.0)

    def _known(self, gas: str) -> Thermochemistry:
        found = self.of[gas]
        assert found is not None, "lacking has been looked at"
        return found

    def power(self, c: Mapping[str, float], T: float) -> float:
        """Heat released per volume [W/m^3] at concentrations [mol/m^3] and T [K]."""
        total = 0.0
        for step in self.experiment.steps:
            forward, back = one_way_rates(self.experiment, step, c, T)
            if forward != back:
                total += (forward - back) * self.released(step, T)
        return total

    def release(self, c: Mapping[str, float], T: float, t: float) -> Release:
        """The heat release and how it rises with temperature, by a central difference."""
        power = self.power(c, T)
        h = 1e-3 / T
        above, below = (self.power(c, 1.0 / (1.0 / T + s * h)) for s in (-1, 1))
        E = R * math.log(above / below) / (2 * h) if above * below > 0 else 0.0
        return Release(float(power), float(E), T, t)


def greatest_release(run: Run, energies: Energies) -> Release:
    """The larger of the initial and the peak heat release of a run, at wall temperature.

    Where heat is only taken up, the moment at which most is.
    """
    times = run.trajectory.times
    most = min(MOMENTS, max(10, EVALUATIONS // max(1, len(run.experiment.steps))))
    times = times[np.unique(np.linspace(0, len(times) - 1, most).round().astype(int))]
    names = run.system.gases
    concentrations = run.concentrations(times)
    powers = np.zeros(len(times))
    for i, t in enumerate(times):
        c = dict(zip(names, np.maximum(concentrations[:, i], 0.0), strict=True))
        powers[i] = energies.power(c, wall_temperature(run.experiment, float(t)))
    i = int(np.argmax(powers if powers.max() > 0 else -powers))
    c = dict(zip(names, np.maximum(concentrations[:, i], 0.0), strict=True))
    t = float(times[i])
    return energies.release(c, wall_temperature(run.experiment, t), t)


def adiabatic_end(run: Run, energies: Energies) -> float | None:
    """Temperature [K] if all that reacts in the run reacted and no heat left.

    Internal energy (rigid) or enthalpy (piston) is balanced from the fill at the temperature
    at time zero to what is there at the end of the run; where that ends beyond the range of the
    energies, in proportion to the heat capacity at the start. None where an energy is not known, a
    heat is stated instead, or matter or light comes in.
    """
    from scipy.optimize import brentq

    experiment = run.experiment
    stated = any(s.heat is not None or s.photon is not None for s in experiment.steps)
    if stated or energies.is_open or any(e is None for e in energies.of.values()):
        return None
    rigid, T0 = experiment.vessel.is_rigid, experiment.temperature.initial
    start = run.amounts(0.0)[:, 0]
    end = run.amounts(run.end)[:, 0]

    def energy(amounts: Floats, T: float) -> float:
        total = 0.0
        for gas, n in zip(run.system.gases, amounts, strict=True):
            found = energies._known(gas)
            total += float(n) * (float(found.enthalpy(T)) - (R * T if rigid else 0.0))
        return total

    goal = energy(start, T0)
    domains = [e.domain for e in energies.of.values() if e is not None]
    low, high = max(d[0] for d in domains), min(d[1] for d in domains)
    if (energy(end, low) - goal) * (energy(end, high) - goal) > 0:
        # Beyond the range of the energies: in proportion, with the heat capacity at the start.
        h = 1e-3 * T0
        capacity = (energy(end, T0 + h) - energy(end, T0 - h)) / (2 * h)
        return T0 + (goal - energy(end, T0)) / capacity
    return float(brentq(lambda T: energy(end, T) - goal, low, high, xtol=1e-10, rtol=1e-14))


def frank_kamenetskii(release: Release, radius: float, conductivity: float) -> float:
    """delta = (E/R T_s^2)(q r^2/lambda) [1]; r [m] is the radius or the half-width.

    Negative where heat is taken up.

    Source: Frank-Kamenetskii (1969), chapter 6.
    """
    T = release.temperature
    return release.energy / (R * T**2) * release.power * radius**2 / conductivity


def semenov(release: Release, volume: float, conductance: float) -> float:
    """V q E/(G R T_s^2) [1], G [W/K] the conductance from gas to surroundings.

    Source: Semenov (1928).
    """
    T = release.temperature
    return volume * release.power * release.energy / (conductance * R * T**2)
