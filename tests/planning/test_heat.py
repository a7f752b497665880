"""Heat release, runaway and adiabatic rise against problems solved again and balances by hand."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from laboratory import experiment, si, step
from scipy.integrate import solve_bvp
from scipy.optimize import minimize_scalar
from validation import Checked

from meanfree.case import load_case
from meanfree.constants import R
from meanfree.experiment.experiment import Experiment
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import from_values
from meanfree.integrate.single import integrate
from meanfree.planning import heat
from meanfree.planning.heat import Energies, Release
from meanfree.rates.arrhenius import Arrhenius

CASES = Path(__file__).parents[2] / "cases"


def delta_of(theta0: float, j: int) -> float:
    """delta at which the middle of the gas is warmer by theta0, by scipy's solve_bvp.

    theta'' + (j/x) theta' + delta exp(theta) = 0, theta'(0) = 0, theta(1) = 0, and delta unknown,
    so that one more condition, theta(0) = theta0, closes it.
    """

    def right(x: np.ndarray, y: np.ndarray, p: np.ndarray) -> np.ndarray:
        return np.vstack([y[1], -p[0] * np.exp(y[0])])

    def ends(a: np.ndarray, b: np.ndarray, p: np.ndarray) -> np.ndarray:
        return np.array([a[1], b[0], a[0] - theta0])

    x = np.linspace(0.0, 1.0, 21)
    guess = np.vstack([theta0 * (1 - x**2), -2 * theta0 * x])
    singular = np.array([[0.0, 0.0], [0.0, -float(j)]])
    found = solve_bvp(right, ends, x, guess, p=[1.0], S=singular, tol=1e-9, max_nodes=20000)
    assert found.success
    return float(found.p[0])


@pytest.mark.parametrize(
    ("j", "published", "ours"),
    [(0, "0.878", heat.SLAB), (1, "2.000", heat.CYLINDER), (2, "3.322", heat.SPHERE)],
)
def test_critical_frank_kamenetskii_parameters(
    j: int, published: str, ours: float, checked: Checked
) -> None:
    """Frank-Kamenetskii (1969), chapter 6: the largest delta that still has a steady state."""
    best = minimize_scalar(lambda theta0: -delta_of(theta0, j), bounds=(0.5, 2.5), method="bounded")
    # The published numbers have three decimals; ours at most four.
    source = "Frank-Kamenetskii (1969), chapter 6"
    form = ("slab", "long cylinder", "sphere")[j]
    checked(f"critical δ of a {form}", -best.fun, published, "", source, within=5.1e-4)
    assert -best.fun == pytest.approx(ours, abs=5.1e-5)


def test_semenov_parameter_is_the_tangency() -> None:
    # psi exp(theta) = theta has a solution up to the largest theta exp(-theta).
    best = minimize_scalar(lambda x: -x * math.exp(-x), bounds=(0.1, 3.0), method="bounded")
    assert pytest.approx(-best.fun, rel=1e-9) == heat.SEMENOV


def _labelled(name: str, enthalpy: float) -> Gas:
    """A label with a constant Cp of 40 J/mol/K."""
    known = from_values(
        enthalpy_298=si(enthalpy, "molar energy"),
        entropy_298=si(200.0, "molar heat capacity"),
        heat_capacity=si(40.0, "molar heat capacity"),
    )
    return replace(Gas.label(name), thermochemistry=known)


@pytest.fixture
def first_order() -> Experiment:
    """A -> B in 20 mol/m^3 A at 500 K, k = 1e8 exp(-100 kJ/mol/RT), releasing 60 kJ/mol."""
    law = Arrhenius(si(1e8), si(100e3, "molar energy"))
    gases = [_labelled("A", 0.0), _labelled("B", -60e3)]
    return experiment([step("A -> B", law)], {"A": 20.0}, T=500.0, gases=gases)


def test_heat_release_by_hand(first_order: Experiment) -> None:
    run = integrate(first_order)
    release = heat.greatest_release(run, Energies(first_order))
    k = 1e8 * math.exp(-100e3 / (R * 500.0))
    assert release.time == 0.0
    # Equal heat capacities: the heat of reaction is 60 kJ/mol at every temperature.
    assert release.power == pytest.approx(k * 20.0 * 60e3, rel=1e-9)
    # ln q is straight in 1/T, so the difference is good to rounding over its step.
    assert release.energy == pytest.approx(100e3, rel=1e-8)
    delta = heat.frank_kamenetskii(release, 0.05, 0.03)
    assert delta == pytest.approx(100e3 / (R * 500.0**2) * release.power * 0.05**2 / 0.03, rel=1e-7)
    psi = heat.semenov(release, 2e-3, 0.1)
    assert psi == pytest.approx(2e-3 * release.power * 100e3 / (0.1 * R * 500.0**2), rel=1e-7)


def test_adiabatic_rise_by_hand(first_order: Experiment) -> None:
    run = integrate(first_order)
    converted = float(run.conversion("A", run.end)[0])
    end = heat.adiabatic_end(run, Energies(first_order))
    # Constant Cv = Cp - R: rise = X (-dU)/Cv; dU = dH, for the moles stay.
    assert end == pytest.approx(500.0 + converted * 60e3 / (40.0 - R), rel=1e-9)


def test_adiabatic_rise_is_that_of_an_adiabatic_run() -> None:
    run = integrate(load_case(CASES / "cyclopropane-adiabatic.toml").experiment)
    end = heat.adiabatic_end(run, Energies(run.experiment))
    # The run integrates its own energy balance, which it keeps to about 1e-9.
    assert end == pytest.approx(float(run.temperature(run.end)[0]), rel=1e-7)


@pytest.mark.parametrize("name", ["hydrogen-bromine", "nocl-bulb", "dimer-piston"])
def test_rates_from_the_laws_are_those_of_the_run(name: str) -> None:
    run = integrate(load_case(CASES / f"{name}.toml").experiment)
    times = np.array([0.0, 0.3 * run.end, run.end])
    wanted, c = run.rates(times), run.concentrations(times)
    T = run.experiment.temperature.initial
    for i in range(len(times)):
        state = dict(zip(run.system.gases, np.maximum(c[:, i], 0.0), strict=True))
        found = [
            rate
            for one in run.experiment.steps
            for rate in heat.one_way_rates(run.experiment, one, state, T)
        ]
        if len(found) != len(wanted):
            found = found[:1]  # a step without reverse
        # Two evaluations of the same products of at most four factors.
        np.testing.assert_allclose(found, wanted[:, i], rtol=1e-11, atol=1e-300)


def test_an_endothermic_release_is_negative_and_keeps_its_energy() -> None:
    run = integrate(load_case(CASES / "nocl-bulb.toml").experiment)
    release = heat.greatest_release(run, Energies(run.experiment))
    assert isinstance(release, Release)
    assert release.power < 0
    # The forward step alone at the start: Ea but for the slope of the heat of reaction.
    assert release.energy == pytest.approx(102e3, rel=0.01)
