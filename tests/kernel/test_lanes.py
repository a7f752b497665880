"""A condition gives the same bits alone, permuted, in any lane, in any chunk, compiled or not."""

from __future__ import annotations

import kernel_problems as problems
import numpy as np
import pytest

from meanfree.equations.build import build_system
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.records import Kept
from meanfree.kernel.watching import Functional

COUNT = 23


def task(automatic: bool = False) -> Task:
    watched = (
        Functional(((0, 1.0),), levels=np.array([[0.4, 0.2, 0.1]])),
        Functional(((1, 1.0),), peak=True),
    )
    end = None if automatic else np.array([30.0])
    return Task(end, rtol=1e-6, functionals=watched, grid=np.array([[0.5, 7.0]]), watched=0)


@pytest.fixture(scope="module")
def conditions() -> Variation:
    system = build_system(problems.random_network(7, holds="pressure"))
    return problems.spread(system, COUNT, 7)


def rearranged(conditions: Variation, order: np.ndarray) -> Variation:
    values = {name: value[order] for name, value in conditions.values.items()}
    return Variation(conditions.system, len(order), values)


def assert_same_bits(first: Kept, second: Kept, order: np.ndarray | slice = slice(None)) -> None:
    for name, left, right in zip(first._fields, first, second, strict=True):
        if len(left):
            assert np.array_equal(left[order], right, equal_nan=True), name


@pytest.mark.parametrize("automatic", [False, True])
def test_same_bits_however_it_is_run(conditions: Variation, automatic: bool) -> None:
    kernels = {
        (compiled, lanes): Kernel(conditions.system, compiled=compiled, lanes=lanes)
        for compiled, lanes in ((False, 8), (False, 32), (True, 8))
    }
    what = task(automatic)
    whole = kernels[False, 8].run(conditions, what)
    for kernel in kernels.values():
        assert_same_bits(whole, kernel.run(conditions, what))
    order = np.random.default_rng(0).permutation(COUNT)
    permuted = kernels[False, 8].run(rearranged(conditions, order), what)
    assert_same_bits(whole, permuted, order)
    for start, stop in ((0, 9), (9, 10), (10, COUNT)):
        part = kernels[False, 32].run(conditions.part(start, stop), what)
        assert_same_bits(whole, part, slice(start, stop))
