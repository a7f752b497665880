"""k of a step of an experiment as a function of temperature, and the encounter that it is.

The reverse of a step is its forward k over K_c, at every temperature; tables, ceilings and figures
ask here, so that none of them works out its own.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.experiment.equilibrium import ln_K
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.gases.gas import Gas
from meanfree.rates.ceiling import activation_energy
from meanfree.rates.collision import Collision
from meanfree.rates.fixed import Fixed
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.source import Source


def rate_constant(
    experiment: Experiment, step: Step, back: bool = False
) -> Callable[[float], float]:
    """k of a step (or of its reverse) as a function of T [K], at the pressure and bath filled.

    In SI, per event: (m^3/mol)^(order-1)/s; k_rev = k_fwd / K_c(T).
    """
    context = experiment.context(step)
    M = bath_concentration(experiment, step)

    def forward(T: float) -> float:
        return float(step.law.rate_constant(context, T, experiment.initial_pressure, M))

    def reverse(T: float) -> float:
        lnKc = ln_K(step, experiment.gas_named, T)
        lnKc += step.change_of_moles * math.log(STANDARD_PRESSURE / (R * T))
        return forward(T) * math.exp(-lnKc)

    return reverse if back else forward


def bath_concentration(experiment: Experiment, step: Step) -> float:
    """M [mol/m^3] at the start, weighted with its efficiencies; 0 where the step has none."""
    if step.bath is None:
        return 0.0
    spread = experiment.initial_volume + experiment.dead_capacity * experiment.temperature.initial
    return sum(n * step.bath.efficiency(gas) for gas, n in experiment.moles.items()) / spread


def order_of(step: Step, back: bool = False) -> float:
    """Overall order of k, M counted where the law leaves it outside."""
    order = sum(step.reverse_orders.values()) if back else step.order
    return order + 1.0 if step.bath is not None and not step.law.bath_inside else order


def encounter(experiment: Experiment, step: Step, back: bool = False) -> tuple[Gas, ...]:
    """The two gases that meet; empty where the step is no encounter of two molecules."""
    if not back:
        return tuple(experiment.gas_named[name] for name in step.partners)
    orders = step.reverse_orders
    if sum(orders.values()) != 2 or any(order not in (1.0, 2.0) for order in orders.values()):
        return ()
    return tuple(
        experiment.gas_named[gas] for gas, order in orders.items() for _ in range(int(order))
    )


def own_diameter(experiment: Experiment, step: Step) -> float | None:
    """Mean diameter of the pair [m] where the law of the step has one, else None."""
    if isinstance(step.law, Collision):
        return step.law.pair_diameter(experiment.context(step))
    return None


def activation_energy_at(step: Step, k_of: Callable[[float], float], T: float) -> float | None:
    """Ea at T [J/mol]; None where k is a number, light or a supply, which say nothing of it."""
    if isinstance(step.law, Fixed | Photolysis | Source) or k_of(T) <= 0:
        return None
    return activation_energy(k_of, T)
