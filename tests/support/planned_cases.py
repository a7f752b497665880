"""Experiments of labels whose numbers have units, so that they have addresses to vary."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

import laboratory

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.experiment.temperature import Isothermal
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced
from meanfree.units import rate_constant, si_unit

UNITS = {
    "temperature": "K",
    "volume": "m^3",
    "molar energy": "J/mol",
    "concentration": "mol/m^3",
    "amount": "mol",
    "pressure": "Pa",
    "time": "s",
}


def quantity(value: float, dimension: str) -> Sourced:
    """A number in SI with the SI unit written."""
    return Sourced(value, UNITS.get(dimension, ""), "test", dimension)


def arrhenius(A: float, Ea: float, order: float = 2.0) -> Arrhenius:
    """A in SI per event, Ea [J/mol]."""
    word = rate_constant(order)
    return Arrhenius(Sourced(A, si_unit(word), "test", word), quantity(Ea, "molar energy"))


def fixed(k: float, order: float = 1.0) -> Fixed:
    """k in SI per event."""
    word = rate_constant(order)
    return Fixed(Sourced(k, si_unit(word), "test", word))


def planned(
    steps: Sequence[Step],
    fill: Mapping[str, float],
    *,
    T: float = 300.0,
    kind: str = "concentration",
    fill_at: float | None = None,
    **options: Any,
) -> Experiment:
    """As `laboratory.experiment`, with units."""
    made = laboratory.experiment(steps, fill, kind=kind, T=T, **options)
    portions = {
        gas: replace(portion, quantity=quantity(portion.quantity.value, kind))
        for gas, portion in made.fill.gases.items()
    }
    at = None if fill_at is None else quantity(fill_at, "temperature")
    return replace(
        made,
        vessel=replace(made.vessel, volume=quantity(made.vessel.volume.value, "volume")),
        temperature=Isothermal(quantity(T, "temperature")),
        fill=replace(made.fill, gases=portions, at=at),
    )
