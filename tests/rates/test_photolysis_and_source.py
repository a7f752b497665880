"""Light that is switched by the clock, its energy, and gas let in at a constant rate."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from encounters import alone, molecule
from laboratory import experiment, si, step
from scipy.constants import N_A, R, c, h

from meanfree.experiment.temperature import Adiabatic, Program
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import from_values
from meanfree.integrate.single import integrate
from meanfree.rates.law import StepContext
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.source import Source

J = 2e-3


def lamp(on: tuple[float, ...] = (), off: tuple[float, ...] = ()) -> Photolysis:
    return Photolysis(si(J), tuple(map(si, on)), tuple(map(si, off)))


@pytest.mark.parametrize(
    ("on", "off", "lit"),
    [
        ((), (), 1000.0),
        ((), (300.0,), 300.0),
        ((200.0,), (), 800.0),
        ((200.0, 700.0), (300.0,), 400.0),
        ((0.0, 500.0), (100.0, 600.0), 200.0),
        ((500.0,), (100.0, 600.0), 200.0),
    ],
)
def test_what_is_left_tells_how_long_the_lamp_was_on(
    on: tuple[float, ...], off: tuple[float, ...], lit: float
) -> None:
    """exp(-J t) over the lit times. The run is asked for 1e-10, Radau keeps it within 1e-9."""
    run = integrate(experiment([step("A -> B", lamp(on, off))], {"A": 2.0}, until=1000.0))
    assert run.concentrations(1000.0)[0, 0] == pytest.approx(2 * math.exp(-J * lit), rel=2e-8)


def test_the_dark_is_dark_and_its_edges_are_sharp() -> None:
    """Nothing changes while the lamp is off: the states at both edges are one and the same."""
    run = integrate(experiment([step("A -> B", lamp((), (50.0,)))], {"A": 1.0}, until=500.0))
    edge, later = run.concentrations([50.0, 499.0])[0]
    assert later == edge
    # the rates at a break are those just before it
    assert run.rates([50.0, 51.0])[0].tolist() == [pytest.approx(J * edge, rel=1e-12), 0.0]


def test_lamp_and_temperature_program_share_their_breaks() -> None:
    program = Program(((si(0.0), si(300.0)), (si(100.0), si(400.0)), (si(300.0), si(400.0))))
    made = experiment(
        [step("A -> B", lamp((150.0,), (50.0,)))], {"A": 1.0}, temperature=program, until=400.0
    )
    run = integrate(made)
    starts = [(s.start, s.temperature, s.slope, s.switches.tolist()) for s in run.system.segments]  # type: ignore[union-attr]
    assert starts == [
        (0.0, 300.0, 1.0, [1.0]),
        (50.0, 350.0, 1.0, [0.0]),
        (100.0, 400.0, 0.0, [0.0]),
        (150.0, 400.0, 0.0, [1.0]),
        (300.0, 400.0, 0.0, [1.0]),
    ]
    assert run.concentrations(400.0)[0, 0] == pytest.approx(math.exp(-J * 300), rel=2e-8)


def test_light_heats_by_what_the_bonds_do_not_take() -> None:
    """Adiabatic, rigid: every event gives N_A h nu - dU; Cp of all gases 30 J/mol/K.

    A -> B with dH = 100 kJ/mol under 254 nm (471 kJ/mol): after half has reacted T has risen by
    0.5 (471 - 100)/(30 - R) kJ/K with one mole and no other heat capacity.
    """
    Cp = [(200.0, 30.0), (2e4, 30.0)]
    kinds = [
        replace(
            molecule(name),
            thermochemistry=from_values(
                enthalpy_298=si(H),
                entropy_298=si(200.0),
                heat_capacity=Cp,
            ),
        )
        for name, H in (("O3", 0.0), ("O2", 1.0e5 / 1.5))
    ]
    photon = N_A * h * c / 254e-9
    made = experiment(
        [step("O3 -> 1.5 O2", Photolysis(si(1e-2)), photon=si(photon))],
        {"O3": 0.01, "Ar": 1.0},
        gases=[
            *kinds,
            replace(kinds[0], name="Ar", formula=molecule("Ar").formula),
        ],
        temperature=Adiabatic(si(300.0)),
        until=math.log(2) / 1e-2,
    )
    run = integrate(made)
    moles = {"O3": 0.005, "O2": 0.0075, "Ar": 1.0}
    T = float(run.temperature(run.end)[0])
    # U = sum n (H - RT): before, plus the light taken in, is what it is after
    before = 0.01 * 0.0 + 1.01 * (30 * (300 - 298.15) - R * 300)
    energies = {"O3": 0.0, "O2": 1.0e5 / 1.5, "Ar": 0.0}
    after = sum(n * (energies[g] + 30 * (T - 298.15) - R * T) for g, n in moles.items())
    assert after == pytest.approx(before + 0.005 * photon, abs=1e-5 * photon * 0.005)


def thick(**options: Any) -> tuple[Photolysis, StepContext]:
    law = Photolysis(si(J), absorption=si(1.1e-21), path=si(0.1))
    where = alone(
        molecule("O3"), pressure=1e5, bath={"O3": 0.01, "Ar": 0.99}, temperatures=(300.0, 300.0)
    )
    return law, replace(where, **options)


def test_thick_gas_is_said() -> None:
    """sigma n L = 1.1e-21 m^2 * 2.41e23 m^-3 * 0.1 m = 26.6; with a thousandth of it, 0.027."""
    law, where = thick()
    assert law.absorbance(where) == pytest.approx(26.557, rel=1e-4)
    assert list(law.cautions(where)) == [
        "the gas is not optically thin: its O3 takes 100% of the light at the start, and the mean "
        "over the path is 4% of that at the window, so J is not the same everywhere and will rise "
        "as the gas goes."
    ]
    assert list(law.cautions(replace(where, bath={"O3": 1e-5, "Ar": 1.0}))) == []
    assert list(lamp().cautions(where)) == []


def found(law: Photolysis | Source, where: StepContext) -> list[str]:
    return [str(problem) for problem in law.problems(where)]


def test_impossible_lamps_are_refused_in_words() -> None:
    _, where = thick()
    assert found(lamp((10.0, 20.0)), where) == [
        "on: found on at 10 s and on at 20 s; expected a lamp that is switched on and off in turn"
    ]
    assert found(replace(lamp(), path=si(0.1)), where) == [
        "absorption: found path without absorption; expected both, or neither"
    ]
    assert found(lamp(), replace(where, reactants=where.reactants * 2, order=2.0)) == [
        "reaction: found O3 + O3 on the left; expected one molecule that takes in the light, to "
        "first order"
    ]


def test_a_source_fills_at_its_rate() -> None:
    """dc/dt = rate, and with first-order loss c = rate/k (1 - exp(-kt))."""
    k, rate = 0.01, 3e-4
    steps = [step("-> X", Source(si(rate))), step("X -> Y", k)]
    run = integrate(experiment(steps, {"Ar": 1.0}, until=150.0))
    expected = rate / k * (1 - math.exp(-k * 150.0))
    assert run.concentrations(150.0)[run.index("X"), 0] == pytest.approx(expected, rel=1e-7)


def test_a_source_has_nothing_on_the_left() -> None:
    where = StepContext((), 1.0, reactants=(Gas.label("A"),), has_bath=True)
    assert found(Source(si(1.0)), where) == [
        'reaction: found A + M on the left; expected nothing: a source is "-> X"'
    ]


def test_switch_times_are_those_after_the_start() -> None:
    law = lamp((0.0, 5.0), (3.0,))
    assert law.switch_times() == (3.0, 5.0)
    assert [law.is_on(t) for t in (0.0, 2.9, 3.0, 4.9, 5.0)] == [True, True, False, False, True]
    assert np.all([lamp((), (3.0,)).is_on(0.0), not lamp((3.0,)).is_on(0.0)])
