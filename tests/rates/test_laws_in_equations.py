"""Every law as the equations read it: both readers, their Jacobians, and the law's own numbers.

Steps of one law with different formulas (tables of two and of five points) stand side by
side, and every temperature mode and vessel is visited.
"""

from __future__ import annotations

from functools import cache
from itertools import product

import numpy as np
import pytest
from encounters import molecule
from laboratory import experiment, si, step
from scipy.constants import N_A

from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.build import build_system
from meanfree.equations.compiled import CompiledEquations
from meanfree.equations.system import System
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Bath, Step
from meanfree.experiment.temperature import Adiabatic, Isothermal, Program, Temperature
from meanfree.experiment.vessel import Shape
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import from_values
from meanfree.rates.capture import Capture
from meanfree.rates.cross_section import CrossSection, EnergyPoint
from meanfree.rates.falloff import Centre, CentreTerm, Falloff
from meanfree.rates.limits import PowerLaw, StrongCollisions
from meanfree.rates.registry import LAWS
from meanfree.rates.table import Table, TablePoint
from meanfree.rates.termolecular import Termolecular
from meanfree.rates.wall import Wall

CM3 = 1e-6 * N_A


def gas(name: str, diameter: float) -> Gas:
    from dataclasses import replace

    energies = from_values(
        enthalpy_298=si(1e3 * len(name)),
        entropy_298=si(200.0 + 3 * len(name)),
        heat_capacity=[(200.0, 25.0), (700.0, 33.0), (1500.0, 40.0)],
    )
    return replace(molecule(name, diameter=diameter), thermochemistry=energies)


GASES = tuple(
    gas(name, d * 1e-10)
    for name, d in {"H": 2.3, "O2": 3.5, "HO2": 3.9, "H2": 2.7, "Ar": 3.4, "H2O2": 4.0}.items()
)


def table(*values: tuple[float, float]) -> Table:
    return Table(tuple(TablePoint(si(T), si(k)) for T, k in values))


def broken(beyond: str, *values: tuple[float, float]) -> CrossSection:
    points = tuple(EnergyPoint(si(1e3 * E), si(1e-20 * a)) for E, a in values)
    return CrossSection("points", points=points, beyond=beyond)  # type: ignore[arg-type]


FALLING, RISING = CentreTerm(si(0.5), si(900.0)), CentreTerm(si(0.3), si(400.0), rises=True)
POWER = (si(-1.4), si(300.0), si(2e3))
STEPS: dict[str, list[Step]] = {
    "table": [
        step("H2O2 -> HO2 + H", table((300, 0.1), (900, 4.0))),
        step("HO2 -> H + O2", table((300, 0.1), (450, 0.7), (600, 0.9), (700, 3.0), (900, 4.0))),
        step("H2 -> 2 H", table((250, 0.2), (950, 1.0))),
    ],
    "cross-section": [
        step("H + O2 -> HO2", broken("constant", (1, 0.0), (5, 2.0), (9, 1.0))),
        step("2 HO2 -> H2O2 + O2", broken("linear", (0, 0.1), (30, 0.4))),
        step("H + HO2 -> H2 + O2", broken("falling as 1/E", (2, 0.5), (4, 0.4), (50, 0.2))),
        step("H + H2O2 -> H2 + HO2", CrossSection("line of centres", si(2e-19), si(9e3))),
        step("H2 + O2 -> H + HO2", CrossSection("constant above threshold", si(1e-19), si(3e4))),
    ],
    "capture": [
        step("H + HO2 -> H2 + O2", Capture("dispersion", C6=si(3e-78))),
        step("2 H -> H2", Capture("dispersion", C6=si(1e-78), electronic_factor=si(0.25))),
        step(
            "H + O2 -> HO2",
            Capture(
                "electron jump",
                ionisation_energy={"H": si(6e5)},
                electron_affinity={"O2": si(4e4)},
            ),
        ),
    ],
    "falloff": [
        step("H + O2 + M -> HO2 + M", Falloff(PowerLaw(si(2e3), *POWER), PowerLaw(si(3e5)))),
        step(
            "2 HO2 + M -> H2O2 + O2 + M",
            Falloff(
                PowerLaw(si(9e3), *POWER), PowerLaw(si(1e4)), "unit width", Centre(si(0.4))
            ),
            bath=Bath({"Ar": 0.4, "H2": 2.5}),
        ),
        step(
            "H2O2 + M -> HO2 + H + M",
            Falloff(
                StrongCollisions(si(4e4), si(3.5), "Ar"),
                PowerLaw(si(1e5), *POWER),
                "width from Fc",
                Centre(si(0.1), (FALLING, RISING)),
            ),
            bath=Bath({"O2": 0.0}, others=1.5),
        ),
    ],
    "termolecular": [step("H + O2 + M -> HO2 + M", Termolecular(si(50.0), si(1e3)))],
    "wall": [
        step("H -> 0.5 H2", Wall(si(0.02))),
        step("HO2 -> 0.5 H2 + O2", Wall(si(0.2), "quick")),
        step("H2O2 -> H2 + O2", Wall(si(1e-5), "uptake only")),
    ],
}  # fmt: skip

MODES: dict[str, Temperature] = {
    "isothermal": Isothermal(si(500.0)),
    "program": Program(((si(0.0), si(400.0)), (si(50.0), si(800.0)))),
    "adiabatic": Adiabatic(si(500.0)),
}
FRAMES = tuple(product(STEPS, MODES, ("volume", "pressure")))


@cache
def case(law: str, mode: str, holds: str) -> tuple[Experiment, System]:
    from dataclasses import replace

    fill = {"H": 0.3, "O2": 0.9, "HO2": 0.2, "H2": 0.5, "Ar": 3.0, "H2O2": 0.7}
    made = experiment(
        STEPS[law], fill, gases=GASES, holds=holds, T=500.0, temperature=MODES[mode], until=1.0
    )
    vessel = replace(made.vessel, shape=Shape("cylinder", length=si(0.3)))
    made = replace(made, vessel=vessel)
    return made, build_system(made)


def state(system: System) -> np.ndarray:
    rng = np.random.default_rng(7)
    y = system.initial_state.copy()
    y[: system.n_gases] *= rng.uniform(0.5, 1.5, system.n_gases)
    if system.volume_varies:
        y[system.volume_index] = 1.2
    if system.temperature_varies:
        y[system.temperature_index] = 640.0
    return y


@pytest.mark.parametrize(("law", "mode", "holds"), FRAMES)
def test_both_readers_and_their_jacobians(law: str, mode: str, holds: str) -> None:
    """The readers share numbers and differ in the order of operations: a few hundred roundings.

    The Jacobian against central differences of the right-hand side: 6e-6 steps leave about
    1e-9 of the largest entry of a row.
    """
    _, system = case(law, mode, holds)
    y, t, segment = state(system), 12.5, system.segments[0]
    arrays, compiled = ArrayEquations(system), CompiledEquations(system)
    dy = arrays.derivative(t, y, segment)
    assert compiled.derivative(t, y, segment) == pytest.approx(
        dy, rel=1e-11, abs=1e-12 * np.abs(dy).max()
    )
    J, S = arrays.jacobian(t, y, segment).toarray(), compiled.jacobian(t, y, segment)
    rows = np.abs(J).max(axis=1, keepdims=True)
    assert np.all(np.abs(J - S) <= 1e-11 * rows)
    for j in range(system.size):
        h = 6e-6 * max(abs(y[j]), 1e-2)
        high, low = y.copy(), y.copy()
        high[j] += h
        low[j] -= h
        slope = (arrays.derivative(t, high, segment) - arrays.derivative(t, low, segment)) / (2 * h)
        assert np.all(np.abs(J[:, j] - slope) <= 3e-8 * (rows[:, 0] + np.abs(dy)))


@pytest.mark.parametrize(("law", "mode", "holds"), FRAMES)
def test_rates_are_the_laws_own(law: str, mode: str, holds: str) -> None:
    """rate = k(T, p, M) times the powers, with k asked of each step's law alone."""
    made, system = case(law, mode, holds)
    y, t, segment = state(system), 12.5, system.segments[0]
    arrays = ArrayEquations(system)
    now = arrays.unpack(t, y, segment)
    c = dict(zip(system.gases, now.c, strict=True))
    rates = arrays.rates(t, y, segment)
    for this, rate in zip(made.steps, rates, strict=True):
        M = 1.0
        if this.bath is not None:
            M = sum(this.bath.efficiency(name) * value for name, value in c.items())
        k = float(this.law.rate_constant(made.context(this), now.T, now.p, M))
        k *= 1.0 if this.bath is None or this.law.bath_inside else M
        for name, order in this.orders.items():
            k *= c[name] ** order
        assert rate == pytest.approx(k, rel=1e-12)


def test_every_step_here_is_possible() -> None:
    """No test above rests on a law that would be refused."""
    for law in STEPS:
        made, _ = case(law, "isothermal", "volume")
        for this in made.steps:
            assert list(this.law.problems(made.context(this))) == []


def test_steps_that_share_a_formula_share_a_block() -> None:
    """Two tables of two points are one block, that of five another; a law is one or several."""
    _, system = case("table", "isothermal", "volume")
    assert [(block.law.word, block.steps.tolist()) for block in system.blocks] == [
        ("table", [0, 2]),
        ("table", [1]),
    ]


def test_no_law_is_left_out() -> None:
    """A new law in the registry must be put in here; the first three have their own tests."""
    elsewhere = {"fixed", "arrhenius", "collision", "photolysis", "source"}
    assert set(LAWS) - elsewhere == set(STEPS)
