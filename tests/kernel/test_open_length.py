"""Runs of open length in the kernel end as single runs do: in the same words, at the same time."""

from __future__ import annotations

import math
from contextlib import suppress
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from laboratory import experiment, si, step
from random_experiments import random_experiment

from meanfree.case.loader import load_case
from meanfree.equations.build import build_system
from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.integrate.single import integrate
from meanfree.kernel import records
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.records import Kept
from meanfree.kernel.status import Ending
from meanfree.kernel.watching import Functional
from meanfree.rates.source import Source

CASES = Path(__file__).parents[2] / "cases"
ORDINARY = ("nocl-bulb", "no2-samples", "azomethane-samples", "iodide-sweep")


def by_kernel(case: Experiment, functionals: tuple[Functional, ...] = ()) -> Kept:
    system = build_system(case)
    watched = -1 if case.watched is None else system.gases.index(case.watched)
    at_least = max((t.value for t in case.plan.report_at), default=0.0)
    task = Task(None, watched=watched, functionals=functionals, at_least=at_least)
    return Kernel(system, compiled=False).run(Variation(system, 1), task)


def open_ended(case: Experiment) -> Experiment:
    return replace(case, plan=replace(case.plan, until=None))


def compare(case: Experiment) -> tuple[str, float]:
    """The ending, and the relative difference of the times; the words must be the same."""
    found = by_kernel(case)
    ending = Ending(found.marks[0, 0])
    run = None
    with suppress(ComputationError):
        run = integrate(case)
    if run is None:
        assert not ending.is_good
        return "failed", 0.0
    assert ending.sentence == run.status.value
    return ending.name, abs(float(found.ends[0, -1]) / run.end - 1)


def bound(ending: str) -> float:
    """Converted: both at rtol 1e-8, errors of some tens of steps. Settled: either may rest where
    1e-6 of the most there was still moves, which shifts a level of 1e-3 of the way by as much as
    1e-3 of it, and the last tenth of the time by that over ln 1000."""
    return 1e-6 if ending == "CONVERTED" else 2e-3


@pytest.mark.parametrize("name", ORDINARY)
def test_shipped_cases(name: str) -> None:
    ending, difference = compare(open_ended(load_case(CASES / f"{name}.toml").experiment))
    assert difference < bound(ending)


@pytest.mark.slow
def test_random_experiments(size: str) -> None:
    """Both vessels, every law, every way to hold a temperature; what differs is counted."""
    indices = (0, 1) if size == "small" else range(60)
    differences = []
    for index in indices:
        ending, difference = compare(random_experiment(index))
        if ending in ("CONVERTED", "SETTLED"):
            differences.append(difference / bound(ending))
    print("differences over the bound:", np.sort(differences)[-5:])
    # A way that is a small part of what there is ends where the definition leaves it open.
    assert np.mean(np.array(differences) < 1) >= 0.9


def test_a_run_lasts_as_long_as_its_rows_ask() -> None:
    """A -> B: 99.9 % by ln(1000)/k = 69 s; a row at 500 s is still within the run."""
    case = experiment([step("A -> B", 0.1)], {"A": 1.0})
    assert by_kernel(case).ends[0, -1] == pytest.approx(np.log(1000) / 0.1, rel=1e-7)
    longer = replace(case, plan=replace(case.plan, report_at=(si(500.0),)))
    found = by_kernel(longer)
    assert found.ends[0, -1] == pytest.approx(500.0, rel=1e-14) == integrate(longer).end
    assert found.ends[0, 0] == pytest.approx(np.exp(-50.0), rel=1e-5)


def test_what_grows_or_never_rests_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    """A -> 2 A without bound; a product that piles up while the watched gas rests."""
    grown = by_kernel(experiment([step("A -> 2 A", 0.3)], {"A": 1.0}))
    assert grown.marks[0, 0] == Ending.UNBOUNDED
    inflow = step("-> A", Source(si(1e-3)))
    case = experiment([inflow, step("A -> B", 1e-2)], {"A": 1.0}, watch="A")
    found = by_kernel(case)
    assert found.marks[0, 0] == Ending.SETTLED
    assert found.ends[0, -1] == pytest.approx(np.log(1000) / 1e-2, rel=2e-3)
    assert np.isnan(found.rests[0, 1])
    # Lotka's scheme: x' = x - x y, y' = x y - y has closed orbits round (1, 1).
    monkeypatch.setattr("meanfree.kernel.stillness.MOST_STEPS", 400)
    steps = [step("X -> 2 X", 1.0), step("X + Y -> 2 Y", 1.0), step("Y -> P", 1.0)]
    swinging = by_kernel(experiment(steps, {"X": 1.0, "Y": 0.5}, watch="X"))
    assert swinging.marks[0, 0] == Ending.RESTLESS
    assert Ending.RESTLESS.is_good
    assert not Ending.UNBOUNDED.is_good


def test_a_filled_trace_is_kept_to_its_own_fill() -> None:
    """1e-12 of B in A: with a tolerance over the total alone its decay would be invisible."""
    case = experiment([step("B -> C", 0.1)], {"A": 1.0, "B": 1e-12}, watch="B")
    system = build_system(case)
    levels = system.initial_x[1] * np.array([[0.5, 1e-3]])
    task = Task(np.array([100.0]), atol=1e-9, functionals=(Functional(((1, 1.0),), levels),))
    found = Kernel(system, compiled=False).run(Variation(system, 1), task)
    np.testing.assert_allclose(found.events[0, 0], np.log([2.0, 1e3]) / 0.1, rtol=1e-7)


def test_a_run_that_outlasts_what_is_remembered_is_made_again(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """Two reversible steps, looked back at through all of the run and through 64 steps of it."""
    steps = [step("A -> B", 3.0), step("B -> A", 1.0), step("B -> C", 0.02), step("C -> B", 0.01)]
    case = experiment(steps, {"A": 1.0})
    whole = by_kernel(case)
    monkeypatch.setattr("meanfree.kernel.engine.remembered", lambda states: 8)
    again = by_kernel(case)
    assert again.marks[0, 1] > 1.5 * whole.marks[0, 1]
    np.testing.assert_array_equal(again.rests, whole.rests)
    # The second time its last step ends where the first run ended, no step before that differs.
    np.testing.assert_array_equal(again.ends, whole.ends)
    assert records.remembered(4) > 8


def test_a_maximum_beyond_the_end_counts_only_up_to_it() -> None:
    """B of A -> B rises to the last; the run ends at 99.9 %, and so does what is seen of B."""
    watched = (Functional(((1, 1.0),), peak=True),)
    found = by_kernel(experiment([step("A -> B", 0.1)], {"A": 1.0}), watched)
    end = found.ends[0, -1]
    assert found.peaks[0, 0, 0] == end
    assert found.peaks[0, 0, 1] == pytest.approx(found.ends[0, 1], rel=1e-12)


def kc(value: float) -> GivenEquilibrium:
    return GivenEquilibrium("Kc", si(value), si(300.0))


@pytest.mark.parametrize("compiled", [False, True])
@pytest.mark.parametrize(
    ("slow", "end"),
    [
        # [A] = 0.75 exp(-k t/2) once the fast step is in balance, from 1.0 to 0.001
        (step("A -> C", 1e-3), 2e3 * math.log(750.0)),
        # k/2 + k forwards and back: all three to 1.6/3, A from 0.75; 1e-3 of the way from 1
        (step("A -> C", 1e-3, reverse=kc(1.0)), math.log((0.75 - 1.6 / 3) / (1.4e-3 / 3)) / 1.5e-3),
    ],
)  # fmt: skip
def test_a_fast_equilibrium_is_no_rest_before_a_slow_step(
    slow: Step, end: float, compiled: bool
) -> None:
    """Fifteen decades lie between the two: nothing moves for most of the time in between."""
    steps = [step("A -> B", 1e12, reverse=kc(1.0)), slow]
    case = experiment(steps, {"A": 1.0, "B": 0.5, "C": 0.1}, watch="A")
    run = integrate(open_ended(case))
    # 1e-6 of movement at rest over the 1e-3 of the way that is left there, over ln 750
    assert run.end == pytest.approx(end, rel=2e-4)
    system = build_system(open_ended(case))
    kernel = Kernel(system, compiled=compiled)
    found = kernel.run(Variation(system, 1), Task(None, watched=system.gases.index("A")))
    assert Ending(found.marks[0, 0]).sentence == run.status.value
    assert found.ends[0, -1] == pytest.approx(end, rel=2e-4)
