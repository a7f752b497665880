"""Where a vessel comes to rest, by hand for one step, and when that cannot be said."""

from __future__ import annotations

import dataclasses
import math

import pytest
from laboratory import experiment, si, step

from meanfree.errors import ComputationError
from meanfree.experiment.equilibrium import equilibrium, ln_K, why_none
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.experiment.temperature import Adiabatic, Exchange, Program
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.identity import find_gas

R = 8.314462618


def kc(value: float, T: float = 300.0, enthalpy: float | None = None) -> GivenEquilibrium:
    heat = None if enthalpy is None else si(enthalpy)
    return GivenEquilibrium("Kc", si(value), si(T), heat)


def gas(name):
    found = find_gas(name)
    return dataclasses.replace(found, thermochemistry=thermochemistry_of(found))


def ratio_at_the_end(mode, dead=None) -> float:
    """c_B/c_A of A = B with Kc = 2 at 300 K and 20 kJ/mol."""
    case = experiment(
        [step("A -> B", 1.0, reverse=kc(2.0, 300.0, 20e3))], {"A": 5.0}, temperature=mode, dead=dead
    )
    rest = equilibrium(case)
    assert rest is not None
    assert rest.moles["A"] + rest.moles["B"] == pytest.approx(case.moles["A"], rel=1e-12)
    return rest.moles["B"] / rest.moles["A"]


def at(T: float) -> float:
    """Van 't Hoff."""
    return 2.0 * math.exp(-20e3 / R * (1 / T - 1 / 300.0))


def test_which_temperature_a_vessel_ends_at():
    """A program at its last point, exchanged heat at the surroundings."""
    ramp = Program(((si(0.0), si(300.0)), (si(9.0), si(350.0)), (si(20.0), si(420.0))))
    assert ratio_at_the_end(ramp) == pytest.approx(at(420.0), rel=1e-9)
    heated = Exchange(si(300.0), si(390.0), si(1.0))
    assert ratio_at_the_end(heated) == pytest.approx(at(390.0), rel=1e-9)


@pytest.mark.parametrize("start", ["A", "B"])
@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_dissociation_from_either_side_by_the_quadratic(start, holds):
    """A = 2 B, Kc = 8: x^2/(n - x/2) in the volume there is, solved by the quadratic formula."""
    fill = {"A": 3.0} if start == "A" else {"B": 6.0}
    case = experiment([step("A -> 2 B", 1.0, reverse=kc(8.0))], fill, holds=holds)
    rest = equilibrium(case)
    assert rest is not None
    n = 3.0 * 1e-3  # mol of A if all were A
    if holds == "volume":
        # (2 e)^2/V = K (n - e)
        e = (-8 * 1e-3 + math.sqrt((8 * 1e-3) ** 2 + 16 * 8 * 1e-3 * n)) / 8
        volume = 1e-3
    else:
        # (2 e)^2/(n - e) = K V, V = (n + e)/c with the total concentration c held
        c = 3.0 if start == "A" else 6.0
        e = n * math.sqrt(8 / c / (4 + 8 / c))
        volume = (n + e) / c
    assert rest.moles["B"] == pytest.approx(2 * e, rel=1e-9)
    assert rest.moles["A"] == pytest.approx(n - e, rel=1e-9)
    assert rest.volume == pytest.approx(volume, rel=1e-9)
    assert rest.pressure == pytest.approx((n + e) * R * 300.0 / volume, rel=1e-9)
    assert rest.temperature == 300.0


def test_gases_made_on_the_way_count_and_those_never_made_do_not():
    """A = B = C in a chain; D = E needs a gas that is never there; and X = A is run backwards."""
    steps = [
        step("A -> B", 1.0, reverse=kc(2.0)),
        step("B -> C", 1.0, reverse=kc(3.0)),
        step("D -> E", 1.0, reverse=kc(5.0)),
        step("X -> A", 1.0, reverse=kc(0.25)),
    ]
    rest = equilibrium(experiment(steps, {"A": 1.0, "Ar": 2.0}))
    assert rest is not None
    # A : B : C : X = 1 : 2 : 6 : 4
    expected = {"A": 1 / 13, "B": 2 / 13, "C": 6 / 13, "X": 4 / 13, "D": 0.0, "E": 0.0, "Ar": 2.0}
    assert rest.moles == pytest.approx({g: n * 1e-3 for g, n in expected.items()}, rel=1e-9)


def test_a_one_way_step_that_can_never_run_does_not_matter():
    steps = [step("A -> B", 1.0, reverse=kc(1.0)), step("D -> E", 1.0)]
    rest = equilibrium(experiment(steps, {"A": 1.0}))
    assert rest is not None
    assert rest.moles["B"] == pytest.approx(0.5e-3, rel=1e-9)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize(("fill", "rises"), [("NO2", True), ("N2O4", False)])
def test_an_adiabatic_vessel_warms_or_cools(fill, rises, holds):
    """Dissociation takes heat and association gives it; the energy balance is done by hand.

    In argon, at 330 K: internal energy in a rigid vessel, enthalpy in a piston, and K from the
    Gibbs energies.
    """
    gases = [gas(name) for name in ("N2O4", "NO2", "Ar")]
    dissociation = step("N2O4 -> 2 NO2", 1e3, reverse="thermochemistry")
    case = experiment(
        [dissociation],
        {fill: 10.0, "Ar": 30.0},
        temperature=Adiabatic(si(330.0)),
        gases=gases,
        holds=holds,
    )
    rest = equilibrium(case)
    assert rest is not None
    T = rest.temperature
    assert (T > 330.0) is rises
    assert abs(T - 330.0) > 1.0

    def energy(moles, T):
        less = R * T if holds == "volume" else 0.0
        return sum(moles[g.name] * (float(g.thermochemistry.enthalpy(T)) - less) for g in gases)

    # energies of 1e3 J cancel; the root is good to 1e-10 K times 1 J/K
    assert energy(rest.moles, T) == pytest.approx(energy(case.moles, 330.0), abs=1e-6)
    gibbs = {g.name: float(g.thermochemistry.gibbs(T)) for g in gases}
    Kp = math.exp(-(2 * gibbs["NO2"] - gibbs["N2O4"]) / (R * T))
    p = {name: n * R * T / rest.volume / 1e5 for name, n in rest.moles.items()}  # bar
    assert p["NO2"] ** 2 / p["N2O4"] == pytest.approx(Kp, rel=1e-7)


def test_an_end_beyond_the_known_energies_is_an_error():
    """33 kJ/mol to some 130 J/mol/K: from 1400 K well past 1510, where cyclopropane's end."""
    gases = [gas(name) for name in ("c-C3H6", "propene")]
    case = experiment(
        [step("c-C3H6 -> propene", 1.0, reverse="thermochemistry")],
        {"c-C3H6": 10.0},
        temperature=Adiabatic(si(1400.0)),
        gases=gases,
    )
    with pytest.raises(ComputationError) as caught:
        equilibrium(case)
    assert str(caught.value) == (
        "the adiabatic end temperature lies outside 40 to 1510 K, the range of the gases' "
        "thermochemistry"
    )


def test_constants_that_cannot_be_worked_out():
    with pytest.raises(ValueError, match=r"^step s has no reverse$"):
        ln_K(step("A -> B", 1.0, "s"), {}, 300.0)
    case = experiment([step("A -> B", 1.0, "s", reverse="thermochemistry")], {"A": 1.0})
    with pytest.raises(ValueError, match=r"^A has no thermochemistry$"):
        ln_K(case.steps[0], case.gas_named, 300.0)
    # without an enthalpy a constant stays what it is
    assert ln_K(step("A -> B", 1.0, reverse=kc(2.0)), {}, 500.0) == pytest.approx(math.log(2.0))


def test_stated_heats_leave_no_energy_to_balance():
    made = step("A -> B", 1.0, reverse=kc(2.0), heat=si(-5e3))
    hot = experiment([made], {"A": 1.0}, temperature=Adiabatic(si(300.0)))
    assert why_none(hot) == "a stated heat of reaction: no energies of the gases to balance"
    assert equilibrium(hot) is None
    assert why_none(experiment([made], {"A": 1.0})) == ""
