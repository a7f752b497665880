"""Nodes and matrices of Radau IIA with seven and four stages, in double precision."""

from __future__ import annotations

import numpy as np
from scipy.special import roots_jacobi


def collocation(stages: int) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and the matrix of Radau IIA: a_ij the integral of Lagrange polynomial j to c_i."""
    nodes = np.append((roots_jacobi(stages - 1, 1, 0)[0] + 1) / 2, 1.0)
    points, weights = np.polynomial.legendre.leggauss(stages)
    a = np.empty((stages, stages))
    for j in range(stages):
        others = np.delete(nodes, j)
        for i, c in enumerate(nodes):
            t = c * (points + 1) / 2
            lagrange = np.prod((t[:, None] - others) / (nodes[j] - others), axis=1)
            a[i, j] = c / 2 * weights @ lagrange
    return nodes, a


NODES7, A7 = collocation(7)
NODES4, A4 = collocation(4)
BETWEEN = np.array(
    [
        [c / own * np.prod([(c - o) / (own - o) for o in NODES7 if o != own]) for own in NODES7]
        for c in NODES4
    ]
)
"""Increments at the four nodes, from the polynomial through those at the seven and 0."""
