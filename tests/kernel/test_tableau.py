"""The Rosenbrock coefficients satisfy what makes them a method of their order."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from meanfree.kernel.tableau import TABLEAUX, Tableau

# Rooted trees as nested tuples: a tree is the tuple of what hangs on its root.
LEAF = ()


def trees(order: int) -> list[tuple]:
    """All rooted trees with ``order`` vertices."""
    if order == 1:
        return [LEAF]
    found = set()
    for parts in partitions(order - 1):
        for choice in product_of([trees(p) for p in parts]):
            found.add(tuple(sorted(choice)))
    return sorted(found)


def partitions(n: int, largest: int | None = None) -> list[list[int]]:
    largest = n if largest is None else largest
    if n == 0:
        return [[]]
    return [[k, *rest] for k in range(min(n, largest), 0, -1) for rest in partitions(n - k, k)]


def product_of(options: list[list]) -> list[tuple]:
    if not options:
        return [()]
    return [(first, *rest) for first in options[0] for rest in product_of(options[1:])]


def size(tree: tuple) -> int:
    return 1 + sum(size(branch) for branch in tree)


def density(tree: tuple) -> int:
    """gamma(t) of Butcher's theory."""
    result = size(tree)
    for branch in tree:
        result *= density(branch)
    return result


def stage_vector(tree: tuple, alpha: np.ndarray, beta: np.ndarray) -> np.ndarray:
    """Inner sums of Hairer and Wanner II, IV.7: beta below a single branch, alpha below many."""
    if tree == LEAF:
        return np.ones(len(alpha))
    if len(tree) == 1:
        return beta @ stage_vector(tree[0], alpha, beta)
    product = np.ones(len(alpha))
    for branch in tree:
        product = product * (alpha @ stage_vector(branch, alpha, beta))
    return product


def residuals(method: Tableau, weights: np.ndarray, order: int, theta: float = 1.0) -> list[float]:
    """weights^T (I/gamma - C)^-1 phi(tree) - theta^|tree|/density(tree) for trees up to an
    order."""
    alpha, Gamma, _ = method.classical()
    beta = alpha + Gamma
    b = weights @ Gamma
    return [
        float(b @ stage_vector(tree, alpha, beta)) - theta ** size(tree) / density(tree)
        for n in range(1, order + 1)
        for tree in trees(n)
    ]


def embedded(method: Tableau) -> np.ndarray:
    weights = method.weights
    weights[-1] -= 1.0
    return weights


def dense_weights(method: Tableau, theta: float) -> np.ndarray:
    """Weights of y(theta) - y0 on the scaled stages."""
    inner = np.zeros(method.stages)
    for column in reversed(range(method.dense.shape[1])):
        inner = method.dense[:, column] + theta * inner
    return theta * (method.weights + (1 - theta) * inner)


def test_tree_counts() -> None:
    # Numbers of rooted trees: Hairer, Norsett and Wanner I, table II.2.1.
    assert [len(trees(n)) for n in range(1, 7)] == [1, 1, 2, 4, 9, 20]


# The coefficients are printed to 16 digits; those of up to 165 enter, hence 1e-12.
BOUND = 2e-12


@pytest.mark.parametrize("name", TABLEAUX)
def test_order_conditions(name: str) -> None:
    method = TABLEAUX[name]
    assert np.max(np.abs(residuals(method, method.weights, method.order))) < BOUND
    assert np.max(np.abs(residuals(method, method.weights, method.order + 1))) > 1e-6
    assert np.max(np.abs(residuals(method, embedded(method), method.error_order))) < BOUND
    assert np.max(np.abs(residuals(method, embedded(method), method.order))) > 1e-6


@pytest.mark.parametrize("name", TABLEAUX)
@pytest.mark.parametrize("theta", [0.1, 0.37, 0.5, 0.9])
def test_dense_output_order(name: str, theta: float) -> None:
    method = TABLEAUX[name]
    order = method.order - 1
    worst = np.max(np.abs(residuals(method, dense_weights(method, theta), order, theta)))
    assert worst < 5e-12


@pytest.mark.parametrize("name", TABLEAUX)
def test_stability_function(name: str) -> None:
    """L-stable: R(inf) = 0, |R| <= 1 on the imaginary axis; the embedded method likewise."""
    method = TABLEAUX[name]
    alpha, Gamma, _ = method.classical()
    beta = alpha + Gamma
    for weights in (method.weights, embedded(method)):
        b = weights @ Gamma

        def R(z: complex, b: np.ndarray = b) -> complex:
            ones = np.ones(method.stages)
            return 1 + z * (b @ np.linalg.solve(np.eye(method.stages) - z * beta, ones))

        assert abs(R(-1e8)) < 1e-6
        axis = 1j * np.concatenate([np.linspace(0.001, 100, 2000), np.geomspace(100, 1e8, 100)])
        if weights is not method.weights:
            continue
        assert max(abs(R(z)) for z in axis) <= 1 + 1e-9


@pytest.mark.parametrize("name", TABLEAUX)
def test_stiffly_accurate(name: str) -> None:
    method = TABLEAUX[name]
    alpha, Gamma, b = method.classical()
    # The last stage's argument plus itself is y1: alpha_s + gamma_s = b.
    assert np.allclose(alpha[-1] + Gamma[-1], b, atol=1e-12)


def test_dense_output_is_nearly_as_good_as_its_free_weights_can_make_it() -> None:
    """The last stage of Rodas5P is a difference of fifth order: no order condition of the dense
    output sees its weights there. What they decide is the leading error, and the least possible one
    is found here: the published weights come within 1.29 of it (without them it is 4.6 times).
    """
    method, thetas = TABLEAUX["Rodas5P"], np.linspace(0.05, 0.95, 10)

    def leading(free: np.ndarray) -> np.ndarray:
        dense = method.dense.copy()
        dense[-1] = free
        other = replace(method, dense=dense)
        # the nine trees of order five come last
        rows = [residuals(other, dense_weights(other, theta), 5, theta)[-9:] for theta in thetas]
        return np.concatenate(rows)

    # linear in the weights: the least squares are exact
    zero = leading(np.zeros(3))
    columns = np.column_stack([leading(unit) - zero for unit in np.eye(3)])
    best, *_ = np.linalg.lstsq(columns, -zero, rcond=None)
    least = np.linalg.norm(leading(best))
    assert np.linalg.norm(leading(method.dense[-1])) < 1.3 * least
