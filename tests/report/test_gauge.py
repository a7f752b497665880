"""k as a gauge reads it, the start of the pressure beside a resolution, and ranges of validity."""

from __future__ import annotations

from dataclasses import replace

import pytest
from scipy.constants import R
from small_runs import dimerisation, nitrosyl_chloride

from meanfree.experiment.experiment import Experiment
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.report import sheets
from meanfree.report.answers import answers
from meanfree.report.cautions import grave_cautions
from meanfree.report.kinetics import pressure_rate_unit, rate_constants
from meanfree.report.run_models import RunSummary
from meanfree.report.summary import summarise
from meanfree.sourced import Sourced

TORR = 101325 / 760


def summary_of(run: Run) -> RunSummary:
    return summarise(run, case="case.toml", case_sha256="0", version="0", verification=None)


def gauged(experiment: Experiment, torr: float) -> Experiment:
    gauge = Sourced(torr * TORR, "torr", dimension="pressure")
    return replace(experiment, vessel=replace(experiment.vessel, gauge_resolution=gauge))


def test_a_second_order_in_torr() -> None:
    """k/(RT): 62.364 L torr/mol/K at 480 K, the gas constant as handbooks print it."""
    run = integrate(nitrosyl_chloride())
    row, reverse = rate_constants(run)
    litres = row.k * 1e3
    expected = litres / (62.3637 * 480)  # 1/torr/s; six digits of the constant
    value, unit = row.shown_by_pressure.rsplit(" torr", 1)
    assert unit == "⁻¹ s⁻¹"
    mantissa, power = value.split(" × 10")
    digits = power.translate(str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-"))
    assert float(mantissa) * 10 ** float(digits) == pytest.approx(expected, rel=2e-4)  # 4 shown
    assert row.by_pressure == pytest.approx(row.k / (R * 480), rel=1e-15)
    assert row.by_pressure_unit == "1/Pa/s"
    assert reverse.by_pressure == pytest.approx(reverse.k / (R * 480) ** 2, rel=1e-15)
    assert reverse.by_pressure_unit == "1/Pa^2/s"
    assert reverse.shown_by_pressure.endswith(" torr⁻² s⁻¹")
    assert "k for pressures" in sheets.constants([row, reverse]).heading
    (answer, _) = summary_of(run).rate_constants
    assert answer.k_by_pressure == row.by_pressure
    assert answer.k_by_pressure_unit == "1/Pa/s"


@pytest.mark.parametrize(
    ("order", "unit"), [(2.0, "1/Pa/s"), (1.5, "1/Pa^0.5/s"), (0.0, "Pa/s"), (3.0, "1/Pa^2/s")]
)
def test_units_of_other_orders(order: float, unit: str) -> None:
    assert pressure_rate_unit("Pa", order) == unit


def test_a_first_order_has_no_pressure_in_it() -> None:
    row, _ = rate_constants(integrate(nitrosyl_chloride()))
    first = replace(row, order=1.0, unit="1/s", shown_unit="1/s")
    assert first.by_pressure is None
    assert (first.by_pressure_unit, first.shown_by_pressure) == ("", "")
    assert "k for pressures" not in sheets.constants([first]).heading


def test_the_gauge_stands_beside_the_slope() -> None:
    run = integrate(gauged(nitrosyl_chloride(), 0.1))
    summary = summary_of(run)
    (said,) = [one for one in answers(run, summary) if one.question == "Pressure at the start"]
    # 50 torr of NOCl at 296 K are 81.08 torr at 480 K: k p^2 with k of the test above
    slope = 62.3637 * 480 * 7.4728e-2 * (81.081 / (62.3637 * 480)) ** 2 * 60
    assert said.answer == f"rises by {slope:.3f} torr/min"
    assert said.note.startswith("a gauge good to 0.100 torr first shows a change after ")
    assert summary.vessel.gauge_resolution_Pa == pytest.approx(0.1 * TORR)
    first = summary.vessel.gauge_first_shows_it_s
    assert first is not None
    p = run.pressure([0.0, first])
    assert p[1] - p[0] == pytest.approx(0.1 * TORR, rel=1e-9)


def test_a_coarse_gauge_sees_nothing_and_a_piston_has_none_to_say() -> None:
    run = integrate(gauged(nitrosyl_chloride(), 500.0))
    (said,) = [one for one in answers(run, summary_of(run)) if "start" in one.question]
    assert said.note == "a gauge good to 500 torr never shows a change"
    run = integrate(gauged(dimerisation("pressure"), 0.1))
    summary = summary_of(run)
    assert summary.vessel.initial_pressure_slope_Pa_per_s is None
    assert not [one for one in answers(run, summary) if "start" in one.question]


@pytest.mark.parametrize(
    ("low", "high", "said"),
    [
        (400.0, 450.0, "used at 480 K; its source holds for 400 K to 450 K."),
        (490.0, 600.0, "used at 480 K; its source holds for 490 K to 600 K."),
        (480.0, 600.0, None),
    ],
)
def test_a_run_outside_the_range_of_a_law_says_so_first(
    low: float, high: float, said: str | None
) -> None:
    case = nitrosyl_chloride()
    valid = tuple(Sourced(T, "K", dimension="temperature") for T in (low, high))
    step = replace(case.steps[0], valid=valid)  # type: ignore[arg-type]
    run = integrate(replace(case, steps=(step,)))
    found = [text for text in grave_cautions(run, rate_constants(run)) if "its source" in text]
    assert found == ([] if said is None else [f"Step decomposition is {said}"])
    assert set(found) <= set(summary_of(run).cautions)
