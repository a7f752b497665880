"""What the laws of two molecules that meet have in common: the half, the mass, the speed."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from meanfree.constants import N_A
from meanfree.errors import Problem
from meanfree.rates.law import Functions, StepContext


def symmetry(context: StepContext) -> float:
    """1/2 where both partners are molecules of one gas, else 1: each encounter counts once."""
    first, second = context.partners
    return 0.5 if first.name == second.name else 1.0


def reduced_mass(context: StepContext) -> float:
    """mu = m_A m_B/(m_A + m_B) of a step's two partners [kg]."""
    first, second = (gas.molar_mass for gas in context.partners)
    assert first is not None and second is not None, "problems() asks for both masses"
    return first.value * second.value / (first.value + second.value) / N_A


def speed_factor(fn: Functions, T: Any, mu: Any) -> Any:
    """N_A times the mean relative speed sqrt(8 k_B T/(pi mu)) [m/s/mol]."""
    return fn.N_A * fn.sqrt(8 * fn.k_B * T / (fn.pi * mu))


def masses_known(context: StepContext) -> Iterator[Problem]:
    """A problem for every colliding gas that has no mass."""
    for gas in dict.fromkeys(context.partners):
        if gas.molar_mass is None:
            found = f"the label {gas.name}, which has no mass"
            yield Problem("law", found, "a law that needs no mass, such as arrhenius")
