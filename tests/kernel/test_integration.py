"""The kernel's runs against scipy's Radau at its tightest, closed forms and published values."""

from __future__ import annotations

import kernel_problems as problems
import numpy as np
import pytest
from benchmark_problems import hires
from validation import Checked

from meanfree.equations.build import build_system
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.status import Ending
from meanfree.kernel.tableau import TABLEAUX
from meanfree.kernel.watching import Functional

END = np.array([30.0])


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("seed", range(4))
def test_end_points_on_random_mechanisms(seed: int, holds: str) -> None:
    system = build_system(problems.random_network(seed, holds=holds))
    conditions = problems.spread(system, 3, seed)
    kept = Kernel(system, compiled=False).run(conditions, Task(END, rtol=1e-6))
    assert list(kept.marks[:, 0]) == [Ending.REACHED] * 3
    exact = problems.reference(problems.system_of(conditions, 1), END[0])
    error = np.abs(kept.ends[1, : system.size] - exact)
    # 20 times the tolerance of one step: errors of several hundred steps do not add up to more
    # where the equations forget them. Below 1e-15 of the total the reference itself is rounding.
    assert np.all(error <= 20e-6 * np.abs(exact) + 1e-15 * system.total_concentration)


def test_published_end_of_rober(checked: Checked) -> None:
    """Mazzia and Magherini, Test Set for IVP Solvers, release 2.4, 2008: ROBER at t = 1e11."""
    system = build_system(problems.rober())
    published = np.array([0.2083340149701255e-07, 0.8333360770334713e-13, 0.9999999791665050])
    for rtol, bound in ((1e-6, 1e-4), (1e-9, 1e-7)):
        # The bound is on a gas that fell by seven decades, one relative error a decade.
        kept = Kernel(system).run(Variation(system, 1), Task(np.array([1e11]), rtol=rtol))
        assert kept.marks[0, 0] == Ending.REACHED
        source = "Mazzia and Magherini, Test Set for IVP Solvers 2.4 (2008)"
        for ours, exact in zip(kept.ends[0, :3], published, strict=True):
            name = f"ROBER at 1e11, kernel, rtol {rtol:g}"
            checked(name, ours, f"{exact:.16g}", "", source, rel=bound)


def test_published_end_of_hires(checked: Checked) -> None:
    """Mazzia and Magherini, Test Set for IVP Solvers, release 2.4, 2008: HIRES at t = 321.8122."""
    system = build_system(hires())
    published = [
        0.7371312573325668e-3, 0.1442485726316185e-3, 0.5888729740967575e-4, 0.1175651343283149e-2,
        0.2386356198831331e-2, 0.6238968252742796e-2, 0.2849998395185769e-2, 0.2850001604814231e-2,
    ]  # fmt: skip
    kept = Kernel(system).run(Variation(system, 1), Task(np.array([321.8122]), rtol=1e-10))
    # At 1e-10 a step, on the slope of a front that moves with the errors made before it.
    source = "Mazzia and Magherini, Test Set for IVP Solvers 2.4 (2008)"
    for ours, exact in zip(kept.ends[0, :8], published, strict=True):
        checked("HIRES at 321.8122, kernel", ours, f"{exact:.16g}", "", source, rel=1e-7)


@pytest.mark.parametrize("name", TABLEAUX)
def test_error_falls_with_the_tolerance(name: str) -> None:
    """Work-precision: the error of either method follows the tolerance over four decades."""
    system = build_system(problems.rober())
    kernel = Kernel(system, TABLEAUX[name], compiled=False)
    exact = problems.reference(system, 1e4)
    errors = []
    for rtol in (1e-4, 1e-6, 1e-8):
        kept = kernel.run(Variation(system, 1), Task(np.array([1e4]), rtol=rtol))
        errors.append(np.max(np.abs(kept.ends[0, :3] / exact - 1)))
    assert errors[0] < 1e-3
    assert errors[1] < errors[0] / 10
    assert errors[2] < errors[1] / 10


def test_pivoting_gives_the_same_steps() -> None:
    """Every step with row exchanges: another order of the same arithmetic."""
    system = build_system(problems.random_network(3, holds="pressure"))
    conditions = problems.spread(system, 5, 3)
    kernel = Kernel(system, compiled=False)
    plain = kernel.run(conditions, Task(END, rtol=1e-7))
    pivoted = kernel.run(conditions, Task(END, rtol=1e-7, worst_multiplier=-1.0))
    assert np.all(plain.marks[:, 3] == 0)
    assert np.all(pivoted.marks[:, 3] == pivoted.marks[:, 1])
    scale = np.abs(plain.ends) + 1e-12 * system.total_concentration
    # Rounding of the solutions, 1e-16 times the condition of the matrices, moves step sizes; the
    # result then moves by less than the tolerance.
    assert np.max(np.abs(pivoted.ends - plain.ends) / scale) < 1e-6


def test_an_explosion_meets_bad_pivots_and_gets_through() -> None:
    """A + X -> 2 X from a trace: the diagonal grows positive, and 1/(h gamma) comes close to it."""
    steps = [problems.step("1", {"A": 1, "X": 1}, {"X": 2}, 1.0)]
    system = build_system(problems.experiment(steps, {"A": 1.0, "X": 1e-12}))
    kept = Kernel(system, compiled=False).run(Variation(system, 1), Task(END, rtol=1e-8))
    # Logistic growth: X = (a + x) / (1 + (a/x) exp(-(a + x) k t)).
    total = 1.0 + 1e-12
    exact = total / (1 + 1e12 * np.exp(-total * 30.0))
    assert kept.marks[0, 0] == Ending.REACHED
    assert kept.ends[0, 1] == pytest.approx(exact, rel=1e-6)


def test_events_of_a_first_order_decay() -> None:
    system = build_system(
        problems.experiment([problems.step("1", {"A": 1}, {"B": 1}, 0.1)], {"A": 2.0})
    )
    levels = 2.0 * np.array([[0.5, 0.25, 0.125, 0.1, 0.01]])
    watched = (
        Functional(((0, 1.0),), levels=levels),
        Functional(((1, 1.0),), levels=np.array([[0.5, 1.9]]), falls=False),
        Functional(((0, 3.0), (1, 1.0))),
    )
    grid = np.array([[0.0, 1.0, 7.5, 40.0]])
    task = Task(np.array([40.0]), rtol=1e-9, functionals=watched, grid=grid)
    kept = Kernel(system).run(Variation(system, 1), task)
    # Dense output is one order below the method: errors some ten times those at the steps.
    np.testing.assert_allclose(kept.events[0, 0, :4], np.log(2.0 / levels[0, :4]) / 0.1, rtol=1e-8)
    assert np.isnan(kept.events[0, 0, 4])
    rises = [-np.log(1 - 0.25) / 0.1, -np.log(1 - 0.95) / 0.1]
    np.testing.assert_allclose(kept.events[0, 1, :2], rises, rtol=1e-8)
    A = 2.0 * np.exp(-0.1 * grid[0])
    np.testing.assert_allclose(kept.values[0, :, 0], A, rtol=1e-8)
    np.testing.assert_allclose(kept.values[0, :, 2], 3 * A + (2.0 - A), rtol=1e-8)


def test_levels_that_lie_behind_or_are_met_at_once() -> None:
    system = build_system(
        problems.experiment([problems.step("1", {"A": 1}, {"B": 1}, 0.1)], {"A": 2.0})
    )
    watched = (Functional(((0, 1.0),), levels=np.array([[3.0, 2.0, 1.0]])),)
    kept = Kernel(system).run(Variation(system, 1), Task(END, rtol=1e-9, functionals=watched))
    assert np.isnan(kept.events[0, 0, 0])
    assert kept.events[0, 0, 1] == 0.0
    assert kept.events[0, 0, 2] == pytest.approx(np.log(2) / 0.1, rel=1e-8)


@pytest.mark.parametrize("ratio", [0.01, 0.5, 20.0])
def test_maximum_of_an_intermediate(ratio: float) -> None:
    """A -> B -> C: B is highest at ln(k2/k1)/(k2 - k1) (any text of kinetics)."""
    k1, k2 = 1.0, ratio
    steps = [problems.step("1", {"A": 1}, {"B": 1}, k1), problems.step("2", {"B": 1}, {"C": 1}, k2)]
    system = build_system(problems.experiment(steps, {"A": 1.0}))
    watched = (Functional(((1, 1.0),), peak=True), Functional(((2, 1.0),), peak=True))
    kept = Kernel(system).run(Variation(system, 1), Task(END, rtol=1e-9, functionals=watched))
    time = np.log(k2 / k1) / (k2 - k1)
    # At a maximum an error of 1e-9 in the value moves the time by its square root.
    assert kept.peaks[0, 0, 0] == pytest.approx(time, rel=1e-4)
    assert kept.peaks[0, 0, 1] == pytest.approx(ratio ** (ratio / (1 - ratio)), rel=1e-8)
    assert kept.peaks[0, 1, 0] == END[0]


def test_a_crossing_and_its_return_within_one_step_are_seen() -> None:
    """B passes a level twice; the first time counts, however long the steps are."""
    steps = [
        problems.step("1", {"A": 1}, {"B": 1}, 1.0),
        problems.step("2", {"B": 1}, {"C": 1}, 1.1),
    ]
    system = build_system(problems.experiment(steps, {"A": 1.0}))
    top = 1.1 ** (1.1 / (1 - 1.1))
    watched = (Functional(((1, 1.0),), levels=np.array([[0.98 * top]]), falls=False),)
    kept = Kernel(system).run(Variation(system, 1), Task(END, rtol=1e-3, functionals=watched))
    assert 0.5 < kept.events[0, 0, 0] < np.log(1.1) / 0.1


def test_runs_that_cannot_go_on_say_so() -> None:
    system = build_system(problems.rober())
    kernel = Kernel(system, compiled=False)
    few = kernel.run(Variation(system, 2), Task(np.array([1e5]), most_steps=7))
    assert list(few.marks[:, 0]) == [Ending.TOO_MANY_STEPS] * 2
    bad = Variation(system, 3, {("number", 0, 0, 0): np.array([0.04, np.nan, np.inf])})
    kept = kernel.run(bad, Task(np.array([10.0])))
    assert list(kept.marks[:, 0]) == [Ending.REACHED, Ending.NOT_FINITE, Ending.NOT_FINITE]
    runaway = problems.experiment([problems.step("1", {"A": 2}, {"A": 3}, 1.0)], {"A": 1.0})
    system = build_system(runaway)
    kept = Kernel(system).run(Variation(system, 1), Task(np.array([2.0])))
    assert Ending(kept.marks[0, 0]) in (Ending.STEP_TOO_SMALL, Ending.NOT_FINITE)
    assert all(ending.sentence for ending in Ending)


def test_a_step_that_overflows_is_never_accepted() -> None:
    """A first step far too long makes numbers of 1e120; their error must not look like nothing."""
    system = build_system(problems.rober())
    kept = Kernel(system, compiled=False).run(Variation(system, 1), Task(np.array([10.0])))
    assert kept.marks[0, 0] == Ending.REACHED
    assert kept.ends[0, :3].sum() == pytest.approx(1.0, abs=1e-12)
