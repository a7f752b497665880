"""What follows from the text of a step: orders, net numbers, partners, k forward and back."""

from __future__ import annotations

import math

import pytest
from laboratory import experiment, si, step

from meanfree.experiment.flows import Flow, flow_steps
from meanfree.experiment.mechanism import Bath, GivenEquilibrium, Uncertainty
from meanfree.experiment.rate_constants import (
    activation_energy_at,
    bath_concentration,
    encounter,
    order_of,
    own_diameter,
    rate_constant,
)
from meanfree.experiment.temperature import (
    Adiabatic,
    Exchange,
    Isothermal,
    Program,
    has_energy_balance,
    is_constant,
    known_range,
)
from meanfree.gases.gas import Gas
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.collision import Collision
from meanfree.rates.falloff import Falloff
from meanfree.rates.limits import PowerLaw
from meanfree.rates.source import Source
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced

R = 8.314462618


def test_a_step_as_written():
    made = step("2 NO + O2 -> 2 NO2", 1.0)
    assert made.orders == {"NO": 2.0, "O2": 1.0}
    assert made.order == 3.0
    assert made.net == {"NO": -2.0, "O2": -1.0, "NO2": 2.0}
    assert made.change_of_moles == -1.0
    assert made.reverse_orders == {"NO2": 2.0}
    assert made.partners == ()
    assert made.reaction == "2 NO + O2 → 2 NO2"


def test_a_gas_on_both_sides_counts_in_the_order():
    made = step("H + H2 -> 3 H", 1.0)
    assert made.orders == {"H": 1.0, "H2": 1.0}
    assert made.net == {"H": 2.0, "H2": -1.0}
    assert made.reverse_orders == {"H": 3.0}
    assert made.partners == ("H", "H2")
    exchanged = step("A + E -> B + E", 1.0)
    assert exchanged.net == {"A": -1.0, "E": 0.0, "B": 1.0}
    assert exchanged.reverse_orders == {"E": 1.0, "B": 1.0}


def test_orders_of_its_own_are_no_encounter():
    made = step("2 A -> B", 1.0, stated_orders=(("A", 1.5),))
    assert made.order == 1.5
    assert made.partners == ()
    # a_i + nu_i: the reverse has half an order in A
    assert made.reverse_orders == {"A": -0.5, "B": 1.0}
    assert step("2 A -> B", 1.0).partners == ("A", "A")
    assert step("A -> B", 1.0).partners == ()


def test_the_step_as_text():
    given = GivenEquilibrium("Kc", si(1.0), si(300.0))
    assert step("A + M -> 1.5 B + M", 1.0).reaction == "A + M → 1.5 B + M"
    assert step("A -> B", 1.0, reverse=given).reaction == "A ⇌ B"
    assert step("-> B", 1.0).reaction == "→ B"


def test_a_bath_counts_each_gas_with_its_efficiency():
    """M = sum of the concentrations: 4 mol/m3 of A twice over, 6 of Ar at a half: 11."""
    bath = Bath({"A": 2.0}, others=0.5)
    made = step("A -> B", 1.0, bath=bath)
    assert bath_concentration(experiment([made], {"A": 4.0, "Ar": 6.0}), made) == pytest.approx(11)
    plain = step("A + M -> B + M", 1.0)
    assert bath_concentration(experiment([plain], {"A": 4.0, "Ar": 6.0}), plain) == pytest.approx(
        10
    )
    alone = step("A -> B", 1.0)
    assert bath_concentration(experiment([alone], {"A": 4.0}), alone) == 0.0
    assert Uncertainty(2.0).sigmas == 1.0


def test_a_bath_in_a_vessel_with_dead_space_is_at_the_common_pressure():
    """M is p/RT of the hot part, whatever the dead space holds."""
    made = step("A + M -> B + M", 1.0)
    case = experiment([made], {"A": 5e3}, kind="pressure", T=600.0, dead=(4e-4, 300.0))
    assert bath_concentration(case, made) == pytest.approx(5e3 / (R * 600.0), rel=1e-9)


def test_orders_of_k_count_a_bath_that_is_outside_the_law():
    assert order_of(step("A + M -> B + M", 1.0)) == 2.0
    assert order_of(step("A -> 2 B", 1.0)) == 1.0
    assert order_of(step("A -> 2 B", 1.0), back=True) == 2.0
    assert order_of(step("A + M -> 2 B + M", 1.0), back=True) == 3.0
    falloff = Falloff(PowerLaw(si(1.0)), PowerLaw(si(1.0)))
    assert order_of(step("A + M -> B + M", falloff)) == 1.0


def test_the_reverse_is_forward_over_the_equilibrium_constant():
    """A = 2 B with Kp = 3e4 Pa at 350 K, so Kc = Kp/RT, and k_rev = k_fwd/Kc."""
    given = GivenEquilibrium("Kp", si(3e4), si(350.0), si(50e3))
    made = step("A -> 2 B", Arrhenius(si(1e5), si(40e3)), reverse=given)
    case = experiment([made], {"A": 1.0})
    for T in (350.0, 420.0):
        k = 1e5 * math.exp(-40e3 / (R * T))
        Kc = 3e4 * math.exp(-50e3 / R * (1 / T - 1 / 350.0)) / (R * T)
        assert rate_constant(case, made)(T) == pytest.approx(k, rel=1e-8)
        assert rate_constant(case, made, back=True)(T) == pytest.approx(k / Kc, rel=1e-8)
    back = activation_energy_at(made, rate_constant(case, made, back=True), 350.0)
    # d ln(1/Kc)/d(1/T) adds -dH, and the RT of Kc = Kp/RT adds RT
    assert back == pytest.approx(40e3 - 50e3 + R * 350.0, rel=1e-8)
    assert activation_energy_at(made, rate_constant(case, made), 350.0) == pytest.approx(40e3)


def test_a_falloff_step_is_taken_at_its_own_pressure_and_bath():
    """Lindemann: k0 M kinf/(k0 M + kinf)."""
    made = step("A + M -> B + M", Falloff(PowerLaw(si(3.0)), PowerLaw(si(20.0))))
    case = experiment([made], {"A": 1.0, "Ar": 4.0})
    assert rate_constant(case, made)(300.0) == pytest.approx(15.0 * 20.0 / 35.0, rel=1e-12)


def test_no_activation_energy_where_k_does_not_say_how_it_changes():
    fixed = step("A -> B", 2.0)
    case = experiment([fixed], {"A": 1.0})
    assert activation_energy_at(fixed, rate_constant(case, fixed), 300.0) is None
    dead = step("A -> B", Arrhenius(si(0.0), si(40e3)))
    assert activation_energy_at(dead, rate_constant(case, dead), 300.0) is None


def test_who_meets_forwards_and_backwards():
    case = experiment([step("A + B -> 2 C", 1.0)], {"A": 1.0})

    def names(reaction, back):
        return tuple(gas.name for gas in encounter(case, step(reaction, 1.0), back))

    assert names("A + B -> 2 C", False) == ("A", "B")
    assert [gas.name for gas in encounter(case, case.steps[0])] == ["A", "B"]
    assert names("A + B -> 2 C", True) == ("C", "C")
    assert names("A -> B + C", False) == ()
    assert names("A -> B + C", True) == ("B", "C")
    assert names("A + B -> C", True) == ()
    halves = step("A -> 0.5 B + 1.5 C", 1.0)
    assert encounter(case, halves, back=True) == ()


def test_a_law_may_have_a_diameter_of_its_own():
    gases = [Gas.label(name) for name in "AB"]
    mass, size = Sourced(0.03), Sourced(4e-10)
    gases = [Gas(gas.name, molar_mass=mass, diameter=size) for gas in gases]
    made = step("2 A -> B", Collision(threshold=si(0.0), diameter=si(5e-10)))
    case = experiment([made], {"A": 1.0}, gases=gases)
    assert own_diameter(case, made) == 5e-10
    plain = step("2 A -> B", Collision(threshold=si(0.0)))
    assert own_diameter(case, plain) == pytest.approx(4e-10, rel=1e-12)
    assert own_diameter(case, step("2 A -> B", 1.0)) is None


def test_modes_of_temperature():
    ramp = Program(((si(0.0), si(300.0)), (si(60.0), si(450.0)), (si(90.0), si(400.0))))
    assert ramp.initial == 300.0
    assert ramp.breaks == (60.0, 90.0)
    assert known_range(ramp) == (300.0, 450.0)
    flat = Program(((si(0.0), si(300.0)), (si(60.0), si(300.0))))
    modes = [Isothermal(si(310.0)), Adiabatic(si(310.0)), Exchange(si(310.0), si(500.0), si(0.1))]
    assert [mode.initial for mode in modes] == [310.0] * 3
    assert [known_range(mode) for mode in modes] == [(310.0, 310.0)] * 3
    assert [is_constant(mode) for mode in (*modes, ramp, flat)] == [True, False, False, False, True]
    balanced = [has_energy_balance(mode) for mode in (*modes, ramp)]
    assert balanced == [False, True, True, False]
    assert experiment([], {}, temperature=ramp).constant_temperature is None
    assert experiment([], {}, T=345.0).constant_temperature == 345.0


def test_what_a_law_may_know_of_its_step():
    made = step("2 A + M -> B + M", 1.0)
    case = experiment([made], {"A": 1.0, "B": 3.0}, T=320.0)
    context = case.context(made)
    assert [gas.name for gas in context.partners] == ["A", "A"]
    assert [gas.name for gas in context.reactants] == ["A", "A"]
    assert (context.order, context.temperature, context.temperatures) == (2.0, 320.0, (320.0,) * 2)
    assert context.pressure == pytest.approx(4.0 * R * 320.0, rel=1e-9)
    assert context.bath == pytest.approx({"A": 0.25, "B": 0.75})
    assert context.surroundings is case.vessel
    assert context.gases == case.gas_named
    assert context.has_bath
    assert not case.context(step("A -> B", 1.0)).has_bath
    # 1.5 A is two molecules begun
    lumped = step("1.5 A -> B", 1.0, stated_orders=(("A", 1.0),))
    assert len(case.context(lumped).reactants) == 2


def test_flows_become_steps():
    gases = (Gas.label("A"), Gas.label("B"))
    pump = Flow("pumping", rate=si(0.1), source="s")
    dilution = Flow("dilution", rate=si(0.2), entering={"A": si(3.0), "Ar": si(1.0)})
    leak = Flow("leak-up", rise=si(5.0), entering={"Ar": si(2.0)}, source="blank")
    hole = Flow("effusion", hole=si(1e-8))
    made = flow_steps((pump, dilution, leak, hole), gases, 400.0)
    assert [one.name for one in made] == [
        "pumping 1 of A",
        "pumping 1 of B",
        "dilution 2 of A",
        "dilution 2 of B",
        "dilution 2",
        "leak-up 3",
        "effusion 4 of A",
        "effusion 4 of B",
    ]
    assert made[0].reactants == (("A", 1.0),)
    assert made[0].products == ()
    assert [one.law.numbers(None) for one in made[:5]] == [(0.1,)] * 2 + [(0.2,)] * 3
    # what enters takes the place of all that leaves: k times the sum of concentrations, as M
    assert (made[4].reactants, made[4].bath) == ((), Bath())
    assert made[4].products == (("A", 0.75), ("Ar", 0.25))
    # dp/dt = rise: dc/dt = rise/RT
    assert isinstance(made[5].law, Source)
    assert made[5].law.numbers(None)[0] == pytest.approx(5.0 / (R * 400.0), rel=1e-9)
    assert made[5].products == (("Ar", 1.0),)
    assert [made[5].source, made[0].source] == ["blank", "s"]
    law = made[6].law
    assert isinstance(law, Wall)
    assert (law.uptake.value, law.form, law.area) == (1.0, "uptake only", si(1e-8))
    case = experiment([], {"A": 1.0}, T=400.0)
    assert case.flow_steps == ()
