"""Integrated rate laws: recognised where they hold, refused elsewhere, and equal to runs."""

from __future__ import annotations

import numpy as np
import pytest
from laboratory import experiment, si, step

from meanfree.equations.build import build_system
from meanfree.equations.closed_forms import recognise
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.integrate.single import integrate


def kc(value):
    return GivenEquilibrium("Kc", si(value), si(300.0))


CASES = {
    "first order": ([step("A -> B", 0.3)], {"A": 2.0}, "volume"),
    "second order": ([step("2 A -> B", 0.3)], {"A": 2.0}, "volume"),
    "second order, two reactants": (
        [step("A + 2 B -> C", 0.3, stated_orders=(("A", 1.0), ("B", 1.0)))],
        {"A": 2.0, "B": 1.0},
        "volume",
    ),
    "equal amounts": ([step("A + B -> C", 0.3)], {"A": 2.0, "B": 2.0}, "volume"),
    "reversible first order": ([step("A -> B", 0.3, reverse=kc(0.7))], {"A": 2.0}, "volume"),
    "reversible second order": (
        [step("A + B -> C + D", 0.3, reverse=kc(3.0))],
        {"A": 2.0, "B": 1.0, "D": 0.2},
        "volume",
    ),
    "reversible, first order one way and second the other": (
        [step("A -> 2 B", 0.3, reverse=kc(3.0))],
        {"A": 2.0},
        "volume",
    ),
    "order 1.5": ([step("A -> B", 0.3, stated_orders=(("A", 1.5),))], {"A": 2.0}, "volume"),
    "order 0.5": ([step("A -> B", 0.3, stated_orders=(("A", 0.5),))], {"A": 2.0}, "volume"),
    "order 3": ([step("A -> B", 0.3, stated_orders=(("A", 3.0),))], {"A": 2.0}, "volume"),
    "consecutive first order": ([step("A -> 2 B", 0.3), step("B -> C", 0.2)], {"A": 2.0}, "volume"),
    "first order, constant pressure": ([step("A -> 3 B", 0.3)], {"A": 2.0}, "pressure"),
    "second order, constant pressure": (
        [step("2 A -> B", 0.3)],
        {"A": 2.0, "inert": 1.0},
        "pressure",
    ),
    "second order growing": ([step("2 A -> 5 B", 0.3)], {"A": 2.0}, "pressure"),
}
NAMES = {
    "equal amounts": "second order, two reactants",
    "second order growing": "second order, constant pressure",
}


@pytest.mark.parametrize("case", CASES)
def test_runs_follow_the_closed_form(case):
    steps, fill, holds = CASES[case]
    run = integrate(experiment(steps, fill, holds=holds, until=20.0))
    form = recognise(run.system)
    assert form is not None
    assert form.name == NAMES.get(case, case)
    t = np.linspace(0, 20.0, 101)
    ours = run.state(t)[run.index(form.gas)]
    # Radau at rtol 1e-8 reaches about 1e-9 here; orders below one end within the smoothing (1e-9)
    # of zero, where the closed form has a corner.
    assert ours == pytest.approx(form.amount(t), rel=0, abs=3e-8 * ours.max())


def test_equal_constants_of_consecutive_steps():
    run = integrate(experiment([step("A -> B", 0.3), step("B -> C", 0.3)], {"A": 2.0}, until=20.0))
    form = recognise(run.system)
    assert form is not None
    assert form.amount(np.array([1 / 0.3]))[0] == pytest.approx(2.0 / np.e, rel=1e-12)


def test_levenspiel_constant_pressure(checked):
    """E13: k C_A0 t = (1+e) X/(1-X) + e ln(1-X); Levenspiel, ch. 3, tabulated by quadrature."""
    tabulated = {
        -0.5: {0.1: 0.108235813384, 0.5: 0.84657359028, 0.9: 5.6512925465},
        0.5: {0.1: 0.113986408838, 0.5: 1.15342640972, 0.9: 12.3487074535},
        1.0: {0.1: 0.116861706564, 0.5: 1.30685281944, 0.9: 15.697414907},
    }
    for growth, times in tabulated.items():
        right = f"{1 + growth:g} B"
        law = step(f"A -> {right}", 1.0, stated_orders=(("A", 2.0),))
        run = integrate(experiment([law], {"A": 1.0}, holds="pressure", until=20.0))
        form = recognise(run.system)
        assert form is not None
        for conversion, time in times.items():
            # the table has twelve digits; the run has Radau's 1e-9
            assert form.amount(np.array([time]))[0] == pytest.approx(1 - conversion, rel=3e-11)
            ours = run.reaction_time("A", conversion)
            name = "k c₀ t in a piston, second order"
            source = "Levenspiel, Chemical Reaction Engineering, ch. 3"
            checked(name, ours, f"{time:.12g}", "", source, rel=1e-8)


@pytest.mark.parametrize(
    ("steps", "fill", "holds"),
    [
        ([step("A + M -> B", 0.3)], {"A": 1.0}, "volume"),
        ([step("A -> 2 B", 0.3, reverse=kc(3.0))], {"A": 1.0}, "pressure"),
        ([step("A + B -> C", 0.3)], {"A": 1.0, "B": 1.0}, "pressure"),
        ([step("3 A -> C", 0.3, reverse=kc(1.0))], {"A": 1.0}, "volume"),
        ([step("A + 2 B -> C", 0.3)], {"A": 1.0, "B": 1.0}, "volume"),
        ([step("A -> B", 0.3), step("A -> C", 0.2)], {"A": 1.0}, "volume"),
        ([step("A -> B", 0.3), step("2 B -> C", 0.2)], {"A": 1.0}, "volume"),
        ([step(" -> A", 0.3)], {"A": 1.0}, "volume"),
    ],
)
def test_what_has_no_closed_form_is_not_given_one(steps, fill, holds):
    assert recognise(build_system(experiment(steps, fill, holds=holds))) is None


def test_second_order_worked_example(checked):
    """E07: k = 1e-3, C0 = 1, X = 0.9 takes 9000 (closed form, any reaction-engineering text)."""
    run = integrate(experiment([step("A -> B", 1e-3, stated_orders=(("A", 2.0),))], {"A": 1.0}))
    ours = run.reaction_time("A", 0.9)
    source = "closed form, reaction-engineering texts"
    checked("second order, time to 90 %", ours, "9000", "s", source, rel=1e-8)


def test_equimolar_second_order(checked):
    """E08: 50 % in 10 min leaves one third at 20 min (a worked exercise, CP303)."""
    k = 1 / 600.0
    run = integrate(experiment([step("A + B -> C", k)], {"A": 1.0, "B": 1.0}, until=1200.0))
    assert run.reaction_time("A", 0.5) == pytest.approx(600.0, rel=1e-8)
    left = run.remaining("A", 1200.0)[0]
    name = "left after twice the half-life, second order"
    checked(name, left, "0.3333333333", "", "a worked exercise, CP303 (one third)", rel=1e-8)


@pytest.mark.parametrize(
    ("right", "growth_seen", "time", "published"),
    [("0.5 R", -0.2, 3.0, 0.231), ("1.6 R", 0.5, 4.0, 0.448)],
)
def test_levenspiel_variable_volume(right, growth_seen, time, published, checked):
    """E11 and E12: Levenspiel, ch. 3 problems (from memory); the published k has three digits."""
    fill = {"A": 0.8, "inert": 0.2} if growth_seen < 0 else {"A": 1.0}
    run = integrate(experiment([step(f"A -> {right}", published)], fill, holds="pressure", until=9))
    # dv/dt is about 0.03 a minute at that moment, so half a unit of k's last digit moves v by
    # less than 1e-3.
    growth = run.volume_ratio(time)[0] - 1
    name = f"growth of a piston, A → {right}"
    source = "Levenspiel, ch. 3, problem (from memory)"
    checked(name, growth, f"{growth_seen}", "", source, within=1e-3)
