"""Designs against exhaustive search and calculus; expected errors against simulated fits."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from laboratory import step
from planned_cases import arrhenius, fixed, planned, quantity
from scipy.optimize import least_squares

from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Portion
from meanfree.planning.designs import (
    Candidates,
    information,
    merit,
    optimal,
    spaced,
    standard_errors,
)
from meanfree.planning.drawing import drawn_signals
from meanfree.planning.goal import SHARP
from meanfree.planning.readings import Reading
from meanfree.planning.request import PlanRequest, Sampling
from meanfree.planning.schedule import schedule

A, EA, C0, T = 1e8, 100e3, 20.0, 500.0
K = A * math.exp(-EA / (8.31446261815324 * T))


def second_order() -> Experiment:
    return planned([step("2 A -> B", arrhenius(A, EA), "s")], {"A": C0}, T=T, fill_at=T)


def concentration(t: np.ndarray, k: float = K, c0: float = C0) -> np.ndarray:
    return np.asarray(c0 / (1 + 2 * k * c0 * t))


def sampling(**options: object) -> PlanRequest:
    given = {"count": 4, "sd": quantity(0.2, "concentration"), "until": quantity(60.0, "time")}
    return PlanRequest(samples=Sampling(**{**given, **options}))  # type: ignore[arg-type]


def test_one_second_order_parameter_by_calculus() -> None:
    """dc/d ln k = -c0 y/(1 + y)^2 with y = 2 k c0 t is largest at y = 1: the half-life."""
    found = schedule(second_order(), sampling())
    half = 1 / (2 * K * C0)
    # All samples at the half-life, to the spacing of the candidates (60 s/400).
    np.testing.assert_allclose(found.plans["D"].times, half, atol=0.075 + 1e-9)
    # Relative error sd/(c0/4) / sqrt(4); at most 1e-4 less sharp half a grid step away.
    assert found.plans["D"].errors[0] == pytest.approx(0.2 / (C0 / 4) / 2, rel=1e-4)
    for kind in ("A", "E"):
        assert found.plans[kind].errors == pytest.approx(found.plans["D"].errors, rel=1e-12)


@pytest.mark.parametrize("apart", [0.0, 4.0, 9.0])
def test_one_parameter_against_exhaustive_search(apart: float) -> None:
    times = np.arange(2.0, 61.0, 2.0)
    y = 2 * K * C0 * times
    candidates = Candidates(times, (C0 * y / (1 + y) ** 2)[:, None])
    worth = candidates.slopes[:, 0] ** 2
    best = max(
        (
            places
            for places in itertools.combinations_with_replacement(range(len(times)), 3)
            if all(times[b] - times[a] >= apart for a, b in itertools.pairwise(places))
        ),
        key=lambda places: worth[list(places)].sum(),
    )
    found = optimal(candidates, 3, "D", apart)
    assert worth[found].sum() == pytest.approx(worth[list(best)].sum(), rel=1e-14)
    assert all(times[b] - times[a] >= apart for a, b in itertools.pairwise(found))


@pytest.mark.parametrize("criterion", ["D", "A", "E"])
@pytest.mark.parametrize("apart", [0.0, 5.0])
def test_two_parameters_against_exhaustive_search(criterion: str, apart: float) -> None:
    """k and c0 of second order, three samples out of 30 times."""
    times = np.arange(2.0, 61.0, 2.0)
    y = 2 * K * C0 * times
    slopes = np.stack([-C0 * y / (1 + y) ** 2, C0 / (1 + y) ** 2], axis=1)
    candidates = Candidates(times, slopes)

    def worth(places: tuple[int, ...]) -> float:
        return float(merit(information(slopes[list(places)])[None], criterion)[0])  # type: ignore[arg-type]

    best = max(
        worth(places)
        for places in itertools.combinations_with_replacement(range(len(times)), 3)
        if all(times[b] - times[a] >= apart for a, b in itertools.pairwise(places))
    )
    found = optimal(candidates, 3, criterion, apart)  # type: ignore[arg-type]
    assert worth(tuple(found)) == pytest.approx(best, rel=1e-12)


def test_expected_errors_against_500_simulated_fits() -> None:
    """Readings with normal errors, fitted with the closed form by scipy; k and the fill."""
    request = sampling(
        count=8, parameters=("steps.s.A", "fill.gases.A"), dead_time=quantity(2.0, "time")
    )
    found = schedule(second_order(), request)
    random = np.random.default_rng(7)
    for kind in ("equal times", "D"):
        plan = found.plans[kind]  # type: ignore[index]
        np.testing.assert_allclose(plan.signal, concentration(plan.times), rtol=1e-7)
        fits = []
        for _ in range(500):
            readings = concentration(plan.times) + random.normal(0, 0.2, len(plan.times))

            def misfit(p: np.ndarray, readings: np.ndarray = readings, plan=plan) -> np.ndarray:
                return concentration(plan.times, K * p[0], C0 * p[1]) - readings

            fits.append(least_squares(misfit, [1.0, 1.0], method="lm").x)
        scatter = np.std(fits, axis=0, ddof=1)
        # A standard deviation of 500 is known to 1/sqrt(998) = 3.2 %; four of them.
        np.testing.assert_allclose(plan.errors, scatter, rtol=4 / math.sqrt(998))
    assert found.plans["D"].errors[0] < 0.8 * found.plans["equal times"].errors[0]


def test_equal_steps_of_conversion() -> None:
    found = schedule(second_order(), sampling(count=5))
    plan = found.plans["equal conversion"]
    y = 2 * K * C0 * 60.0
    wanted = np.arange(1, 6) / 5 * y / (1 + y)
    # Candidates are 0.15 s apart; the conversion rises by 2 k c0 0.15 = 0.022 in the first of them.
    np.testing.assert_allclose(plan.conversion, wanted, atol=0.022)
    assert (plan.conversion >= wanted - 1e-9).all()


def test_dead_time_and_detection_limit_hold() -> None:
    limit = {"A": Portion(quantity(4.0, "concentration"), "concentration")}
    request = PlanRequest(
        detection=limit,
        samples=Sampling(4, "", None, quantity(7.0, "time"), until=quantity(60.0, "time")),
    )
    found = schedule(second_order(), request)
    last = (C0 / 4.0 - 1) / (2 * K * C0)
    assert found.late == pytest.approx(last, abs=0.16)
    for plan in found.plans.values():
        assert np.diff(plan.times).min() >= 7.0 - 1e-9
        assert plan.times[-1] <= last
    assert found.assumed
    assert found.sd == pytest.approx(0.01 * found.signal.max())


def test_samples_that_take_something_out() -> None:
    """Second order: after each sample c falls by the fraction, then goes on as from there."""
    takes, times = 0.2, (5.0, 5.0, 12.0)
    found = drawn_signals(second_order(), Reading("concentration", "A", times=times), takes, SHARP)
    first = concentration(np.array(5.0))
    second = first * (1 - takes)
    third = concentration(np.array(7.0), c0=float(second * (1 - takes)))
    # The second sample at once is read 5e-9 s later.
    np.testing.assert_allclose(found, [first, second, third], rtol=1e-8)
    planned_one = schedule(second_order(), sampling(takes=takes))
    assert planned_one.takes_counted
    undisturbed = schedule(second_order(), sampling())
    # Less gas, less signal: the same samples determine k less well.
    assert planned_one.plans["D"].errors[0] > undisturbed.plans["D"].errors[0]


def test_a_piston_gives_volume_and_keeps_its_concentration() -> None:
    case = planned([step("A -> B", fixed(1e-2), "f")], {"A": C0}, holds="pressure")
    times = (10.0, 50.0)
    found = drawn_signals(case, Reading("concentration", "A", times=times), 0.3, SHARP)
    np.testing.assert_allclose(found, C0 * np.exp(-1e-2 * np.array(times)), rtol=1e-8)


def test_parameters_that_cannot_be_told_apart() -> None:
    found = schedule(second_order(), sampling(parameters=("steps.s.A", "steps.s.Ea")))
    assert np.isinf(found.plans["D"].errors).all()
    assert np.isinf(standard_errors(np.zeros((3, 1)))).all()


def test_samples_that_do_not_fit_are_refused() -> None:
    with pytest.raises(InputError, match="fewer samples"):
        schedule(second_order(), sampling(count=20, dead_time=quantity(5.0, "time")))
    with pytest.raises(ValueError, match="do not fit"):
        spaced(np.arange(5.0), np.array([0, 1, 2]), 3.0)
    with pytest.raises(InputError, match="a gas that can be seen"):
        limit = {"A": Portion(quantity(400.0, "concentration"), "concentration")}
        schedule(second_order(), PlanRequest(detection=limit))
