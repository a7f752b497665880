"""Covariance of fitted parameters, and what is said where the residuals do not depend on one."""

from __future__ import annotations

from typing import Final

import numpy as np

from meanfree.equations.system import Floats
from meanfree.measured.least_squares import Solution

BLIND: Final[float] = 1e-6
"""Singular values below this share of the largest say nothing: differences are good to 1e-7."""


def influence(solution: Solution) -> tuple[Floats, Floats]:
    """psi and its derivative by the residual, each [shape (m,)]: r and 1 without a robust loss."""
    r, width, loss = solution.residuals, solution.width, solution.loss
    z = (r / width) ** 2
    if loss == "soft_l1":
        first, second = (1 + z) ** -0.5, -0.5 * (1 + z) ** -1.5
    elif loss == "huber":
        outer = z > 1
        safe = np.where(outer, z, 1.0)
        first = np.where(outer, safe**-0.5, 1.0)
        second = np.where(outer, -0.5 * safe**-1.5, 0.0)
    elif loss == "cauchy":
        first, second = 1 / (1 + z), -1 / (1 + z) ** 2
    else:
        first, second = np.ones_like(z), np.zeros_like(z)
    return r * first, first + 2 * z * second


def without_voice(norms: Floats) -> np.ndarray:
    """Which parameters the residuals do not depend on, from the norms of their scaled columns."""
    return np.asarray(norms <= BLIND * float(norms.max(initial=0.0)))


def covariance(solution: Solution) -> Floats:
    """Covariance of the parameters for residuals of unit deviation [shape (n, n)].

    (J^T J)^-1, by the singular values of J scaled to unit columns; parameters on a bound get
    zeros, and directions that no residual depends on get infinity. With a robust loss the
    factor of Huber (Robust Statistics, 1981, section 7.6) is on it.
    """
    n = len(solution.values)
    cov = np.zeros((n, n))
    free = np.flatnonzero(solution.free)
    if not len(free):
        return cov
    J = solution.jacobian[:, free]
    norm = np.linalg.norm(J, axis=0)
    silent = without_voice(norm * solution.size[free])
    safe = np.where(silent | (norm == 0), 1.0, norm)
    J = np.where(silent, 0.0, J)
    _, s, vt = np.linalg.svd(J / safe, full_matrices=False)
    blind = s <= BLIND * s[0] if len(s) and s[0] > 0 else np.ones(len(s), bool)
    weights = np.where(blind, 0.0, 1.0 / np.where(blind, 1.0, s) ** 2)
    inner = (vt.T * weights) @ vt
    loose = np.any(np.abs(vt[blind]) > 1e-4, axis=0) | silent
    inner[loose, :], inner[:, loose] = np.nan, np.nan
    inner[loose, loose] = np.inf
    part = inner / np.outer(safe, safe)
    psi, slope = influence(solution)
    if solution.loss != "linear":
        m, p = len(psi), len(free)
        part = part * (float(psi @ psi) / max(m - p, 1)) / float(np.mean(slope)) ** 2
    cov[np.ix_(free, free)] = part
    return cov
