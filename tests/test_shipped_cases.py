"""The shipped cases give what a kineticist would work out by hand."""

from __future__ import annotations

import dataclasses
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from meanfree.case import load_case
from meanfree.constants import N_A, R, k_B
from meanfree.experiment.equilibrium import equilibrium
from meanfree.experiment.plan import Solver
from meanfree.experiment.temperature import Isothermal
from meanfree.integrate.single import integrate

CASES = Path(__file__).parents[1] / "cases"


@cache
def run(name):
    return integrate(load_case(CASES / f"{name}.toml").experiment)


def test_nitrosyl_chloride():
    """25 % in about 14.5 min; equilibrium stops it near 39 %: K_p from ATcT by hand."""
    case, ours = load_case(CASES / "nocl-bulb.toml").experiment, run("nocl-bulb")
    assert ours.reaction_time("NOCl", 0.25) == pytest.approx(14.5 * 60, rel=0.01)
    rest = equilibrium(case)
    assert rest is not None
    stopped = 1 - rest.moles["NOCl"] / case.moles["NOCl"]
    assert 0.35 < stopped < 0.40
    assert ours.settled_state is not None
    settled = 1 - ours.settled_state[0] / ours.system.initial_x[0]
    assert settled == pytest.approx(stopped, rel=1e-8)
    k = 9.4e9 * 1e-3 * np.exp(-102e3 / (R * 480.0))  # per event, m^3/mol/s
    c0 = 50 * 101325 / 760 / (R * 296.0)
    # before the reverse matters: -dc/dt = 2 k c^2
    slope = -2 * k * c0**2
    assert ours.concentrations([1e-3])[0, 0] - c0 == pytest.approx(slope * 1e-3, rel=1e-4)


def test_dimerisation():
    """Half after 48.7 min in the piston, 57.5 in a rigid vessel; the volume falls by a quarter."""
    case = load_case(CASES / "dimer-piston.toml").experiment
    half = run("dimer-piston").reaction_time("C4H6", 0.5)
    assert half is not None
    assert half / 60 == pytest.approx(48.7, abs=0.05)
    assert run("dimer-piston").volume_ratio(half)[0] == pytest.approx(0.75, rel=1e-8)
    rigid = dataclasses.replace(case, vessel=dataclasses.replace(case.vessel, holds="volume"))
    time = integrate(rigid).reaction_time("C4H6", 0.5)
    assert time is not None
    assert time / 60 == pytest.approx(57.5, abs=0.05)


def test_trace_ozone():
    """Half-life ln 2/(k [C2H4]): pseudo first order, about half an hour."""
    k, ethene = 1.6e-24, 10e-6 * 101325 / (k_B * 298.0)  # m^3/s, 1/m^3
    half = run("ozone-ethene").reaction_time("O3", 0.5)
    # ethene is only 50 times the ozone: 1 % of it is gone by then, 0.5 % on average
    assert half == pytest.approx(np.log(2) / (k * ethene), rel=0.01)
    assert half == pytest.approx(1800.0, rel=0.03)


def test_bromine_chain():
    """Atoms are where quasi-steady kinetics puts them, H at about 1e-13 of all gas."""
    case, ours = load_case(CASES / "hydrogen-bromine.toml").experiment, run("hydrogen-bromine")
    time = ours.reaction_time("Br2", 0.5)
    assert time is not None
    assert 600 < time < 6 * 3600
    c = dict(zip(ours.system.gases, ours.concentrations(time)[:, 0], strict=True))
    total = sum(c.values())
    assert 1e-14 < c["H"] / total < 1e-12
    k = _coefficients(ours)
    # Br2 <-> 2 Br at equilibrium, propagation balanced for H; both hold as far as the atoms are
    # few (1e-6) and the chain long.
    K = k["recombination (reverse)"] / k["recombination"]
    assert c["Br"] == pytest.approx(np.sqrt(K * c["Br2"]), rel=2e-3)
    made = k["propagation"] * c["Br"] * c["H2"]
    made += k["fast propagation (reverse)"] * c["HBr"] * c["Br"]
    taken = k["propagation (reverse)"] * c["HBr"] + k["fast propagation"] * c["Br2"]
    assert c["H"] == pytest.approx(made / taken, rel=1e-6)
    sharp = integrate(case, Solver("Radau", rtol=1e-11, atol=1e-24))
    fine = dict(zip(sharp.system.gases, sharp.concentrations(time)[:, 0], strict=True))
    # a thousand times tighter tolerance moves the atoms by no more than rtol 1e-8 allows
    assert c["H"] == pytest.approx(fine["H"], rel=1e-7, abs=0)
    assert c["Br"] == pytest.approx(fine["Br"], rel=1e-7, abs=0)


def _coefficients(ours):
    from meanfree.equations.arrays import ArrayEquations

    k = ArrayEquations(ours.system).coefficients(590.0, 1.0, np.ones(ours.system.n_steps)).k
    return dict(zip(ours.system.steps, k, strict=True))


def test_adiabatic_cyclopropane():
    """75 ms held at 1000 K (ln 2/k), about 28 ms where the gas warms itself."""
    case = load_case(CASES / "cyclopropane-adiabatic.toml").experiment
    held = integrate(
        dataclasses.replace(case, temperature=Isothermal(case.temperature.value))
    ).reaction_time("c-C3H6", 0.5)
    k = 1.5e15 * np.exp(-272e3 / (R * 1000.0))
    # the reverse takes half a per cent off
    assert held == pytest.approx(np.log(2) / k, rel=0.01)
    assert held == pytest.approx(75e-3, rel=0.02)
    warmed = run("cyclopropane-adiabatic").reaction_time("c-C3H6", 0.5)
    assert warmed == pytest.approx(28e-3, rel=0.02)


def test_warmed_peroxide():
    """Conversion at the end of the warm-up is 1 - exp(-integral of k), by quadrature."""
    from scipy.integrate import quad

    def k(t):
        return 4e15 * np.exp(-157e3 / (R * (296.0 + 147.0 * min(t, 240.0) / 240.0)))

    ours = run("peroxide-warm-up")
    by_hand = 1 - np.exp(-quad(k, 0, 240.0, epsabs=0, epsrel=1e-12)[0])
    assert ours.conversion("DTBP", 240.0)[0] == pytest.approx(by_hand, rel=1e-8)
    # one molecule becomes three
    filled = ours.pressure(0.0)[0] / 296.0
    assert ours.pressure(ours.end)[0] / 443.0 / filled == pytest.approx(3.0, rel=1e-3)


def test_every_shipped_case_says_that_it_is_invented():
    for file in CASES.glob("*.toml"):
        assert "invented" in file.read_text().splitlines()[1].lower(), file.name


def test_number_density_of_the_ozone_case():
    """10 ppm at 1 atm and 298 K are 2.46e14 molecules/cm^3."""
    case = load_case(CASES / "ozone-ethene.toml").experiment
    density = case.moles["C2H4"] / case.initial_volume * N_A * 1e-6
    assert density == pytest.approx(2.463e14, rel=1e-3)
