"""What a gauge sees of a run, against closed forms and a difference of the run itself."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from scipy.constants import R
from small_cases import GOOD, PISTON, load_text

from meanfree.integrate.gauge import first_shown, initial_slope
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate

TORR = 101325 / 760


def run_of(folder: Path, text: str) -> Run:
    return integrate(load_text(folder, text).experiment)


def test_the_slope_of_a_second_order(tmp_path: Path) -> None:
    """2 NOCl -> 3 molecules: dp/dt = (RT) k c^2 at the start, every number from the case."""
    run = run_of(tmp_path, GOOD)
    k = 9.4e6 * math.exp(-102e3 / (R * 480))
    c = 50 * TORR / (R * 296)
    assert initial_slope(run) == pytest.approx(R * 480 * k * c**2, rel=1e-9)


def test_a_gauge_first_shows_a_change_where_the_pressure_says(tmp_path: Path) -> None:
    """p - p0 = p_A0 X/2 with X = 2kct/(1 + 2kct): t = X/(1 - X)/(2 k c)."""
    run = run_of(tmp_path, GOOD)
    k = 9.4e6 * math.exp(-102e3 / (R * 480))
    c = 50 * TORR / (R * 296)
    X = 2 * 0.1 * TORR / (c * R * 480)
    # the integrator's rtol of 1e-8 on the small difference of two pressures
    assert first_shown(run, 0.1 * TORR) == pytest.approx(X / (1 - X) / (2 * k * c), rel=1e-5)
    assert first_shown(run, 1e5) is None


def test_dead_space_softens_the_slope(tmp_path: Path) -> None:
    text = GOOD.replace(
        'volume = "1.8 L"',
        'volume = "1.8 L"\ndead_space = { volume = "300 mL", temperature = "296 K" }',
    )
    run = run_of(tmp_path, text)
    h = 1e-6 * run.end  # a thousandth of a half-life
    p = [float(run.pressure(t)[0]) for t in (0.0, h, 2 * h)]
    # what the one-sided difference leaves is about (h/half-life)^2 and the integrator's 1e-8 over
    # the 1e-4 by which the pressure has moved
    slope = (-3 * p[0] + 4 * p[1] - p[2]) / (2 * h)
    assert initial_slope(run) == pytest.approx(slope, rel=1e-3)


def test_heat_and_programs_count(tmp_path: Path) -> None:
    """A bulb that warms up at 1 K/s without reacting: dp/dt = p/T times that."""
    text = (
        GOOD.replace(
            'mode = "isothermal"\nvalue = "480 K"',
            ('mode = "program"\npoints = [["0 s", "300 K"], ["100 s", "400 K"]]'),
        )
        .replace('until = "auto"', 'until = "100 s"')
        .replace("9.4e9", "9.4e-9")
    )
    run = run_of(tmp_path, text)
    p0 = 185 * TORR * 300 / 296
    assert initial_slope(run) == pytest.approx(p0 / 300, rel=1e-9)


def test_a_piston_has_no_slope(tmp_path: Path) -> None:
    assert initial_slope(run_of(tmp_path, PISTON)) is None
