"""What is put in before time zero, and the moles that follow from it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from meanfree.constants import N_A, R
from meanfree.experiment.vessel import Vessel
from meanfree.sourced import Sourced

Kind = Literal["pressure", "amount", "concentration", "number density", "fraction"]


@dataclass(frozen=True)
class Portion:
    """How much of one gas (or of all gases) is filled, and in what sense.

    ``quantity`` in Pa, mol, mol/m^3, 1/m^3, or 1 as ``kind`` says.
    """

    quantity: Sourced
    kind: Kind


@dataclass(frozen=True)
class Fill:
    """The filled gases. ``balance`` names the gas that makes the others up to ``total``.

    ``at`` [K] is the temperature at which pressures, concentrations and number densities were
    read; None: the run's at time zero.
    """

    gases: Mapping[str, Portion]
    total: Portion | None = None
    balance: str | None = None
    at: Sourced | None = None

    @property
    def names(self) -> tuple[str, ...]:
        """Every filled gas, the balance last."""
        return (*self.gases, *((self.balance,) if self.balance is not None else ()))

    def temperature(self, initial: float) -> float:
        """Filling temperature [K], given the run's temperature at time zero [K]."""
        return initial if self.at is None else self.at.value

    def moles(self, vessel: Vessel, initial: float) -> dict[str, float]:
        """Amounts in vessel and dead space together [mol].

        Dead space holds its share at the common pressure: n = p (V/RT + V_d/RT_d).
        """
        T = self.temperature(initial)
        per_pascal = moles_per_pascal(vessel, vessel.volume.value, T)
        if self.total is None:
            return {
                gas: _moles(portion.quantity.value, portion.kind, T, per_pascal)
                for gas, portion in self.gases.items()
            }
        whole = _moles(self.total.quantity.value, self.total.kind, T, per_pascal)
        amounts = {
            gas: whole * portion.quantity.value
            if portion.kind == "fraction"
            else _moles(portion.quantity.value, portion.kind, T, per_pascal)
            for gas, portion in self.gases.items()
        }
        if self.balance is not None:
            amounts[self.balance] = whole - sum(amounts.values())
        return amounts

    def pressure(self, vessel: Vessel, initial: float) -> float:
        """Total pressure at filling [Pa]."""
        T = self.temperature(initial)
        n = sum(self.moles(vessel, initial).values())
        return n / moles_per_pascal(vessel, vessel.volume.value, T)


def moles_per_pascal(vessel: Vessel, volume: float, T: float) -> float:
    """V/RT + V_d/RT_d: the moles that one pascal holds in vessel and dead space [mol/Pa]."""
    dead = vessel.dead_space
    share = 0.0 if dead is None else dead.volume.value / dead.temperature.value
    return (volume / T + share) / R


def _moles(value: float, kind: Kind, T: float, per_pascal: float) -> float:
    """One quantity as moles; concentrations count at the filling temperature ``T``."""
    if kind == "amount":
        return value
    if kind == "number density":
        value, kind = value / N_A, "concentration"
    pressure = value * R * T if kind == "concentration" else value
    return pressure * per_pascal
