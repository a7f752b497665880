"""The Experiment: mechanism, vessel, temperature, fill and run, joined.

It is inert and complete: whatever is computed later is computed from this.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property

from meanfree.constants import R
from meanfree.experiment.fill import Fill
from meanfree.experiment.flows import Flow, flow_steps
from meanfree.experiment.mechanism import Step
from meanfree.experiment.plan import RunPlan
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Temperature, is_constant, known_range
from meanfree.experiment.vessel import Vessel
from meanfree.gases.gas import Gas
from meanfree.rates.law import StepContext


@dataclass(frozen=True)
class Experiment:
    """One closed vessel, once.

    ``gases`` holds every gas of the fill and the steps, in the order of the case file.
    """

    title: str
    gases: tuple[Gas, ...]
    steps: tuple[Step, ...]
    vessel: Vessel
    temperature: Temperature
    fill: Fill
    plan: RunPlan = field(default_factory=RunPlan)
    purpose: str = ""
    notes: tuple[str, ...] = ()
    samples: tuple[Sample, ...] = ()
    flows: tuple[Flow, ...] = ()

    @cached_property
    def gas_named(self) -> Mapping[str, Gas]:
        """Gas by name."""
        return {gas.name: gas for gas in self.gases}

    @cached_property
    def flow_steps(self) -> tuple[Step, ...]:
        """What leaks, pumps and dilution do, as steps beside those of the mechanism."""
        return flow_steps(self.flows, self.gases, self.temperature.initial)

    @cached_property
    def moles(self) -> Mapping[str, float]:
        """Amount of every gas at time zero, vessel and dead space together [mol]."""
        filled = self.fill.moles(self.vessel, self.temperature.initial)
        return {gas.name: filled.get(gas.name, 0.0) for gas in self.gases}

    @cached_property
    def mole_fractions(self) -> Mapping[str, float]:
        """Mole fraction of every gas at time zero; empty where nothing is filled."""
        total = sum(self.moles.values())
        return {gas: n / total for gas, n in self.moles.items()} if total > 0 else {}

    @cached_property
    def initial_volume(self) -> float:
        """Volume of the hot part at time zero [m^3].

        A piston goes to V = V_fill T(0)/T_fill p_fill/p; dead space gives or takes its share.
        """
        if self.vessel.is_rigid:
            return self.vessel.volume.value
        held, T = self.held_pressure, self.temperature.initial
        return T * (sum(self.moles.values()) * R / held - self.dead_capacity)

    @cached_property
    def held_pressure(self) -> float:
        """The pressure a piston holds [Pa]: given, or the sum of the filled partial pressures."""
        if self.vessel.pressure is not None:
            return self.vessel.pressure.value
        return self.fill.pressure(self.vessel, self.temperature.initial)

    @cached_property
    def initial_pressure(self) -> float:
        """Total pressure at time zero, at the run's temperature [Pa]."""
        if not self.vessel.is_rigid:
            return self.held_pressure
        capacity = self.initial_volume / self.temperature.initial + self.dead_capacity
        return sum(self.moles.values()) * R / capacity

    @property
    def dead_capacity(self) -> float:
        """V_d/T_d of the dead space [m^3/K], 0 without one."""
        dead = self.vessel.dead_space
        return 0.0 if dead is None else dead.volume.value / dead.temperature.value

    @property
    def constant_temperature(self) -> float | None:
        """The run's temperature where it is constant [K], else None."""
        return self.temperature.initial if is_constant(self.temperature) else None

    @cached_property
    def watched(self) -> str | None:
        """The gas whose conversion counts: the one named, else the limiting filled reactant."""
        if self.plan.watch is not None:
            return self.plan.watch
        needs = {
            gas: self.moles[gas] / coefficient
            for step in self.steps
            for gas, coefficient in step.reactants
            if step.net.get(gas, 0.0) < 0 and self.moles.get(gas, 0.0) > 0
        }
        return min(needs, key=lambda gas: needs[gas]) if needs else None

    def context(self, step: Step) -> StepContext:
        """What the law of a step may know."""
        return StepContext(
            partners=tuple(self.gas_named[name] for name in step.partners),
            order=step.order,
            temperature=self.constant_temperature,
            pressure=self.initial_pressure,
            surroundings=self.vessel,
            bath=self.mole_fractions,
            gases=self.gas_named,
            reactants=tuple(
                self.gas_named[name] for name, n in step.reactants for _ in range(math.ceil(n))
            ),
            temperatures=known_range(self.temperature),
            has_bath=step.bath is not None,
        )
