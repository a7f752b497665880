"""Designs against exhaustive search and calculus; expected errors against simulated fits."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from laboratory import step
from planned_cases import arrhenius, fixed, planned, quantity
from scipy.optimize import least_squares

from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Program
from meanfree.integrate.single import integrate
from meanfree.planning.designs import (
    Candidates,
    Criterion,
    information,
    merit,
    optimal,
    spaced,
    standard_errors,
)
from meanfree.planning.drawing import Drawing
from meanfree.planning.goal import SHARP
from meanfree.planning.readings import Kind, Reading, read_off
from meanfree.planning.request import PlanRequest, Sampling
from meanfree.planning.schedule import Plan, schedule

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
@pytest.mark.parametrize(("apart", "count"), [(0.0, 3), (5.0, 3), (7.5, 4)])
def test_two_parameters_against_exhaustive_search(criterion: str, apart: float, count: int) -> None:
    """k and c0 of second order, three or four samples out of 30 times."""
    times = np.arange(2.0, 61.0, 2.0)
    y = 2 * K * C0 * times
    slopes = np.stack([-C0 * y / (1 + y) ** 2, C0 / (1 + y) ** 2], axis=1)
    candidates = Candidates(times, slopes)

    def worth(places: tuple[int, ...]) -> float:
        return float(merit(information(slopes[list(places)])[None], criterion)[0])  # type: ignore[arg-type]

    best = max(
        worth(places)
        for places in itertools.combinations_with_replacement(range(len(times)), count)
        if all(times[b] - times[a] >= apart for a, b in itertools.pairwise(places))
    )
    found = optimal(candidates, count, criterion, apart)  # type: ignore[arg-type]
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


def drawn_one_by_one(
    experiment: Experiment, times: Sequence[float], takes: float, kind: Kind = "concentration"
) -> list[float]:
    """Signals of A by runs that end at each sample, and begin again with what it left."""
    found, now, before = [], experiment, 0.0
    for time in times:
        run = integrate(replace(now, plan=replace(now.plan, until=quantity(time - before, "time"))))
        found.append(float(read_off(run, Reading(kind, "A", times=(run.end,)))[0]))
        left = run.amounts(run.end)[:, 0] * (1.0 - takes)
        amounts = {
            gas: Portion(quantity(float(n), "amount"), "amount")
            for gas, n in zip(run.system.gases, left, strict=True)
        }
        vessel = now.vessel
        if not vessel.is_rigid:
            vessel = replace(vessel, pressure=quantity(now.held_pressure, "pressure"))
        now = replace(now, fill=Fill(amounts, at=now.fill.at), vessel=vessel)
        before = time
    return found


def drawing(experiment: Experiment, takes: float, kind: Kind = "concentration") -> Drawing:
    hold = {"temperature.value": np.full(1, experiment.temperature.initial)}
    return Drawing(experiment, hold, Reading(kind, "A"), takes, SHARP)


def test_samples_that_take_something_out() -> None:
    """Second order: after each sample c falls by the fraction, then goes on as from there."""
    takes = 0.2
    found = drawing(second_order(), takes).read(np.array([5.0, 5.0, 12.0]))[0]
    first = concentration(np.array(5.0))
    second = first * (1 - takes)
    third = concentration(np.array(7.0), c0=float(second * (1 - takes)))
    # A run at rtol 1e-10.
    np.testing.assert_allclose(found, [first, second, third], rtol=1e-9)


@pytest.mark.parametrize("kind", ["concentration", "pressure", "partial pressure", "amount"])
@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_draws_against_runs_that_begin_again(kind: Kind, holds: str) -> None:
    """Two steps of which one runs backwards, in both vessels, against scipy's solver."""
    steps = [step("2 A -> B", fixed(2e-3, 2.0), "f"), step("B -> A + C", fixed(5e-2), "g")]
    case = planned(steps, {"A": C0}, holds=holds, T=T, fill_at=T)
    times, takes = [3.0, 10.0, 30.0, 55.0], 0.15
    found = drawing(case, takes, kind).read(np.array(times))[0]
    # Runs at rtol 1e-8, their errors added up.
    np.testing.assert_allclose(found, drawn_one_by_one(case, times, takes, kind), rtol=2e-7)


def test_a_piston_gives_volume_and_keeps_its_concentration() -> None:
    case = planned([step("A -> B", fixed(1e-2), "f")], {"A": C0}, holds="pressure")
    times = np.array([10.0, 10.0, 50.0])
    found = drawing(case, 0.3).read(times)[0]
    np.testing.assert_allclose(found, C0 * np.exp(-1e-2 * times), rtol=1e-9)


def test_draws_beside_samples_that_the_case_draws_anyway() -> None:
    """First order: every sample takes its share, also at one time, and a volume of a piston."""
    case = planned([step("A -> B", fixed(1e-2), "f")], {"A": C0})
    taken = Sample(quantity(10.0, "time"), fraction=quantity(0.5, "fraction"))
    found = drawing(replace(case, samples=(taken,)), 0.3).read(np.array([10.0, 20.0]))[0]
    wanted = C0 * np.exp(-1e-2 * np.array([10.0, 20.0])) * [1.0, 0.5 * 0.7]
    # The sample at 10 s is read 1e-8 s before the other one.
    np.testing.assert_allclose(found, wanted, rtol=1e-9)
    piston = planned([step("A -> B", fixed(1e-2), "f")], {"A": C0}, holds="pressure")
    half = piston.initial_volume / 2
    by_volume = Sample(quantity(10.0, "time"), volume=quantity(half, "volume"))
    found = drawing(replace(piston, samples=(by_volume,)), 0.3, "amount").read(
        np.array([5.0, 20.0])
    )[0]
    start = piston.moles["A"]
    # 0.7 of the volume is left at 10 s, of which half the first volume is drawn.
    wanted = start * np.exp(-1e-2 * np.array([5.0, 20.0])) * [1.0, 0.2]
    np.testing.assert_allclose(found, wanted, rtol=1e-8)


def closed_form_draws(times: np.ndarray, takes: float) -> np.ndarray:
    """dc/d ln k and dc/d ln c0 before each draw of many designs, shape (n_designs, n, 2).

    -dc/dt = 2 k c^2: c(t) = c0/(1 + y), y = 2 k c0 t; a draw multiplies c by 1 - takes.
    """
    c, before = np.full(len(times), C0), np.zeros(len(times))
    slopes, found = np.stack([np.zeros_like(c), c], axis=1), []
    for t in times.T:
        y = 2 * K * c * (t - before)
        slopes = slopes / (1 + y[:, None]) ** 2
        slopes[:, 0] -= c * y / (1 + y) ** 2
        c, before = c / (1 + y), t
        found.append(slopes)
        c, slopes = c * (1 - takes), slopes * (1 - takes)
    return np.stack(found, axis=1)


@pytest.mark.parametrize(
    ("criterion", "count", "apart", "takes", "gain"),
    [
        ("D", 4, 0.0, 0.2, 1.13),
        ("D", 4, 7.5, 0.4, 1.08),
        ("A", 5, 0.0, 0.2, 1.24),
        ("E", 4, 7.5, 0.5, 1.10),
    ],
)
def test_times_chosen_with_what_samples_take_against_exhaustive_search(
    monkeypatch: pytest.MonkeyPatch,
    criterion: Criterion,
    count: int,
    apart: float,
    takes: float,
    gain: float,
) -> None:
    """k and c0 of second order on 24 times: no design is better than the one found, and the one
    that ignores the draws is worse by ``gain`` or more in errors (D: in the area of their region).
    """
    monkeypatch.setattr("meanfree.planning.schedule.CANDIDATES", 24)
    times = np.linspace(0, 60.0, 25)[1:]
    places = np.array(list(itertools.combinations_with_replacement(range(24), count)))
    places = places[np.diff(times[places]).min(axis=1) >= apart]
    slopes = closed_form_draws(times[places], takes) / 0.2
    worth = merit(np.swapaxes(slopes, 1, 2) @ slopes, criterion)
    request = sampling(
        count=count,
        takes=takes,
        parameters=("steps.s.A", "fill.gases.A"),
        dead_time=quantity(apart, "time") if apart else None,
    )
    found = schedule(second_order(), request)

    def worth_of(plan: Plan) -> float:
        own = closed_form_draws(plan.times[None], takes)[0] / 0.2
        # The errors of a plan are those of its closed form; slopes are good to 1e-7.
        np.testing.assert_allclose(plan.errors, standard_errors(own), rtol=1e-5)
        return float(merit(information(own)[None], criterion)[0])

    best = worth_of(found.plans[criterion])
    assert best == pytest.approx(worth.max(), rel=1e-6)
    ignoring = worth_of(found.ignoring[criterion])
    if criterion == "D":
        assert best - ignoring > 2 * math.log(gain)
    else:
        ratio = ignoring / best if criterion == "A" else best / ignoring
        assert ratio > gain**2


def test_draws_where_the_temperature_varies() -> None:
    """A program: the signal before each draw, against k integrated over the warm-up."""
    warm = planned([step("A -> B", arrhenius(1e8, EA, 1.0), "s")], {"A": C0}, T=T, fill_at=T)
    points = tuple((quantity(t, "time"), quantity(K, "temperature")) for t, K in ((0, T), (60, T)))
    found = schedule(
        replace(warm, temperature=Program(points)), sampling(takes=0.1, until=quantity(1e3, "time"))
    )
    plan = found.plans["equal times"]
    k = 1e8 * math.exp(-EA / (8.31446261815324 * T))
    wanted = C0 * np.exp(-k * plan.times) * 0.9 ** np.arange(4)
    np.testing.assert_allclose(plan.signal, wanted, rtol=1e-8)
    np.testing.assert_allclose(plan.conversion, -np.expm1(-k * plan.times), rtol=1e-6)


def test_a_sample_that_draws_have_made_too_small_to_be_seen_tells_nothing() -> None:
    limit = {"A": Portion(quantity(2.0, "concentration"), "concentration")}
    request = sampling(takes=0.5, count=6)
    found = schedule(second_order(), replace(request, detection=limit))
    plan = found.plans["equal times"]
    seen = plan.signal >= 2.0
    assert 0 < seen.sum() < 6
    slopes = closed_form_draws(plan.times[None], 0.5)[0, :, :1] / 0.2
    assert plan.errors == pytest.approx(standard_errors(slopes[seen]), rel=1e-6)


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
