"""Moles, volumes and pressures at time zero, and the shape of the vessel, by hand.

R = 8.314462618 J/mol/K and N_A = 6.02214076e23 1/mol (CODATA 2018). What is asserted to 1e-12 is
limited by rounding alone; to 1e-9, by the digits of R.
"""

from __future__ import annotations

import dataclasses
import math

import pytest
from laboratory import experiment, si, step

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.plan import RunPlan, Solver
from meanfree.experiment.vessel import DeadSpace, Shape, Vessel

R = 8.314462618


def bulb(**options) -> Vessel:
    return Vessel("volume", si(2e-3), **options)


def test_each_kind_of_amount_is_counted_as_it_says():
    fill = Fill(
        {
            "pressure": Portion(si(1e4), "pressure"),
            "amount": Portion(si(0.02), "amount"),
            "concentration": Portion(si(3.0), "concentration"),
            "density": Portion(si(6.02214076e24), "number density"),
        }
    )
    moles = fill.moles(bulb(), 400.0)
    assert moles["pressure"] == pytest.approx(1e4 * 2e-3 / (R * 400.0), rel=1e-9)
    assert moles["amount"] == 0.02
    assert moles["concentration"] == pytest.approx(6e-3, rel=1e-12)  # 3 mol/m3 in 2 L
    assert moles["density"] == pytest.approx(0.02, rel=1e-12)  # 10 mol/m3 in 2 L
    assert fill.names == ("pressure", "amount", "concentration", "density")
    total = sum(moles.values())
    assert fill.pressure(bulb(), 400.0) == pytest.approx(total * R * 400.0 / 2e-3, rel=1e-9)


def test_pressures_are_read_at_the_filling_temperature():
    fill = Fill({"A": Portion(si(1e4), "pressure")}, at=si(250.0))
    assert fill.moles(bulb(), 500.0)["A"] == pytest.approx(1e4 * 2e-3 / (R * 250.0), rel=1e-9)
    assert fill.temperature(500.0) == 250.0
    assert Fill({}).temperature(500.0) == 500.0
    assert fill.pressure(bulb(), 500.0) == pytest.approx(1e4, rel=1e-12)


def test_fractions_of_a_total_and_what_makes_it_up():
    gases = {"A": Portion(si(0.2), "fraction"), "B": Portion(si(1e3), "pressure")}
    fill = Fill(gases, total=Portion(si(8e3), "pressure"), balance="Ar")
    assert fill.names == ("A", "B", "Ar")
    per_pascal = 2e-3 / (R * 300.0)
    assert fill.moles(bulb(), 300.0) == pytest.approx(
        {"A": 1.6e3 * per_pascal, "B": 1e3 * per_pascal, "Ar": 5.4e3 * per_pascal}, rel=1e-9
    )
    plain = Fill({"A": Portion(si(1.0), "fraction")}, total=Portion(si(0.5), "amount"))
    assert plain.moles(bulb(), 300.0) == {"A": 0.5}
    assert plain.names == ("A",)


def test_dead_space_takes_its_share_at_the_common_pressure():
    """n = p (V/RT + V_d/RT_d): 2 L at 600 K and 0.5 L at 300 K hold as much as 5 L at 900 K."""
    vessel = bulb(dead_space=DeadSpace(si(5e-4), si(300.0)))
    fill = Fill({"A": Portion(si(1e4), "pressure")})
    assert fill.moles(vessel, 600.0)["A"] == pytest.approx(1e4 / R * (2 / 600 + 0.5 / 300) * 1e-3)
    case = experiment([], {"A": 1e4}, kind="pressure", T=600.0, volume=2e-3, dead=(5e-4, 300.0))
    assert case.dead_capacity == pytest.approx(5e-4 / 300.0, rel=1e-12)
    assert case.initial_pressure == pytest.approx(1e4, rel=1e-12)
    assert experiment([], {"A": 1.0}).dead_capacity == 0.0


def test_a_rigid_vessel_brought_to_another_temperature_keeps_its_gas():
    """Gay-Lussac: filled at 300 K and heated to 450 K, the pressure is half as much again."""
    case = experiment([], {"A": 2e4, "B": 1e4}, kind="pressure", T=450.0, fill_at=300.0)
    assert case.initial_pressure == pytest.approx(4.5e4, rel=1e-12)
    assert case.initial_volume == 1e-3
    assert case.mole_fractions == pytest.approx({"A": 2 / 3, "B": 1 / 3}, rel=1e-12)


def test_a_piston_expands_and_keeps_its_pressure():
    """Charles: V(0) = V_fill T(0)/T_fill, and by p_fill/p where another pressure is held."""
    case = experiment([], {"A": 3e4}, kind="pressure", holds="pressure", T=450.0, fill_at=300.0)
    assert case.held_pressure == pytest.approx(3e4, rel=1e-12)
    assert case.initial_pressure == pytest.approx(3e4, rel=1e-12)
    assert case.initial_volume == pytest.approx(1.5e-3, rel=1e-12)
    held = experiment(
        [], {"A": 3e4}, kind="pressure", holds="pressure", T=450.0, fill_at=300.0, pressure=1e4
    )
    assert held.held_pressure == 1e4
    assert held.initial_volume == pytest.approx(4.5e-3, rel=1e-12)


def test_a_piston_with_dead_space_shares_out_its_moles():
    case = experiment(
        [],
        {"A": 3e4},
        kind="pressure",
        holds="pressure",
        T=450.0,
        fill_at=300.0,
        dead=(2e-4, 290.0),
    )
    n = 3e4 / R * (1e-3 / 300 + 2e-4 / 290)
    in_dead_space = 3e4 * 2e-4 / (R * 290)
    assert case.moles["A"] == pytest.approx(n, rel=1e-9)
    expected = (n - in_dead_space) * R * 450 / 3e4
    assert case.initial_volume == pytest.approx(expected, rel=1e-9)
    assert case.initial_volume == pytest.approx(1.5e-3, rel=1e-9)


def test_an_empty_vessel_has_no_mole_fractions():
    case = experiment([step("A -> B", 1.0)], {})
    assert case.mole_fractions == {}
    assert case.moles == {"A": 0.0, "B": 0.0}
    assert case.initial_pressure == 0.0


def test_the_watched_gas_is_the_one_that_runs_out_first():
    pair = step("A + 2 B -> C", 1.0)
    assert experiment([pair], {"A": 1.0, "B": 1.5}).watched == "B"
    assert experiment([pair], {"A": 1.0, "B": 2.5}).watched == "A"
    assert experiment([pair], {"A": 1.0, "B": 1.5}, watch="C").watched == "C"
    # a catalyst is not used up, and what is not filled cannot run out
    assert experiment([step("A + E -> B + E", 1.0)], {"A": 5.0, "E": 1.0}).watched == "A"
    assert experiment([step("A + B -> C", 1.0)], {"A": 5.0}).watched == "A"
    assert experiment([step("A -> B", 1.0)], {"B": 5.0}).watched is None


def test_what_a_plan_leaves_open():
    """The README's defaults: Radau, rtol 1e-8, atol 1e-20 of the initial concentration."""
    assert RunPlan().solver == Solver("Radau", 1e-8, 1e-20)
    assert experiment([], {}).plan.until is None
    assert Experiment("t", (), (), bulb(), experiment([], {}).temperature, Fill({})).notes == ()


@pytest.mark.parametrize("given", [True, False])
def test_a_sphere(given):
    """Archimedes: V = pi d^3/6, S = pi d^2; S/V = 6/d."""
    d = 0.15
    shape = Shape("sphere", diameter=si(d) if given else None)
    vessel = Vessel("volume", si(math.pi * d**3 / 6), shape=shape)
    assert shape.area(vessel.volume.value) == pytest.approx(math.pi * d**2, rel=1e-12)
    assert vessel.surface_to_volume == pytest.approx(6 / d, rel=1e-12)
    inside = vessel.interior
    assert inside is not None
    assert (inside.form, inside.length) == ("sphere", None)
    assert inside.radius == pytest.approx(0.075, rel=1e-12)


@pytest.mark.parametrize("given", [True, False])
def test_a_cylinder(given):
    """V = pi r^2 L, S = 2 pi r L + 2 pi r^2; S/V = 2/r + 2/L."""
    r, length = 0.02, 0.3
    shape = Shape("cylinder", diameter=si(2 * r) if given else None, length=si(length))
    vessel = Vessel("volume", si(math.pi * r**2 * length), shape=shape)
    assert vessel.surface_to_volume == pytest.approx(2 / r + 2 / length, rel=1e-12)
    inside = vessel.interior
    assert inside is not None
    assert (inside.form, inside.length) == ("cylinder", length)
    assert inside.radius == pytest.approx(r, rel=1e-12)


def test_only_a_surface_or_nothing_is_stated():
    stated = bulb(shape=Shape("stated", surface=si(0.5)))
    assert stated.surface_to_volume == pytest.approx(250.0, rel=1e-12)
    assert stated.interior is None
    assert bulb().surface_to_volume is None
    assert bulb().interior is None
    assert bulb().is_rigid
    assert not dataclasses.replace(bulb(), holds="pressure").is_rigid
    assert bulb().filling_volume == 2e-3
