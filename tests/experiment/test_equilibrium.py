"""Where a vessel comes to rest: published equilibria, and runs that end there."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from laboratory import experiment, si, step

from meanfree.constants import ATMOSPHERE, R
from meanfree.errors import ComputationError
from meanfree.experiment.equilibrium import equilibrium, ln_K, why_none
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.experiment.temperature import Adiabatic
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.identity import find_gas
from meanfree.integrate.single import integrate


def gas(name):
    found = find_gas(name)
    return dataclasses.replace(found, thermochemistry=thermochemistry_of(found))


@pytest.mark.parametrize(("holds", "published"), [("volume", "0.441260"), ("pressure", "0.508355")])
def test_dinitrogen_tetroxide(holds, published, checked):
    """E03: N2O4 = 2 NO2 at 340 K, K_c 0.1 mol/L (Fogler, 3rd ed., Ex. 3-8), six digits."""
    given = GivenEquilibrium("Kc", si(100.0), si(340.0))
    case = experiment(
        [step("N2O4 -> 2 NO2", 1.0, reverse=given)], {"N2O4": 71.74}, holds=holds, T=340.0
    )
    rest = equilibrium(case)
    assert rest is not None
    ours = 1 - rest.moles["N2O4"] / case.moles["N2O4"]
    name = f"N₂O₄ dissociated at rest, constant {holds}"
    checked(name, ours, published, "", "Fogler, 3rd ed., Ex. 3-8", within=5e-7)
    run = integrate(case)
    assert run.settled_state is not None
    settled = run.settled_state[0] / run.system.initial_x[0]
    assert settled == pytest.approx(rest.moles["N2O4"] / case.moles["N2O4"], rel=1e-8)


def test_hydrogen_iodide():
    """F06: K(H2 + I2 = 2 HI) = 54.4 at 698.6 K (Taylor & Crist 1941, from memory), to 1 %."""
    gases = [gas(name) for name in ("H2", "I2", "HI")]
    formation = step("H2 + I2 -> 2 HI", 1.0, reverse="thermochemistry")
    constant = math.exp(ln_K(formation, {g.name: g for g in gases}, 698.6))
    assert constant == pytest.approx(54.4, rel=0.01)
    case = experiment([formation], {"H2": 1.0, "I2": 0.8}, T=698.6, gases=gases, watch="I2")
    run, rest = integrate(case), equilibrium(case)
    assert rest is not None
    n = rest.moles
    assert n["HI"] ** 2 / n["H2"] / n["I2"] == pytest.approx(constant, rel=1e-10)
    assert run.settled_state is not None
    assert run.settled_state[:3] * case.initial_volume == pytest.approx(
        [n[g.name] for g in gases], rel=1e-8
    )


def two_steps():
    """A + B = 2 C and C + B = D, with K_c that differ by orders of magnitude."""
    first = GivenEquilibrium("Kc", si(40.0), si(300.0))
    second = GivenEquilibrium("Kc", si(0.02), si(300.0))
    return [
        step("A + B -> 2 C", 0.5, reverse=first),
        step("C + B -> D", 2.0, reverse=second),
    ]


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("dead", [None, (2e-4, 250.0)])
def test_runs_end_at_equilibrium(holds, dead):
    case = experiment(
        two_steps(), {"A": 30.0, "B": 50.0, "Ar": 10.0}, holds=holds, dead=dead, until=1e6
    )
    rest, run = equilibrium(case), integrate(case)
    assert rest is not None
    ended = run.amounts(run.end)[:, 0]
    assert ended == pytest.approx([rest.moles[g] for g in run.system.gases], rel=1e-8)
    assert run.pressure(run.end)[0] == pytest.approx(rest.pressure, rel=1e-8)
    assert run.volume(run.end)[0] == pytest.approx(rest.volume, rel=1e-8)
    # and the constants hold there, by hand
    c = dict(zip(run.system.gases, run.concentrations(run.end)[:, 0], strict=True))
    assert c["C"] ** 2 / (c["A"] * c["B"]) == pytest.approx(40.0, rel=1e-7)
    assert c["D"] / (c["C"] * c["B"]) == pytest.approx(0.02, rel=1e-7)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_adiabatic_end(holds):
    """Against an energy balance done by hand, and against the run."""
    gases = [gas(name) for name in ("N2O4", "NO2", "Ar")]
    case = experiment(
        [step("N2O4 -> 2 NO2", 1e3, reverse="thermochemistry")],
        {"N2O4": 10.0, "Ar": 30.0},
        holds=holds,
        temperature=Adiabatic(si(330.0)),
        gases=gases,
        until=1e4,
    )
    rest, run = equilibrium(case), integrate(case)
    assert rest is not None
    assert run.temperature(run.end)[0] == pytest.approx(rest.temperature, rel=1e-8)
    assert run.amounts(run.end)[:, 0] == pytest.approx(
        [rest.moles[g.name] for g in gases], rel=1e-7
    )
    extent = rest.moles["NO2"] / 2

    def energy(T, amounts):
        less = R * T if holds == "volume" else 0.0
        return sum(
            n * (float(g.thermochemistry.enthalpy(T)) - less)
            for g, n in zip(gases, amounts, strict=True)
        )

    start = [case.moles[g.name] for g in gases]
    end = [start[0] - extent, 2 * extent, start[2]]
    # energies of about 1e3 J cancel to the 1e-8 of the root
    assert energy(rest.temperature, end) == pytest.approx(energy(330.0, start), abs=1e-6)
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-8


def test_extreme_constants():
    """K of 1e40 leaves a trace that is still right: c_A = c_B/K."""
    given = GivenEquilibrium("Kc", si(1e40), si(300.0))
    rest = equilibrium(experiment([step("A -> B", 1.0, reverse=given)], {"A": 1.0}))
    assert rest is not None
    assert rest.moles["A"] / rest.moles["B"] == pytest.approx(1e-40, rel=1e-9)


def test_stoichiometric_mixture_with_a_large_constant():
    given = GivenEquilibrium("Kc", si(1e30), si(300.0))
    rest = equilibrium(experiment([step("A + B -> C + D", 1.0, reverse=given)], {"A": 1, "B": 1}))
    assert rest is not None
    assert rest.moles["A"] / rest.moles["C"] == pytest.approx(1e-15, rel=1e-9)


def test_given_constants_change_with_temperature_as_van_t_hoff_says():
    """ln Kp(T2)/Kp(T1) = -dH/R (1/T2 - 1/T1), whichever way the constant is given."""
    dH, T1, T2 = 57e3, 300.0, 350.0
    kp = 0.15 * ATMOSPHERE
    for kind, value in (("Kp", kp), ("Kc", kp / (R * T1)), ("K", kp / 1e5)):
        given = GivenEquilibrium(kind, si(value), si(T1), si(dH))
        lnK = ln_K(step("A -> 2 B", 1.0, reverse=given), {}, T2)
        expected = math.log(kp / 1e5) - dH / R * (1 / T2 - 1 / T1)
        assert lnK == pytest.approx(expected, rel=1e-13)


def test_constants_around_a_cycle_must_multiply_to_one():
    def kc(value):
        return GivenEquilibrium("Kc", si(value), si(300.0))

    around = [step("A -> B", 1.0, reverse=kc(2.0)), step("B -> C", 1.0, reverse=kc(3.0))]
    closed = [*around, step("A -> C", 1.0, reverse=kc(6.0))]
    rest = equilibrium(experiment(closed, {"A": 1.0}))
    assert rest is not None
    n = np.array([rest.moles[g] for g in "ABC"])
    assert n / n[0] == pytest.approx([1.0, 2.0, 6.0], rel=1e-10)
    broken = [*around, step("A -> C", 1.0, reverse=kc(7.0))]
    with pytest.raises(ComputationError) as caught:
        equilibrium(experiment(broken, {"A": 1.0}))
    assert str(caught.value) == (
        "equilibrium constants around a cycle contradict each other by 5.1e-02 in ln K"
    )


def test_why_there_is_none():
    given = GivenEquilibrium("Kc", si(1.0), si(300.0))
    one_way = experiment([step("A -> B", 1.0, "there")], {"A": 1.0})
    assert why_none(one_way) == "one-way steps: there"
    assert equilibrium(one_way) is None
    idle = experiment([step("A -> B", 1.0, reverse=given)], {"Ar": 1.0})
    assert why_none(idle) == "no step can run"
    labels = experiment(
        [step("A -> B", 1.0, reverse=given)], {"A": 1.0}, temperature=Adiabatic(si(300.0))
    )
    assert why_none(labels) == "no thermochemistry of A, B"
