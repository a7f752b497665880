"""Maps against closed forms, and each reason against its own bound."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from laboratory import step
from planned_cases import arrhenius, planned, quantity
from small_cases import load_text

from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.gases.identity import find_gas
from meanfree.planning.request import PlanRequest
from meanfree.planning.window import Window, axis, window
from meanfree.planning.window_reasons import Axis, over_the_limit

R = 8.31446261815324
A, EA = 1e8, 100e3
COLD, HOT, LEAN, RICH = 440.0, 560.0, 2.0, 200.0
PLAN = PlanRequest(warm_up=quantity(30.0, "time"), patience=quantity(150.0, "time"))


def second_order(**options: object) -> Experiment:
    """2 A -> 3 B, filled by concentration at 500 K."""
    steps = [step("2 A -> 3 B", arrhenius(A, EA), "s", **options)]
    return planned(steps, {"A": 20.0, "N": 20.0}, T=500.0, fill_at=500.0)


def mapped(
    case: Experiment, plan: PlanRequest = PLAN, level: float = 0.5, count: int = 40
) -> Window:
    known = inputs(case)
    across = axis(known["temperature.value"], COLD, HOT, count)
    return window(case, PLAN, 0.5, across, axis(known["fill.gases.A"], LEAN, RICH, count))


def closed_form(found: Window, X: float = 0.5) -> np.ndarray:
    T, c0 = np.meshgrid(found.across.values, found.up.values)
    return np.asarray(X / (1 - X) / (2 * A * np.exp(-EA / (R * T)) * c0))


def test_times_and_time_bounds_against_the_closed_form() -> None:
    found = mapped(second_order())
    wanted = closed_form(found)
    reached = wanted < found.until
    assert (np.isfinite(found.time) == reached).mean() > 0.99
    both = np.isfinite(found.time) & reached
    # The map's runs have a relative tolerance of 1e-6.
    np.testing.assert_allclose(found.time[both], wanted[both], rtol=2e-5)
    # A point may fall on either side where its time is within 2e-5 of the bound: none is.
    np.testing.assert_array_equal(found.regions["shorter than the warm-up"], wanted < 30.0)
    np.testing.assert_array_equal(found.regions["longer than patience"], wanted > 150.0)
    usable = (wanted >= 30.0) & (wanted <= 150.0)
    np.testing.assert_array_equal(found.usable, usable)
    assert found.base == (500.0, 20.0)
    k = A * math.exp(-EA / (R * 500.0))
    assert found.base_time == pytest.approx(1 / (2 * k * 20.0), rel=2e-5)
    assert found.middle is not None
    assert found.usable[found.middle]
    assert found.unsaid["shorter than mixing"] == "a mass or a diameter is not known"
    assert found.unsaid["stopped by equilibrium"] == "one-way steps: s"


def test_rated_pressure() -> None:
    case = second_order()
    rated = quantity(4e5, "pressure")
    case = replace(case, vessel=replace(case.vessel, rated_pressure=rated))
    found = mapped(case)
    T, c0 = np.meshgrid(found.across.values, found.up.values)
    k, until = A * np.exp(-EA / (R * T)), found.until
    y = 2 * k * c0 * until
    # Highest at the end: 2 A -> 3 B gains half a mole for each mole of A.
    highest = (c0 * (1 + 0.5 * y / (1 + y)) + 20.0) * R * T
    np.testing.assert_allclose(found.pressure, highest, rtol=1e-5)
    np.testing.assert_array_equal(found.regions["above the rated pressure"], highest > 4e5)


def test_equilibrium() -> None:
    dH, K500 = -60e3, 2.0
    back = GivenEquilibrium(
        "K", quantity(K500, "pure"), quantity(500.0, "temperature"), quantity(dH, "molar energy")
    )
    case = planned([step("A -> B", arrhenius(A, EA, 1.0), "s", reverse=back)], {"A": 20.0}, T=500.0)
    known = inputs(case)
    across = axis(known["temperature.value"], COLD, HOT, 41)
    found = window(case, PLAN, 0.5, across, axis(known["vessel.volume"], 1e-3, 2e-3, 15))
    K = K500 * np.exp(-dH / R * (1 / across.values - 1 / 500.0))
    # K/(1 + K) < 1/2 above 525 K. The margin is interpolated between 14 temperatures, 9 K apart,
    # in ln of a smooth function: within a tenth of a grid step of 3 K.
    stopped = found.regions["stopped by equilibrium"]
    assert (stopped == stopped[0]).all()
    np.testing.assert_array_equal(stopped[0], K < 1.0)
    # What equilibrium stops does not count as impatience.
    assert not (found.regions.get("longer than patience", ~stopped) & stopped).any()


def test_collision_limit_and_mixing() -> None:
    gases = [find_gas(name) for name in ("NO2", "NO", "O2")]
    fast = planned(
        [step("2 NO2 -> 2 NO + O2", arrhenius(1e12, EA), "s")], {"NO2": 20.0}, T=500.0, gases=gases
    )
    known = inputs(fast)
    across = axis(known["temperature.value"], COLD, HOT, 12)
    found = window(fast, PLAN, 0.5, across, axis(known["fill.gases.NO2"], 1.0, 100.0, 12))
    # A = 1e12 m^3/mol/s is a few thousand times Z (about 1e8) at any temperature.
    assert found.regions["above the collision limit"].all()
    assert found.middle is None
    slow = planned(
        [step("2 NO2 -> 2 NO + O2", arrhenius(1e6, EA), "s")], {"NO2": 20.0}, T=500.0, gases=gases
    )
    assert over_the_limit(slow) < 0.1
    assert over_the_limit(fast) > 1e3


def test_condensation(tmp_path: Path) -> None:
    case = load_text(
        tmp_path,
        'title = "Iodine"\n[vessel]\nholds = "volume"\nvolume = "1 L"\n'
        '[temperature]\nmode = "isothermal"\nvalue = "600 K"\n'
        '[fill]\ngases = { H2 = "100 torr", I2 = "5 torr" }\nat = "350 K"\n'
        '[[steps]]\nname = "s"\nreaction = "H2 + I2 -> 2 HI"\nlaw = "arrhenius"\n'
        'A = "1e11 L/mol/s"\nEa = "165 kJ/mol"\n[plan]\npatience = "8 h"\n',
    )
    known = inputs(case.experiment)
    across = axis(known["temperature.value"], 550.0, 700.0, 12)
    up = axis(known["fill.gases.I2"], 1.0, 60.0, 60)
    found = window(case.experiment, case.planning, 0.5, across, up)
    condensing = found.regions["condensing"]
    assert (condensing[:, :1] == condensing).all()  # it is the filling at 350 K that condenses
    first = float(up.values[np.flatnonzero(condensing[:, 0])[0]])
    # Vapour pressure of I2 at 77 degC: about 11 torr (CRC Handbook; from memory).
    assert 8.0 < first < 14.0


def test_axes() -> None:
    known = inputs(second_order())
    wide = axis(known["fill.gases.A"], 1.0, 100.0, 3)
    assert wide.is_geometric
    assert wide.values == pytest.approx([1.0, 10.0, 100.0])
    narrow = axis(known["temperature.value"], 400.0, 500.0, 3)
    assert isinstance(narrow, Axis)
    assert not narrow.is_geometric
    with pytest.raises(InputError, match="a lower and a higher value"):
        axis(known["temperature.value"], 500.0, 400.0)


def test_impossible_values_are_refused_before_any_run() -> None:
    case = second_order()
    known = inputs(case)
    across = axis(known["temperature.value"], -10.0, 400.0, 12)
    with pytest.raises(InputError, match=r"temperature\.value"):
        window(case, PLAN, 0.5, across, axis(known["fill.gases.A"], 1.0, 2.0, 12))
