"""Stiff kinetics with published solutions, through the whole path of a single run."""

from __future__ import annotations

import numpy as np
import pytest
from published_problems import HIRES_END, ROBER_END, hires, ladder, rober

from meanfree.experiment.plan import Solver
from meanfree.integrate.single import integrate

# What Radau, BDF and LSODA reach at rtol 1e-8: Radau's error control is of third order while
# the method is of fifth, so it is far better than asked; the multistep methods add up about
# ten tolerances over thousands of steps.
REACHED = {"Radau": 1e-8, "BDF": 1e-6, "LSODA": 1e-6}


@pytest.mark.parametrize("method", REACHED)
def test_rober_to_1e11(method, checked):
    run = integrate(rober(), Solver(method))
    source = "Robertson (1966); test set for IVP solvers"
    for ours, exact in zip(run.state(1e11)[:3, 0], ROBER_END, strict=True):
        name = f"ROBER at 1e11, {method}"
        checked(name, ours, f"{exact:.12g}", "", source, rel=REACHED[method])


@pytest.mark.parametrize("method", REACHED)
def test_hires(method, checked):
    run = integrate(hires(), Solver(method))
    source = "Schäfer (1975); test set for IVP solvers"
    for ours, exact in zip(run.state(run.end)[:8, 0], HIRES_END, strict=True):
        name = f"HIRES at 321.8122, {method}"
        checked(name, ours, f"{exact:.12g}", "", source, rel=REACHED[method])


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


def test_cost_grows_linearly_with_the_mechanism():
    """Entries of the Jacobian and of the index arrays a gas stay the same from 100 to 1,000."""
    from meanfree.equations.arrays import ArrayEquations
    from meanfree.equations.build import build_system

    per_gas = []
    for n in (100, 1000):
        system = build_system(ladder(n))
        equations = ArrayEquations(system)
        jacobian = equations.jacobian(0.0, system.initial_state + 1.0, system.segments[0])
        arrays = (system.net.value, system.orders.value, equations.term_gas)
        per_gas.append((jacobian.nnz / n, sum(a.size for a in arrays) / n))
    # five diagonals and four steps a gas, less what the two ends lack (about 1/n)
    assert per_gas[0] == pytest.approx(per_gas[1], rel=0.03)
    assert per_gas[1][0] == pytest.approx(5.0, rel=0.01)


def test_a_thousand_gases_are_solved_with_sparse_arrays():
    """Against the same mechanism through the compiled path, where that is small enough."""
    from meanfree.equations.arrays import ArrayEquations
    from meanfree.equations.build import build_system
    from meanfree.integrate.stepping import equations_for, step_through

    large = integrate(ladder(1000, until=10.0), Solver("BDF", rtol=1e-6, atol=1e-14))
    assert isinstance(equations_for(large.system), ArrayEquations)
    assert large.amounts(10.0).sum() == pytest.approx(large.amounts(0.0).sum(), rel=1e-9)
    small = build_system(ladder(30, until=10.0))
    ends = [
        step_through(equations, Solver(), 10.0).trajectory(10.0)[:, 0]
        for equations in (ArrayEquations(small), equations_for(small))
    ]
    assert ends[0] == pytest.approx(ends[1], rel=1e-8, abs=1e-16)
