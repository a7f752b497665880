"""Where a run is broken, what holds in each stretch, and closed forms beside a dead space."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from laboratory import experiment, si, step

from meanfree.equations.build import build_system
from meanfree.equations.closed_forms import recognise
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Program
from meanfree.integrate.single import integrate
from meanfree.rates.photolysis import Photolysis

RAMP = Program(((si(10.0), si(300.0)), (si(20.0), si(400.0)), (si(40.0), si(360.0))))


def lamp(on, off):
    return Photolysis(si(0.1), tuple(map(si, on)), tuple(map(si, off)))


def test_breaks_of_a_program_a_lamp_and_samples():
    """Straight lines by hand: 10 K/s from 10 to 20 s, then -2 K/s to 40 s, then 360 K."""
    steps = [step("A -> B", lamp((5.0, 30.0), (15.0,))), step("B -> C", 0.1)]
    case = dataclasses.replace(
        experiment(steps, {"A": 1.0}, temperature=RAMP),
        samples=(Sample(si(12.0), fraction=si(0.2)), Sample(si(20.0), fraction=si(0.5))),
    )
    # before its first point a program is not defined; the loader starts it at zero
    case = dataclasses.replace(case, temperature=Program(((si(0.0), si(300.0)), *RAMP.points)))
    found = build_system(case).segments
    assert [s.start for s in found] == [0.0, 5.0, 10.0, 12.0, 15.0, 20.0, 30.0, 40.0]
    assert [s.end for s in found] == [5.0, 10.0, 12.0, 15.0, 20.0, 30.0, 40.0, math.inf]
    temperatures = [300.0, 300.0, 300.0, 320.0, 350.0, 400.0, 380.0, 360.0]
    assert [s.temperature for s in found] == pytest.approx(temperatures, rel=1e-15)
    assert [s.slope for s in found] == pytest.approx([0, 0, 10, 10, 10, -2, -2, 0], rel=1e-15)
    assert [s.retained for s in found] == pytest.approx([1, 1, 1, 0.8, 1, 0.5, 1, 1], rel=1e-15)
    lit = [0.0, 1.0, 1.0, 1.0, 0.0, 0.0, 1.0, 1.0]
    assert [s.switches.tolist() for s in found] == [[on, 1.0] for on in lit]


def test_nothing_to_break():
    (only,) = build_system(experiment([step("A -> B", 1.0)], {"A": 1.0}, T=345.0)).segments
    assert (only.start, only.end, only.temperature, only.slope) == (0.0, math.inf, 345.0, 0.0)
    assert (only.switches, only.retained, only.drawn) == (None, 1.0, 0.0)


@pytest.mark.parametrize("dead", [None, (5e-4, 250.0)])
def test_a_volume_drawn_is_a_share_of_what_the_vessel_holds(dead):
    """v c of (V + V_d T/T_d) c: 0.1 L of 1 L, or of 1 + 0.5 * 300/250 = 1.6 L."""
    case = experiment([step("A -> B", 1.0)], {"A": 1.0}, dead=dead)
    case = dataclasses.replace(case, samples=(Sample(si(2.0), volume=si(1e-4)),))
    _, after = build_system(case).segments
    assert after.retained == pytest.approx(0.9 if dead is None else 1 - 0.1 / 1.6, rel=1e-12)
    assert after.drawn == 0.0
    piston = dataclasses.replace(case, vessel=dataclasses.replace(case.vessel, holds="pressure"))
    _, after = build_system(piston).segments
    assert (after.retained, after.drawn) == (1.0, pytest.approx(0.1, rel=1e-12))


def kc(value):
    return GivenEquilibrium("Kc", si(value), si(300.0))


@pytest.mark.parametrize(
    ("steps", "fill"),
    [
        ([step("A -> B", 0.3)], {"A": 2.0}),
        ([step("2 A -> B", 0.3)], {"A": 2.0}),
        ([step("A + B -> C", 0.3)], {"A": 2.0, "B": 1.0}),
        ([step("A -> B", 0.3, stated_orders=(("A", 1.5),))], {"A": 2.0}),
        ([step("2 A -> B", 0.3, stated_orders=(("A", 0.5),))], {"A": 2.0}),
        ([step("A -> 2 B", 0.3, reverse=kc(3.0))], {"A": 2.0}),
        ([step("A + B -> 2 B", 0.3)], {"A": 2.0, "B": 0.1}),
        ([step("A -> B", 0.2), step("B -> C", 0.7)], {"A": 2.0, "B": 0.3}),
    ],
)
@pytest.mark.parametrize("dead", [None, (4e-4, 240.0)])
def test_integrated_rate_laws_beside_a_dead_space(steps, fill, dead):
    """What a form gives against the run, whose tolerance leaves about 1e-9 of the most."""
    case = experiment(steps, fill, dead=dead, until=3.0)
    run, form = integrate(case), recognise(build_system(case))
    if len(steps) == 2 and dead is not None:
        assert form is None
        return
    assert form is not None
    t = np.linspace(0.0, 3.0, 13)
    ours = run.state(t)[run.index(form.gas)]
    assert form.amount(t) == pytest.approx(ours, abs=1e-8 * ours.max())


def test_which_gas_a_form_gives():
    """The one that runs out first as written, or the intermediate."""

    def gas(steps, fill):
        form = recognise(build_system(experiment(steps, fill)))
        return None if form is None else form.gas

    assert (
        gas(
            [step("A + 2 B -> C", 0.3, stated_orders=(("A", 1.0), ("B", 1.0)))],
            {"A": 2.0, "B": 3.0},
        )
        == "B"
    )
    assert (
        gas(
            [step("A + 2 B -> C", 0.3, stated_orders=(("A", 1.0), ("B", 1.0)))],
            {"A": 2.0, "B": 5.0},
        )
        == "A"
    )
    assert gas([step("A -> B", 0.2), step("B -> C", 0.7)], {"A": 2.0}) == "B"
    assert gas([step("A -> B", 0.2)], {"B": 2.0}) is None
