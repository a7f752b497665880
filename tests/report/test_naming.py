"""Addresses in words, and the numbers of a step that have no activation energy."""

from __future__ import annotations

from pathlib import Path

import pytest

from meanfree.case import load_case
from meanfree.experiment.rate_constants import activation_energy_at, rate_constant
from meanfree.report.planning.naming import in_words

CASES = Path(__file__).parents[2] / "cases"


@pytest.mark.parametrize(
    ("case", "address", "words"),
    [
        ("ion-tube", "gases.{neutral}.polarisability", "polarisability of {formula}"),
        ("ion-tube", "gases.{neutral}.diameter", "diameter of {formula}"),
        ("nocl-bulb", "fill.gases.NOCl", "NOCl filled"),
        ("nocl-bulb", "steps.decomposition.Ea", "Ea of decomposition"),
    ],
)
def test_an_address_in_words(case: str, address: str, words: str) -> None:
    experiment = load_case(CASES / f"{case}.toml").experiment
    there = {"neutral": "NH3", "formula": "NH₃"}
    assert in_words(address.format(**there), experiment) == words.format(**there)


def test_light_has_no_activation_energy() -> None:
    """J does not change with temperature, and the difference of rounded logarithms is no energy."""
    experiment = load_case(CASES / "lamp-on-off.toml").experiment
    energies = {
        step.law.word: activation_energy_at(step, rate_constant(experiment, step), 300.0)
        for step in experiment.steps
    }
    assert energies.pop("photolysis") is None
    assert all(energy is not None for word, energy in energies.items() if word == "arrhenius")
