"""One address for every number: what stands there, in which unit and bounds, and other numbers."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from laboratory import experiment, si, step

from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.flows import Flow
from meanfree.experiment.inputs import inputs, with_inputs
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.experiment.plan import RunPlan
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Exchange, Program
from meanfree.experiment.vessel import DeadSpace, Shape, Vessel
from meanfree.gases.gas import Gas
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.capture import Capture
from meanfree.rates.table import Table, TablePoint
from meanfree.sourced import Sourced


def torr(value: float) -> Sourced:
    return Sourced(value * 101325 / 760, "torr", "gauge", "pressure")


def metre(value: float) -> Sourced:
    return Sourced(value, "m", "", "length")


def second(value: float) -> Sourced:
    return Sourced(value, "s", "", "time")


def kelvin(value: float) -> Sourced:
    return Sourced(value, "K", "thermometer", "temperature")


def everything() -> Experiment:
    """An experiment with a number in every place that has an address."""
    given = GivenEquilibrium(
        "Kp", si(2.0), kelvin(300.0), Sourced(1e3, "kJ/mol", "", "molar energy")
    )
    steps = (
        replace(
            step(
                "2 A -> B",
                Arrhenius(si(5.0), Sourced(8e4, "kJ/mol", "paper", "molar energy")),
                "one",
            ),
            reverse=given,
            heat=Sourced(-2e3, "kJ/mol", "", "molar energy"),
        ),
        replace(
            step(
                "A -> B",
                Table((TablePoint(kelvin(300.0), si(1.0)), TablePoint(kelvin(400.0), si(2.0)))),
                "two",
            ),
            photon=Sourced(5e5, "kJ/mol", "", "molar energy"),
        ),
    )
    size = Sourced(4e-10, "angstrom", "book")
    gases = (
        Gas("A", diameter=size, polarisability=si(2e-30)),
        Gas("B", dipole=si(3e-30), ionisation_energy=si(9e5)),
    )
    shape = Shape("cylinder", diameter=metre(0.1), length=metre(0.2), surface=si(0.3))
    vessel = Vessel(
        "pressure",
        Sourced(1e-3, "L", "", "volume"),
        torr(100.0),
        torr(900.0),
        shape,
        DeadSpace(Sourced(2e-5, "mL", "", "volume"), kelvin(295.0)),
        torr(0.5),
    )  # fmt: skip
    portions = {
        "A": Portion(torr(60.0), "pressure"),
        "B": Portion(Sourced(0.25, "", "", "fraction"), "fraction"),
    }
    celsius = Sourced(300.0, "degC", "", "temperature")
    return Experiment(
        "all",
        gases,
        steps,
        vessel,
        Exchange(kelvin(400.0), kelvin(420.0), si(0.2), si(3.0)),
        Fill(portions, Portion(torr(100.0), "pressure"), at=celsius),
        RunPlan(Sourced(120.0, "min", "", "time")),
        samples=(Sample(second(9.0), fraction=si(0.1)), Sample(second(19.0), volume=si(1e-5))),
        flows=(
            Flow("effusion", hole=si(1e-9)),
            Flow("leak-up", rise=si(7.0)),
            Flow("pumping", rate=si(8.0)),
        ),
    )  # fmt: skip


SI = {
    "vessel.volume": 1e-3,
    "vessel.pressure": 101325 / 7.6,
    "vessel.rated_pressure": 900 * 101325 / 760,
    "vessel.gauge_resolution": 0.5 * 101325 / 760,
    "vessel.shape.diameter": 0.1,
    "vessel.shape.length": 0.2,
    "vessel.shape.surface": 0.3,
    "vessel.dead_space.volume": 2e-5,
    "vessel.dead_space.temperature": 295.0,
    "temperature.value": 400.0,
    "temperature.surroundings": 420.0,
    "temperature.conductance": 0.2,
    "temperature.wall_heat_capacity": 3.0,
    "fill.gases.A": 60 * 101325 / 760,
    "fill.gases.B": 0.25,
    "fill.total": 101325 / 7.6,
    "fill.at": 300.0,
    "run.until": 120.0,
    "flows.0.hole": 1e-9,
    "flows.0.transmission": 1.0,
    "flows.1.transmission": 1.0,
    "flows.1.rise": 7.0,
    "flows.2.transmission": 1.0,
    "flows.2.rate": 8.0,
    "samples.0.at": 9.0,
    "samples.0.fraction": 0.1,
    "samples.1.at": 19.0,
    "samples.1.volume": 1e-5,
    "gases.A.diameter": 4e-10,
    "gases.A.polarisability": 2e-30,
    "gases.B.ionisation_energy": 9e5,
    "gases.B.dipole": 3e-30,
    "steps.one.A": 5.0,
    "steps.one.Ea": 8e4,
    "steps.one.n": 0.0,
    "steps.one.T_ref": 1.0,
    "steps.one.heat": -2e3,
    "steps.one.reverse.Kp": 2.0,
    "steps.one.reverse.at": 300.0,
    "steps.one.reverse.enthalpy": 1e3,
    "steps.two.points.0.T": 300.0,
    "steps.two.points.0.k": 1.0,
    "steps.two.points.1.T": 400.0,
    "steps.two.points.1.k": 2.0,
    "steps.two.photon": 5e5,
}


def test_every_number_has_an_address():
    found = inputs(everything())
    assert set(found) == set(SI)
    for address, one in found.items():
        assert one.address == address
        assert one.quantity.value == pytest.approx(SI[address], rel=1e-14), address


def test_values_are_in_the_unit_of_the_file():
    found = inputs(everything())
    shown = {
        "vessel.volume": (1.0, "L"),
        "vessel.dead_space.volume": (20.0, "mL"),
        "fill.gases.A": (60.0, "torr"),
        "fill.at": (26.85, "degC"),  # 300 K
        "run.until": (2.0, "min"),
        "gases.A.diameter": (4.0, "angstrom"),
        "steps.one.Ea": (80.0, "kJ/mol"),
    }
    for address, (value, unit) in shown.items():
        assert found[address].value == pytest.approx(value, rel=1e-12), address
        assert found[address].unit == unit
    assert found["steps.one.Ea"].source == "paper"


def test_bounds_are_what_is_physically_possible():
    found = inputs(everything())
    free = {address for address, one in found.items() if one.low == -math.inf}
    assert free == {
        "steps.one.Ea",
        "steps.one.n",
        "steps.one.heat",
        "steps.one.reverse.enthalpy",
        "steps.two.photon",
    }
    assert (found["fill.gases.B"].low, found["fill.gases.B"].high) == (0.0, 1.0)
    assert found["fill.at"].low == pytest.approx(-273.15, rel=1e-12)
    assert (found["vessel.volume"].low, found["vessel.volume"].high) == (0.0, math.inf)
    assert {address for address, one in found.items() if one.high != math.inf} == {"fill.gases.B"}


@pytest.mark.parametrize("address", list(SI))
def test_another_number_lands_at_its_address_and_nowhere_else(address):
    case = everything()
    before = inputs(case)
    new = 0.5 if before[address].high == 1.0 else 2.0 * abs(before[address].value) + 1.0
    after = inputs(with_inputs(case, {address: new}))
    assert set(after) == set(before)
    # the number passes through SI and back, with one rounding each way
    assert after[address].value == pytest.approx(new, rel=1e-14)
    assert (after[address].unit, after[address].source) == (
        before[address].unit,
        before[address].source,
    )
    rest = {key: one for key, one in before.items() if key != address}
    assert {key: one for key, one in after.items() if key != address} == rest
    assert inputs(case) == before


def test_several_at_once():
    case = with_inputs(everything(), {"steps.two.points.1.k": 9.0, "gases.A.diameter": 5.0})
    assert case.gases[0].diameter == replace(everything().gases[0].diameter, value=5e-10)
    law = case.steps[1].law
    assert isinstance(law, Table)
    assert [point.k.value for point in law.points] == [1.0, 9.0]


def test_numbers_counted_by_loss_keep_their_count():
    """k quoted as loss of A of 2 A -> B is twice that per event: 6 quoted, 3 inside."""
    k = Sourced(3.0, per=2.0)
    law = Arrhenius(k, Sourced(0.0, "J/mol", "", "molar energy"))
    case = replace(everything(), steps=(step("2 A -> B", law, "s"),))
    assert inputs(case)["steps.s.A"].value == pytest.approx(6.0, rel=1e-12)
    changed = with_inputs(case, {"steps.s.A": 10.0}).steps[0].law
    assert isinstance(changed, Arrhenius)
    assert changed.A.value == pytest.approx(5.0, rel=1e-12)


def test_points_of_a_program():
    ramp = Program(((second(0.0), kelvin(300.0)), (second(60.0), kelvin(400.0))))
    case = replace(everything(), temperature=ramp)
    found = {key: one.value for key, one in inputs(case).items() if key.startswith("temperature")}
    assert found == {
        "temperature.points.0.time": 0.0,
        "temperature.points.0.temperature": 300.0,
        "temperature.points.1.time": 60.0,
        "temperature.points.1.temperature": 400.0,
    }
    changed = with_inputs(case, {"temperature.points.1.temperature": 450.0}).temperature
    assert isinstance(changed, Program)
    assert [T.value for _, T in changed.points] == [300.0, 450.0]
    later = with_inputs(case, {"temperature.points.1.time": 90.0}).temperature
    assert isinstance(later, Program)
    assert [(t.value, T.value) for t, T in later.points] == [(0.0, 300.0), (90.0, 400.0)]


def test_numbers_by_gas_in_a_law():
    law = Capture("dispersion", polarisability={"A": si(2e-30), "B": si(3e-30)})
    case = experiment([step("A + B -> C", law, "s")], {"A": 1.0})
    changed = with_inputs(case, {"steps.s.polarisability.B": 5e-30}).steps[0].law
    assert isinstance(changed, Capture)
    assert {gas: a.value for gas, a in changed.polarisability.items()} == {"A": 2e-30, "B": 5e-30}


@pytest.mark.parametrize(
    ("address", "value", "expected"),
    [
        ("vessel.volume", 0.0, "found 0 L; expected a number above 0"),
        ("temperature.value", -1.0, "found -1 K; expected a number above 0"),
        ("fill.at", -273.15, "found -273.15 degC; expected a number above -273.15"),
        ("fill.gases.A", -1.0, "found -1 torr; expected a number above 0"),
        ("fill.gases.B", 1.5, "found 1.5; expected a number at least 0, at most 1"),
        ("steps.one.A", -2.0, "found -2; expected a number at least 0"),
        ("vessel.shape.length", 0.0, "found 0 m; expected a number above 0"),
    ],
)
def test_impossible_numbers_are_refused(address, value, expected):
    with pytest.raises(InputError) as caught:
        with_inputs(everything(), {address: value})
    (problem,) = caught.value.problems
    assert problem.key == address
    assert f"found {problem.found}; expected {problem.expected}" == expected


def test_what_is_possible_is_taken():
    """No gas at all may be filled, a rate constant may be 0, a heat may be negative."""
    values = {"fill.gases.A": 0.0, "fill.gases.B": 1.0, "steps.one.A": 0.0, "steps.one.heat": -9.0}
    changed = inputs(with_inputs(everything(), values))
    assert {address: changed[address].value for address in values} == pytest.approx(values)


def test_all_problems_come_in_one_go_with_what_is_near():
    wrong = {"steps.one.Ae": 1.0, "vessel.volume": -1.0, "nothing at all": 2.0}
    with pytest.raises(InputError) as caught:
        with_inputs(everything(), wrong)
    first, second, third = caught.value.problems
    assert (first.key, first.found) == ("steps.one.Ae", "an unknown address")
    assert first.expected.startswith("one of steps.one.")
    assert len(first.expected.split(", ")) == 3
    assert second.key == "vessel.volume"
    # nothing like it: all are named
    assert third.expected == "one of " + ", ".join(inputs(everything()))
