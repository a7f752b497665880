"""Sensitivities, Sobol indices and bands against analytic and published results."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from laboratory import step
from planned_cases import arrhenius, fixed, planned, quantity
from scipy.stats import norm
from validation import Checked

from meanfree.constants import R
from meanfree.experiment.mechanism import Uncertainty as Stated
from meanfree.planning.factors import factor_addresses, factored, scaled
from meanfree.planning.readings import Reading
from meanfree.planning.request import PlanRequest, Tolerance
from meanfree.planning.sampling import (
    Uncertain,
    conditions_of,
    normal_scores,
    sobol_design,
    sobol_indices,
    sobol_points,
)
from meanfree.planning.sensitivity import sensitivities
from meanfree.planning.uncertainty import BAND, spread_of, uncertain_inputs
from meanfree.rates.collision import Collision

A, EA, C0, T = 1e8, 100e3, 20.0, 500.0
K = A * math.exp(-EA / (R * T))


def second_order():
    return planned([step("2 A -> 3 B", arrhenius(A, EA), "s")], {"A": C0}, T=T, fill_at=T)


def time_to(X: float, k: float = K) -> float:
    return X / (1 - X) / (2 * k * C0)


def test_sensitivities_of_second_order() -> None:
    """t = X/((1-X) 2 k c0); X = y/(1+y), y = 2 k c0 t; p = c R T (1 + X/2)."""
    X, t = 0.4, 8.0
    readings = [
        Reading("reaction time", "A", X),
        Reading("conversion", "A", times=(t, 2 * t)),
        Reading("pressure", times=(t,)),
        Reading("half-life", "A"),
    ]
    found = sensitivities(second_order(), readings, until=60.0)
    by_name = {knob.name: i for i, knob in enumerate(found.knobs)}
    assert set(by_name) == {"s", "temperature.value", "fill.gases.A", "vessel.volume"}
    times, X_of_t, p, half = found.values
    steep = EA / (R * T)  # d ln k/d ln T
    # Runs at rtol 1e-10 over a step of 0.01: 1e-8, and as much again for temperature's 24.
    close = {"abs": 1e-7}
    for name, wanted in (("s", -1.0), ("fill.gases.A", -1.0), ("vessel.volume", 0.0)):
        assert times[by_name[name], 0] == pytest.approx(wanted, **close)
        assert half[by_name[name], 0] == pytest.approx(wanted, **close)
    # A temperature is turned by 5e-4: the runs leave 1e-10 over that.
    assert times[by_name["temperature.value"], 0] == pytest.approx(-steep, abs=1e-6)
    for column, at in enumerate((t, 2 * t)):
        y = 2 * K * C0 * at
        assert X_of_t[by_name["s"], column] == pytest.approx(1 / (1 + y), **close)
        assert X_of_t[by_name["fill.gases.A"], column] == pytest.approx(1 / (1 + y), **close)
    y = 2 * K * C0 * t
    conv = y / (1 + y)
    by_k = 0.5 * conv / (1 + y) / (1 + 0.5 * conv)
    assert p[by_name["s"], 0] == pytest.approx(by_k, **close)
    assert p[by_name["fill.gases.A"], 0] == pytest.approx(1 + by_k, **close)


def test_sensitivities_of_what_is_not_reached_are_not_numbers() -> None:
    found = sensitivities(second_order(), [Reading("reaction time", "A", 0.9)], until=1.0)
    assert np.isnan(found.values[0]).all()


def test_addresses_that_scale_k() -> None:
    law = Collision(threshold=quantity(50e3, "molar energy"))
    from meanfree.gases.identity import find_gas

    gases = [find_gas(name) for name in ("NO2", "NO", "O2")]
    case = factored(planned([step("2 NO2 -> 2 NO + O2", law, "c")], {"NO2": 1.0}, gases=gases))
    assert factor_addresses(case, case.steps[0]) == ("steps.c.steric",)
    first = planned(
        [step("A -> B", fixed(1e-3), "f"), step("B -> C", arrhenius(1e3, 1e4, 1.0), "a")],
        {"A": 1.0},
    )
    assert factor_addresses(first, first.steps[0]) == ("steps.f.k",)
    assert factor_addresses(first, first.steps[1]) == ("steps.a.A",)
    doubled = scaled(first, first.steps[0], 2.0)
    assert doubled is not None
    assert float(doubled.steps[0].law.k.value) == 2e-3  # type: ignore[attr-defined]


# Sobol indices


def test_sobol_indices_of_the_ishigami_function(checked: Checked) -> None:
    """f = sin x1 + 7 sin^2 x2 + 0.1 x3^4 sin x1 on (-pi, pi)^3.

    Ishigami and Homma, Proc. ISUMA '90 (1990); the indices in Saltelli et al., Global
    Sensitivity Analysis: The Primer (2008): first order 0.314, 0.442, 0; total 0.558, 0.442, 0.244.
    """
    a, b = 7.0, 0.1
    points = sobol_design(3, 13)
    x = math.pi * (2 * points - 1)
    f = np.sin(x[:, 0]) + a * np.sin(x[:, 1]) ** 2 + b * x[:, 2] ** 4 * np.sin(x[:, 0])
    found = sobol_indices(f[:, None], 3)
    V = a**2 / 8 + b * math.pi**4 / 5 + b**2 * math.pi**8 / 18 + 0.5
    V1 = 0.5 * (1 + b * math.pi**4 / 5) ** 2
    V13 = b**2 * math.pi**8 * (1 / 18 - 1 / 50)
    first = np.array([V1, a**2 / 8, 0.0]) / V
    total = np.array([V1 + V13, a**2 / 8, V13]) / V
    np.testing.assert_allclose(first, [0.314, 0.442, 0.0], atol=5e-4)  # as printed
    np.testing.assert_allclose(total, [0.558, 0.442, 0.244], atol=5e-4)
    source = "Saltelli et al., The Primer (2008): Ishigami function"
    for which, values, printed in (
        ("first-order", found.first[:, 0], ("0.314", "0.442")),
        ("total", found.total[:, 0], ("0.558", "0.442", "0.244")),
    ):
        for ours, value in zip(values, printed, strict=False):
            checked(f"{which} Sobol indices", ours, value, "", source, within=0.02)
    # Within three of the standard errors that are stated with them, which 8192 points make small.
    assert (np.abs(found.first[:, 0] - first) < 3 * found.first_error[:, 0]).all()
    assert (np.abs(found.total[:, 0] - total) < 3 * found.total_error[:, 0]).all()
    assert max(found.first_error.max(), found.total_error.max()) < 0.02
    assert found.variance[0] == pytest.approx(V, rel=2e-3)
    assert (found.first_error > 0).all()


def test_sobol_indices_of_a_linear_log_model() -> None:
    """ln y = a1 ln x1 + a2 x2: shares a^2 s^2, by the path of uncertain inputs."""
    uncertain = [
        Uncertain("one", ("u",), "factor", 0.4),
        Uncertain("two", ("v", "w"), "factor", 0.1),
        Uncertain("three", ("z",), "absolute", 2.0),
    ]
    base = {"u": 3.0, "v": 1.0, "w": 2.0, "z": 300.0}
    scores = normal_scores(sobol_design(3, 11))
    lowest = dict.fromkeys(base, -1e9)
    values = conditions_of(uncertain, np.eye(3), base, lowest, scores)
    assert np.allclose(values["w"], 2.0 * values["v"])
    log_y = np.log(values["u"]) - 2 * np.log(values["v"]) + 0.1 * values["z"]
    found = sobol_indices(log_y[:, None], 3)
    parts = np.array([0.4, 2 * 0.1, 0.1 * 2.0]) ** 2
    shares = parts / parts.sum()
    # No interactions, so both kinds agree; 2048 quasi-random points.
    np.testing.assert_allclose(found.first[:, 0], shares, atol=3e-3)
    np.testing.assert_allclose(found.total[:, 0], shares, atol=3e-3)
    assert found.variance[0] == pytest.approx(parts.sum(), rel=5e-3)


def test_correlated_deviations() -> None:
    uncertain = [Uncertain("A", ("A",), "factor", 0.3), Uncertain("E", ("E",), "absolute", 2.0)]
    correlation = np.array([[1.0, 0.95], [0.95, 1.0]])
    scores = normal_scores(sobol_points(2, 12))
    values = conditions_of(uncertain, correlation, {"A": 1.0, "E": 0.0}, {"A": 0, "E": -99}, scores)
    logs, E = np.log(values["A"]), values["E"]
    assert np.corrcoef(logs, E)[0, 1] == pytest.approx(0.95, abs=1e-3)
    assert logs.std() == pytest.approx(0.3, rel=5e-3)
    assert E.std() == pytest.approx(2.0, rel=5e-3)


# Bands


def stated(factor: float, sigmas: float):
    case = second_order()
    return replace(case, steps=(replace(case.steps[0], uncertainty=Stated(factor, sigmas)),))


def test_bands_of_one_second_order_step_are_log_normal() -> None:
    """With ln k normal, ln t is; X(t) = y/(1 + y) with ln y normal."""
    X, sigma, at = 0.4, math.log(1.5) / 2, 8.0
    readings = [Reading("reaction time", "A", X), Reading("conversion", "A", times=(at,))]
    found = spread_of(stated(1.5, 2.0), PlanRequest(), readings, exponent=7, until=60.0)
    assert found is not None
    assert found.indices is None
    assert found.runs == 128
    # Every one of 128 equal strata holds one point, so a quantile at level q lies between the
    # exact ones at q - 1/128 and q + 1/128.
    for row, level in enumerate(BAND):
        low, high = (norm.ppf(np.clip(level + s / 128, 1e-9, 1 - 1e-9)) for s in (-1, 1))
        time = found.quantiles[0][row, 0]
        assert time_to(X) * math.exp(sigma * low) <= time <= time_to(X) * math.exp(sigma * high)
        y = [2 * K * C0 * at * math.exp(sigma * z) for z in (low, high)]
        assert y[0] / (1 + y[0]) <= found.quantiles[1][row, 0] <= y[1] / (1 + y[1])
    # The median converges as the strata shrink.
    medians = found.growing[0][:, 2, 0]
    assert abs(medians[-1] / time_to(X) - 1) < sigma * 2.6 / 128
    assert found.counts == (16, 32, 64, 128)


def test_what_is_not_reached_counts_as_later() -> None:
    readings = [Reading("reaction time", "A", 0.4)]
    until = time_to(0.4)  # half of the draws are slower
    found = spread_of(stated(1.5, 1.0), PlanRequest(), readings, exponent=5, until=until)
    assert found is not None
    assert found.reached[0][0] == pytest.approx(0.5, abs=1 / 32)
    assert np.isfinite(found.quantiles[0][:2, 0]).all()
    assert np.isnan(found.quantiles[0][3:, 0]).all()


def test_a_tolerance_takes_the_place_of_a_stated_factor() -> None:
    request = PlanRequest(tolerances=(Tolerance("steps.s.A", "factor", 0.1, "10 %"),))
    found, correlation = uncertain_inputs(factored(stated(1.5, 1.0)), request)
    assert [entry.name for entry in found] == ["steps.s.A"]
    assert correlation.shape == (1, 1)


def test_nothing_stated_is_nothing() -> None:
    assert spread_of(second_order(), PlanRequest(), [Reading("half-life", "A")]) is None


def test_two_inputs_have_indices() -> None:
    request = PlanRequest(tolerances=(Tolerance("fill.gases.A", "factor", 0.3, "30 %"),))
    readings = [Reading("reaction time", "A", 0.4)]
    found = spread_of(stated(1.5, 1.0), request, readings, exponent=4, until=60.0)
    assert found is not None
    assert found.indices is not None
    parts = np.array([math.log(1.5), 0.3]) ** 2
    # ln t is linear in both; 16 points leave an error that is stated.
    off = np.abs(found.indices.total[:, 0] - parts / parts.sum())
    assert (off < 3 * found.indices.total_error[:, 0]).all()
    assert found.runs == 4 * 16
