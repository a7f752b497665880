"""Contexts of a step for tests of rate laws: two real molecules, or whatever is asked."""

from __future__ import annotations

from typing import Any

from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.rates.law import StepContext
from meanfree.sourced import Sourced


def molecule(name: str, molar_mass: float | None = None, diameter: float | None = None) -> Gas:
    """A gas with that molar mass [kg/mol] (else its formula's) and diameter [m]."""
    formula = parse_formula(name)
    mass = formula.molar_mass if molar_mass is None else Sourced(molar_mass)
    size = None if diameter is None else Sourced(diameter)
    return Gas(name, formula, molar_mass=mass, diameter=size)


def meeting(first: Gas, second: Gas | None = None, **options: Any) -> StepContext:
    """The context of ``first + second``, or of ``2 first``."""
    pair = (first, first if second is None else second)
    return StepContext(
        partners=pair,
        order=2.0,
        gases={gas.name: gas for gas in pair},
        reactants=pair,
        **options,
    )


def alone(gas: Gas, **options: Any) -> StepContext:
    """The context of a step of one molecule."""
    options.setdefault("gases", {gas.name: gas})
    return StepContext(partners=(), order=1.0, reactants=(gas,), **options)
