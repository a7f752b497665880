"""Columns of derivatives against closed forms: times of events, maxima, ends of runs, pressures."""

from __future__ import annotations

import math
from dataclasses import replace

import kernel_problems as problems
import numpy as np
import pytest

from meanfree.constants import R
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.plan import RunPlan
from meanfree.integrate.many import many
from meanfree.integrate.observables import At, EndTime, HalfLife, Peak, ReactionTime
from meanfree.sourced import Sourced

K1, K2, A0 = 0.3, 0.7, 2.0
K_1, K_2, FILL = "steps.1.k", "steps.2.k", "fill.gases.A"


def in_a_row(until: float | None) -> Experiment:
    """A -> B -> C, first order, in one cubic metre."""
    e = problems.experiment(
        [problems.step("1", {"A": 1}, {"B": 1}, K1), problems.step("2", {"B": 1}, {"C": 1}, K2)],
        {"A": A0},
    )
    return replace(e, plan=RunPlan(None if until is None else Sourced(until, "s", "", "time")))


def test_events_and_maxima_move_as_their_formulas_say() -> None:
    """t(X) = -ln(1 - X)/k1, the half-lives are alike, B is most at ln(k1/k2)/(k1 - k2)."""
    asked = (ReactionTime("A", 0.9), HalfLife("A", 2), Peak("B"), At("concentration", "A", 2.0))
    addresses = (K_1, K_2, FILL, "run.until")
    columns = {K_1: np.array([K1, 2 * K1])}
    frame = many(in_a_row(20.0), columns, asked, sensitivities=addresses, rtol=1e-10, workers=1)
    for row, k1 in enumerate(columns[K_1]):

        def slope(column: str, address: str, row: int = row) -> float:
            return float(frame[f"d_{column}_by_{address}"][row])

        top, d = math.log(k1 / K2) / (k1 - K2), k1 - K2
        most = A0 * (K2 / k1) ** (K2 / d)
        expected = {
            ("reaction_time_A_0.9_s", K_1): -math.log(10) / k1**2,
            ("reaction_time_A_0.9_s", FILL): 0.0,
            ("half_life_A_2_s", K_1): -math.log(2) / k1**2,
            ("peak_time_B_s", K_1): 1 / (k1 * d) - top / d,
            ("peak_time_B_s", K_2): -1 / (K2 * d) + top / d,
            ("peak_amount_B_mol", FILL): most / A0,
            ("c_A_at_2_s_mol_per_m3", K_1): -2 * A0 * math.exp(-2 * k1),
            ("c_A_at_2_s_mol_per_m3", "run.until"): 0.0,
        }
        # the dense output, good to 1e-8 here, limits the turn of a flat maximum to 1e-6
        for (column, address), value in expected.items():
            near = 1e-6 if "time_B" in column else 1e-7
            assert slope(column, address) == pytest.approx(value, rel=near, abs=1e-8), column


def test_an_end_that_the_run_finds_moves() -> None:
    """99.9 % of A are gone at ln(1000)/k1, and at 99.9 % of the way to rest of A = B."""
    asked = (EndTime(), At("amount", "B"))
    frame = many(in_a_row(None), {K_1: [K1]}, asked, sensitivities=[K_1, FILL], workers=1)
    assert frame["d_end_s_by_steps.1.k"][0] == pytest.approx(-math.log(1000) / K1**2, rel=1e-6)
    assert frame["d_end_s_by_fill.gases.A"][0] == pytest.approx(0.0, abs=1e-6)
    # B = a k1/(k1 - k2) (1000^(-k2/k1) - 1/1000) at that end
    d, left = K1 - K2, 1000 ** (-K2 / K1)
    by_k1 = -A0 * K2 / d**2 * (left - 1e-3) + A0 / d * K2 / K1 * math.log(1000) * left
    assert frame["d_n_B_mol_by_steps.1.k"][0] == pytest.approx(by_k1, rel=1e-5)

    steps = [problems.step("f", {"A": 1}, {"B": 1}, 2.0), problems.step("r", {"B": 1}, {"A": 1}, 1)]
    settling = problems.experiment(steps, {"A": A0})
    frame = many(settling, {FILL: [A0]}, asked, sensitivities=["steps.f.k", FILL], workers=1)
    assert frame["end_s"][0] == pytest.approx(math.log(1000) / 3, rel=1e-6)
    assert frame["d_end_s_by_steps.f.k"][0] == pytest.approx(-math.log(1000) / 9, rel=1e-5)
    assert frame["d_end_s_by_fill.gases.A"][0] == pytest.approx(0.0, abs=1e-6)


def test_pressure_follows_fill_and_temperature() -> None:
    """One mole more in one cubic metre is R T more; A -> B leaves p = n R T/V."""
    asked, addresses = (At("total pressure"),), [FILL, "temperature.value", "vessel.volume"]
    frame = many(in_a_row(5.0), {FILL: [A0]}, asked, sensitivities=addresses, workers=1)
    expected = (R * 300.0, R * A0, -R * 300.0 * A0)
    for address, value in zip(addresses, expected, strict=True):
        assert frame[f"d_p_total_Pa_by_{address}"][0] == pytest.approx(value, rel=1e-7)
