"""Stiff kinetics with published solutions, through the whole path of a single run."""

from __future__ import annotations

import numpy as np
import pytest
from laboratory import experiment, step

from meanfree.experiment.plan import Solver
from meanfree.integrate.single import integrate

# Robertson (1966); reference values at t = 1e11 from the Bari/CWI test set for IVP solvers
# and Hairer & Wanner, Solving Ordinary Differential Equations II. All printed digits.
ROBER_END = np.array([2.0833401497e-08, 8.33336077033e-14, 0.999999979167])

# Schafer (1975), Gottwald (1977); reference values at t = 321.8122 from the IVP test set.
HIRES_END = np.array(
    [
        0.000737131257333,
        0.000144248572632,
        5.88872974097e-05,
        0.00117565134328,
        0.00238635619883,
        0.00623896825274,
        0.00284999839519,
        0.00285000160481,
    ]
)


def rober():
    steps = [
        step("A -> B", 0.04),
        step("2 B -> B + C", 3e7),
        step("B + C -> A + C", 1e4),
    ]
    return experiment(steps, {"A": 1.0}, until=1e11)


def hires():
    """As a mechanism: conversions of labels, one bimolecular step, and a zero-order source."""
    steps = [
        step("y1 -> y2", 1.71),
        step("y2 -> y1", 0.43),
        step("y3 -> y1", 8.32),
        step(" -> y1", 0.0007, "source"),
        step("y2 -> y4", 8.32),
        step("y3 -> y4", 1.71),
        step("y4 -> y3", 0.43),
        step("y5 -> y3", 0.035),
        step("y4 -> y6", 0.69),
        step("y5 -> y6", 1.71),
        step("y6 -> y5", 0.43),
        step("y7 -> y5 + y8", 0.43),
        step("y6 + y8 -> y7", 280.0),
        step("y7 -> y6 + y8", 0.69),
        step("y7 -> y8", 0.69),
    ]
    gases = [f"y{i}" for i in range(1, 9)]
    fill = dict.fromkeys(gases, 0.0) | {"y1": 1.0, "y8": 0.0057}
    return experiment(steps, fill, until=321.8122)


# What Radau, BDF and LSODA reach at rtol 1e-8: Radau's error control is of third order while
# the method is of fifth, so it is far better than asked; the multistep methods add up about
# ten tolerances over thousands of steps.
REACHED = {"Radau": 1e-8, "BDF": 1e-6, "LSODA": 1e-6}


@pytest.mark.parametrize("method", REACHED)
def test_rober_to_1e11(method):
    run = integrate(rober(), Solver(method))
    assert run.state(1e11)[:3, 0] == pytest.approx(ROBER_END, rel=REACHED[method], abs=0)


@pytest.mark.parametrize("method", REACHED)
def test_hires(method):
    run = integrate(hires(), Solver(method))
    assert run.state(run.end)[:8, 0] == pytest.approx(HIRES_END, rel=REACHED[method], abs=0)


def test_hires_is_the_published_system():
    """The mechanism gives the published right-hand side at a made-up point."""
    from meanfree.equations.arrays import ArrayEquations
    from meanfree.equations.build import build_system

    system = build_system(hires())
    y = np.linspace(0.1, 0.8, 8)
    y1, y2, y3, y4, y5, y6, y7, y8 = y
    published = [
        -1.71 * y1 + 0.43 * y2 + 8.32 * y3 + 0.0007,
        1.71 * y1 - 8.75 * y2,
        -10.03 * y3 + 0.43 * y4 + 0.035 * y5,
        8.32 * y2 + 1.71 * y3 - 1.12 * y4,
        -1.745 * y5 + 0.43 * y6 + 0.43 * y7,
        -280 * y6 * y8 + 0.69 * y4 + 1.71 * y5 - 0.43 * y6 + 0.69 * y7,
        280 * y6 * y8 - 1.81 * y7,
        -280 * y6 * y8 + 1.81 * y7,
    ]
    state = np.concatenate([y, np.zeros(system.n_ledger)])
    ours = ArrayEquations(system).derivative(0.0, state, system.segments[0])[:8]
    assert ours == pytest.approx(published, rel=1e-13, abs=1e-13)
