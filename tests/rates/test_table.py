"""The table of k: an Arrhenius law comes back, and the ends are where the table ends."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from encounters import meeting, molecule
from laboratory import experiment, si, step

from meanfree.errors import ComputationError
from meanfree.experiment.inputs import with_inputs
from meanfree.experiment.temperature import Adiabatic
from meanfree.gases.thermochemistry import from_values
from meanfree.integrate.single import integrate
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.law import StepContext
from meanfree.rates.table import Table, TablePoint
from meanfree.sourced import Sourced

ORDER_1 = "rate constant of order 1"
HI = molecule("HI")

# Bodenstein, Z. phys. Chem. 29, 295 (1899), 2 HI -> H2 + I2 as in textbooks (part from memory):
# k [L/mol/s] at T [K]
BODENSTEIN = {556: 3.52e-7, 629: 3.02e-5, 666: 2.19e-4, 700: 1.16e-3, 781: 3.95e-2}


def table(values: dict[float, float], extrapolate: bool = False) -> Table:
    points = tuple(TablePoint(si(float(T), "temperature"), si(k)) for T, k in values.items())
    return Table(points, extrapolate)


def context(low: float, high: float | None = None) -> StepContext:
    return meeting(HI, temperatures=(low, low if high is None else high))


def test_an_arrhenius_law_comes_back_everywhere() -> None:
    """exp and log of k: an ulp of ln k (about 20) in k, so 1e-13 is rounding."""
    law = Arrhenius(si(8.76e7), si(185.7e3))
    kelvins = (500.0, 510.0, 600.0, 800.0)
    points = {T: float(law.rate_constant(context(T), T)) for T in kelvins}
    T = np.linspace(450, 900, 91)
    ratio = table(points).rate_constant(context(500), T) / law.rate_constant(context(500), T)
    assert np.max(np.abs(ratio - 1)) < 1e-13


def test_the_points_are_met_and_between_them_the_line_is_straight_in_1_over_T() -> None:
    law = table({T: 1e-3 * k for T, k in BODENSTEIN.items()})
    for T, k in BODENSTEIN.items():
        assert law.rate_constant(context(T), float(T)) == pytest.approx(1e-3 * k, rel=1e-12)
    middle = 2 / (1 / 666 + 1 / 700)
    mean = 1e-3 * np.sqrt(BODENSTEIN[666] * BODENSTEIN[700])
    assert law.rate_constant(context(middle), middle) == pytest.approx(mean, rel=1e-12)


def test_a_run_outside_is_refused_save_a_few_kelvin_or_when_allowed() -> None:
    law = table({500.0: 1.0, 600.0: 2.0})
    assert [str(p) for p in law.problems(context(606.0))] == [
        "points: found a run at 606 K; expected a run within 500 to 600 K, or extrapolate = true"
    ]
    assert [str(p) for p in law.problems(context(480.0, 550.0))] == [
        "points: found a run at 480 to 550 K; expected a run within 500 to 600 K, "
        "or extrapolate = true"
    ]
    assert list(law.problems(context(604.0))) == []
    assert list(law.cautions(context(604.0))) == [
        "the table of k covers 500 to 600 K and the run 604 K: outside it the outer Arrhenius "
        "lines are continued."
    ]
    assert list(law.cautions(context(550.0))) == []
    assert list(table({500.0: 1.0, 600.0: 2.0}, True).problems(context(900.0))) == []


def test_impossible_tables_are_refused_in_words() -> None:
    assert [str(p) for p in table({500.0: 1.0}).problems(context(500.0))] == [
        "points: found 1 points; expected two or more points [T, k]"
    ]
    assert [str(p) for p in table({500.0: 1.0, 400.0: 0.0}).problems(context(450.0))][:2] == [
        "points.1: found 400 K after 500 K; expected temperatures in rising order, each once",
        "points.1: found k = 0; expected a rate constant above 0: ln k is what is interpolated",
    ]


def test_every_point_has_an_address() -> None:
    points = tuple(
        TablePoint(Sourced(T, "K", dimension="temperature"), Sourced(k, "1/s", dimension=ORDER_1))
        for T, k in {500.0: 1.0, 600.0: 2.0}.items()
    )
    run = experiment([step("A -> B", Table(points), name="d")], {"A": 1.0}, T=550.0)
    assert set(run.steps[0].law.inputs()) == {
        "points.0.T",
        "points.0.k",
        "points.1.T",
        "points.1.k",
    }
    changed = with_inputs(run, {"steps.d.points.1.k": 3.0})
    assert changed.steps[0].law.points[1].k.value == 3.0  # type: ignore[attr-defined]
    assert run.steps[0].law.points[1].k.value == 2.0  # type: ignore[attr-defined]


def test_an_adiabatic_run_that_leaves_the_table_is_an_error() -> None:
    """Its temperature is known only afterwards: 480 K and 30 kJ/mol of heat, Cp 40 J/mol/K."""
    energies = from_values(
        enthalpy_298=si(0.0), entropy_298=si(200.0), heat_capacity=[(200.0, 40.0), (3e3, 40.0)]
    )
    gas = replace(molecule("HCN"), thermochemistry=energies)
    other = replace(molecule("HNC"), thermochemistry=energies)
    law = table({470.0: 1.0, 490.0: 2.0})
    made = experiment(
        [step("HCN -> HNC", law, name="d", heat=si(3e4))],
        {"HCN": 1.0},
        gases=[gas, other],
        temperature=Adiabatic(si(480.0)),
        until=10.0,
    )
    with pytest.raises(ComputationError) as refused:
        integrate(made)
    assert str(refused.value).startswith("steps.d: the table of k covers 470 to 490 K and the run ")
    allowed = replace(law, extrapolate=True)
    run = integrate(replace(made, steps=(replace(made.steps[0], law=allowed),)))
    assert run.beyond[0].startswith("steps.d: the table of k covers 470 to 490 K and the run 480 ")
