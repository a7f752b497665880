"""Derivatives by the kernel: closed forms, differences of sharp runs, the same bits anywhere."""

from __future__ import annotations

import kernel_problems as problems
import numpy as np
import pytest
from sensitive_experiments import sensitive_experiment

from meanfree.equations.build import build_system
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs, with_inputs
from meanfree.integrate.conditions import Block
from meanfree.integrate.moves import moving
from meanfree.integrate.numbers import numbers_of
from meanfree.integrate.slopes import SlopeRunner
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.moving import MovingVariation
from meanfree.kernel.parameters import Variation
from meanfree.kernel.status import Ending
from meanfree.kernel.tangent_engine import TangentKernel
from meanfree.kernel.watching import Functional

T = np.array([0.5, 2.0, 8.0])


def alone(e: Experiment, addresses: list[str]) -> MovingVariation:
    """One condition, the experiment as it stands, moving along addresses."""
    base = numbers_of(e)
    block = Block(e, np.array([0]), Variation(base.system, 1), None, base.structure, None)
    return moving(block, {}, addresses)


def slopes(e: Experiment, addresses: list[str], times: np.ndarray, rtol: float) -> np.ndarray:
    """ds/dp [n_times, n_addresses, states] with the state before it."""
    part = alone(e, addresses)
    found = SlopeRunner(part, (rtol, 1e-20)).run(part, times[None], times[-1:])
    assert found.marks[0, 0] == Ending.REACHED
    return np.concatenate([found.y[0][:, None], found.s[0]], axis=1)


# Closed forms. The method reaches 1e-9 or so at rtol 1e-10 on these smooth problems.


def test_first_order_in_a_row() -> None:
    """A -> B -> C: B = a k1/(k2 - k1) (exp(-k1 t) - exp(-k2 t))."""
    k1, k2, a = 0.3, 0.7, 2.0
    e = problems.experiment(
        [problems.step("1", {"A": 1}, {"B": 1}, k1), problems.step("2", {"B": 1}, {"C": 1}, k2)],
        {"A": a},
    )
    found = slopes(e, ["steps.1.k", "steps.2.k", "fill.gases.A"], T, 1e-10)
    one, two, d = np.exp(-k1 * T), np.exp(-k2 * T), k2 - k1
    B = a * k1 / d * (one - two)
    by_k1 = a * k2 / d**2 * (one - two) - a * k1 / d * T * one
    by_k2 = -a * k1 / d**2 * (one - two) + a * k1 / d * T * two
    assert found[:, 0, 1] == pytest.approx(B, rel=1e-8)
    assert found[:, 1, 0] == pytest.approx(-T * a * one, rel=1e-8)
    assert found[:, 1, 1] == pytest.approx(by_k1, rel=1e-8, abs=1e-9)
    assert found[:, 2, 1] == pytest.approx(by_k2, rel=1e-8)
    assert found[:, 3, 1] == pytest.approx(B / a, rel=1e-8)


def test_second_order() -> None:
    """2 A -> B with k an event: A = a/(1 + 2 k a t)."""
    k, a = 0.4, 1.5
    e = problems.experiment([problems.step("1", {"A": 2}, {"B": 1}, k)], {"A": a})
    found = slopes(e, ["steps.1.k", "fill.gases.A"], T, 1e-10)
    below = 1 + 2 * k * a * T
    assert found[:, 1, 0] == pytest.approx(-2 * a**2 * T / below**2, rel=1e-8)
    assert found[:, 2, 0] == pytest.approx(1 / below**2, rel=1e-8)


def test_tangents_of_a_rest_are_those_of_the_equilibrium() -> None:
    """A = B with kf, kr: B at rest is a kf/(kf + kr), whatever the way there."""
    kf, kr, a = 2.0, 0.5, 3.0
    e = problems.experiment(
        [problems.step("f", {"A": 1}, {"B": 1}, kf), problems.step("r", {"B": 1}, {"A": 1}, kr)],
        {"A": a},
    )
    found = slopes(e, ["steps.f.k", "steps.r.k", "fill.gases.A"], np.array([50.0]), 1e-10)
    assert found[0, 1, 1] == pytest.approx(a * kr / (kf + kr) ** 2, rel=1e-8)
    assert found[0, 2, 1] == pytest.approx(-a * kf / (kf + kr) ** 2, rel=1e-8)
    assert found[0, 3, 1] == pytest.approx(kf / (kf + kr), rel=1e-8)


# Random experiments: every law, both vessels, all temperatures, dead space, breaks


def differenced(e: Experiment, address: str, end: float) -> np.ndarray:
    """Five-point difference of runs by the same kernel at 1e-12, itself held against Radau."""
    at = inputs(e)[address].value
    h = 2e-4 * (at if at != 0 else 1.0)
    ends = []
    for shift in (-2, -1, 1, 2):
        system = build_system(with_inputs(e, {address: at + shift * h}))
        found = Kernel(system, compiled=False).run(
            Variation(system, 1), Task(np.array([end]), rtol=1e-12)
        )
        assert found.marks[0, 0] == Ending.REACHED
        ends.append(found.ends[0, : system.size])
    before, near, after, far = ends
    return np.asarray((before - 8 * near + 8 * after - far) / (12 * h))


def disagreement(index: int, end: float = 60.0, rtol: float = 1e-8) -> list[float]:
    """Largest difference of a derivative from differences, over the size of the states, address
    by address: derivatives by the logarithm of what an address moves most."""
    e, addresses = sensitive_experiment(index, 3)
    part = alone(e, addresses)
    runner = SlopeRunner(part, (rtol, 1e-20))
    found = runner.run(part, np.array([[end]]), np.array([end]))
    if found.marks[0, 0] != Ending.REACHED:
        return []
    lengths, size = part.lengths(runner.kernel.plain), build_system(e).size
    worst = []
    for k, address in enumerate(addresses):
        expected = differenced(e, address, end)
        if not part.moves[k]:
            assert not np.any(found.s[0, 0, k])
            continue
        y, s = np.abs(found.y[0, 0, :size]), found.s[0, 0, k, :size]
        scale = np.maximum(y * float(lengths[k][0]), np.abs(expected)) + 1e-300
        scale += 1e-8 * y.sum() * float(lengths[k][0])
        worst.append(float(np.max(np.abs(s - expected) / scale)))
    return worst


@pytest.mark.parametrize("index", [0, 11, 37])
def test_against_differences_of_sharp_runs(index: int) -> None:
    """Isothermal, programmed and adiabatic. Differences of runs good to 1e-12 over steps of 2e-4
    are good to 1e-8, their next term, h^4/30 of the fifth derivative, to 1e-7 where a rate follows
    its input like exp(100 x)."""
    assert max(disagreement(index)) < 3e-7


# What a kernel promises


def network(count: int) -> MovingVariation:
    """Conditions of a random mechanism in a piston, moving along two k and a fill."""
    system = build_system(problems.random_network(7, n=4, m=5, holds="pressure"))
    plain = problems.spread(system, count, 7)
    first, second = list(plain.values)[:2]
    moves = (
        {first: plain.values[first]},
        {second: np.ones(1)},
        {("x", 0): np.array([1.0])},
    )
    return MovingVariation(system, count, plain.values, moves)


def test_same_bits_however_it_is_run() -> None:
    conditions, varied = network(11), frozenset(network(1).values)
    size = 4 * conditions.system.size
    watched = tuple(Functional(((i, 1.0),)) for i in range(size))
    task = Task(np.array([30.0]), rtol=1e-6, functionals=watched, grid=np.array([[0.5, 7.0]]))
    whole = TangentKernel(conditions, compiled=False, lanes=8, varied=varied).run(conditions, task)
    for compiled, lanes in ((False, 32), (True, 8)):
        kernel = TangentKernel(conditions, compiled=compiled, lanes=lanes, varied=varied)
        for start, stop in ((0, 11), (3, 4)):
            part = kernel.run(conditions.part(start, stop), task)
            assert np.array_equal(part.ends, whole.ends[start:stop])
            assert np.array_equal(part.values, whole.values[start:stop])
            assert np.array_equal(part.marks, whole.marks[start:stop])


def test_steps_with_row_exchanges_give_the_same_derivatives() -> None:
    """Every step made again with pivoting: the same numbers but for rounding."""
    conditions = network(2)
    kernel = TangentKernel(conditions, compiled=False, varied=frozenset(conditions.values))
    end = np.array([30.0])
    plain = kernel.run(conditions, Task(end, rtol=1e-8))
    pivoted = kernel.run(conditions, Task(end, rtol=1e-8, worst_multiplier=-1.0))
    assert np.all(pivoted.marks[:, 3] > 0)
    assert not np.any(plain.marks[:, 3])
    scale = np.abs(plain.ends).max(axis=0)
    # Rounding moves the choice of steps a little: an agreement of the tolerance, not of bits.
    assert np.all(np.abs(pivoted.ends - plain.ends) <= 1e-6 * scale)


def test_uncontrolled_derivatives_take_the_steps_of_the_state() -> None:
    conditions = network(3)
    varied, task = frozenset(conditions.values), Task(np.array([30.0]), rtol=1e-6)
    plain = Kernel(conditions.system, compiled=False, varied=varied)
    kernel = TangentKernel(conditions, compiled=False, varied=varied, controlled=False)
    assert np.array_equal(kernel.run(conditions, task).marks, plain.run(conditions, task).marks)


def test_breaks_that_part_are_refused_by_name() -> None:
    e, _ = sensitive_experiment(21)
    with pytest.raises(InputError, match=r"temperature\.points\.0\.time"):
        alone(e, ["temperature.points.0.time"])
    with pytest.raises(InputError, match="an unknown address"):
        alone(e, ["steps.none.k"])
