"""Leaks, pumping and dilution: their closed forms, what is conserved, and what is no conversion."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from encounters import molecule
from laboratory import experiment, si, step
from scipy.constants import R, pi

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.flows import Flow
from meanfree.experiment.temperature import Program
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate

GASES = [molecule(name) for name in ("N2O4", "NO2", "Ar", "He")]
FILL = {"N2O4": 1.5, "Ar": 4.0, "He": 2.0}
T, V = 400.0, 1e-3


def vessel(*flows: Flow, k: float = 0.0, **options: Any) -> Experiment:
    steps = [step("N2O4 -> 2 NO2", k)]
    made = experiment(steps, FILL, gases=GASES, T=T, volume=V, until=1000.0, **options)
    return replace(made, flows=flows)


def kept(run: Run, gas: str, t: float) -> float:
    return float(run.amounts(t)[run.index(gas), 0] / run.experiment.moles[gas])


def speed(gas: str, kelvin: float = T) -> float:
    mass = next(float(g.molar_mass) for g in GASES if g.name == gas)  # type: ignore[arg-type]
    return math.sqrt(8 * R * kelvin / (pi * mass))


PINHOLE = Flow("effusion", hole=si(3e-9), transmission=si(0.5))


def test_effusion_goes_as_the_root_of_the_mass() -> None:
    """Knudsen: exp(-A tau v t/(4 V)) of each gas; helium over argon sqrt(M_Ar/M_He)."""
    run = integrate(vessel(PINHOLE))
    logs = {gas: -math.log(kept(run, gas, 1000.0)) for gas in ("Ar", "He")}
    for gas, value in logs.items():
        assert value == pytest.approx(3e-9 * 0.5 * speed(gas) * 1000 / (4 * V), rel=1e-7)
    masses = {g.name: float(g.molar_mass) for g in GASES}  # type: ignore[arg-type]
    assert logs["He"] / logs["Ar"] == pytest.approx(
        math.sqrt(masses["Ar"] / masses["He"]), rel=1e-7
    )


@pytest.mark.parametrize("dead", [None, (2e-4, 300.0)], ids=["", "dead space"])
def test_a_leak_is_no_conversion(dead: tuple[float, float] | None) -> None:
    """X of a gas that does not react stays 0; of one that does, it is 1 - exp(-kt) all the same.

    With dead space only the hot part reacts and leaks: v/w = 1/(1 + 0.2 400/300).
    """
    run = integrate(vessel(PINHOLE, Flow("pumping", rate=si(5e-4)), k=1e-3, dead=dead))
    t = np.array([1.0, 300.0, 1000.0])
    hot = 1.0 if dead is None else 1 / (1 + 0.2 * 400 / 300)
    assert run.conversion("Ar", t) == pytest.approx(np.zeros(3), abs=1e-7)
    assert run.conversion("N2O4", t) == pytest.approx(1 - np.exp(-1e-3 * t * hot), rel=1e-6)
    assert kept(run, "Ar", 1000.0) < math.exp(-0.5 * hot)


def test_a_leak_follows_a_temperature_program() -> None:
    """int sqrt(T) dt of a ramp from 300 to 500 K: (2/3)(500^1.5 - 300^1.5)/0.2."""
    program = Program(((si(0.0), si(300.0)), (si(1000.0), si(500.0))))
    run = integrate(vessel(PINHOLE, temperature=program))
    expected = 3e-9 * 0.5 * speed("He", 1.0) / (4 * V) * (500**1.5 - 300**1.5) / 1.5 / 0.2
    assert -math.log(kept(run, "He", 1000.0)) == pytest.approx(expected, rel=1e-7)
    assert run.conversion("He", [200.0, 777.0]) == pytest.approx([0, 0], abs=1e-7)


def test_dilution_keeps_the_moles() -> None:
    """Argon leaves and enters: what was there goes as exp(-kt), the sum stands still."""
    k = 2e-3
    run = integrate(vessel(Flow("dilution", rate=si(k), entering={"Ar": si(1.0)})))
    assert kept(run, "He", 1000.0) == pytest.approx(math.exp(-2), rel=1e-7)
    total = run.amounts([0.0, 500.0, 1000.0]).sum(axis=0)
    assert total == pytest.approx(np.full(3, 7.5e-3), rel=1e-9)


def test_a_leak_up_raises_the_pressure_as_the_blank_did() -> None:
    """0.05 Pa/s of air-like gas for 1000 s: 50 Pa, shared as the mixture says."""
    air = {"Ar": si(0.2), "He": si(0.8)}
    run = integrate(vessel(Flow("leak-up", rise=si(0.05), entering=air)))
    p0, p1 = run.pressure([0.0, 1000.0])
    assert p1 - p0 == pytest.approx(50.0, rel=1e-8)
    change = run.partial_pressures([0.0, 1000.0])[run.index("Ar")]
    assert change[1] - change[0] == pytest.approx(10.0, rel=1e-8)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_the_ledgers_close(holds: str) -> None:
    """Elements with what flowed in and out: below 1e-10 of what there was, beside a reaction."""
    flows = (
        PINHOLE,
        Flow("dilution", rate=si(1e-3), entering={"Ar": si(0.5), "He": si(0.5)}),
        Flow("leak-up", rise=si(0.05), entering={"NO2": si(1.0)}),
    )
    run = integrate(vessel(*flows, k=1e-3, holds=holds))
    assert set(run.invariants.elements) == {"Ar", "He", "N", "O"}
    assert max(run.invariants.elements.values()) < 1e-10


def test_flows_stand_beside_the_mechanism_not_in_it() -> None:
    made = vessel(PINHOLE, Flow("dilution", rate=si(1e-3), entering={"Ar": si(1.0)}))
    assert [s.name for s in made.steps] == ["N2O4 -> 2 NO2"]
    names = integrate(made).system.steps
    assert names == (
        "N2O4 -> 2 NO2",
        *(f"effusion 1 of {g.name}" for g in GASES),
        *(f"dilution 2 of {g.name}" for g in GASES),
        "dilution 2",
    )
