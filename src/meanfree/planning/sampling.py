"""Quasi-random designs: uncertain numbers drawn together, bands, and Sobol indices."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Inverse = Callable[[Floats], Floats]
"""The inverse of a cumulative distribution: numbers in (0, 1) to values."""

SEED = 20240229
"""Scrambles the sequence, always alike, so that results can be repeated."""


def sobol_points(dimensions: int, exponent: int, seed: int = SEED) -> Floats:
    """2^exponent scrambled points of a Sobol sequence in (0, 1), shape (2^exponent, dimensions).

    Source: A. B. Owen, J. Complexity 14, 466 (1998) (scrambling); scipy.stats.qmc.
    """
    from scipy.stats import qmc

    points = qmc.Sobol(dimensions, scramble=True, rng=seed).random_base2(exponent)
    tiny = 2.0**-60
    return np.asarray(np.clip(points, tiny, 1.0 - 2.0**-53))


def normal_scores(points: Floats) -> Floats:
    """Standard normal numbers from numbers in (0, 1), any shape."""
    from scipy.special import ndtri

    return np.asarray(ndtri(points))


@dataclass(frozen=True)
class Indices:
    """Sobol indices of each input: first order and total [1], shape (n_inputs, n_outputs).

    ``first_error`` and ``total_error`` are standard errors from resampling; ``variance`` of
    each output [shape (n_outputs,)]; ``runs`` the number of evaluations.
    """

    first: Floats
    total: Floats
    first_error: Floats
    total_error: Floats
    variance: Floats
    runs: int


def sobol_design(dimensions: int, exponent: int, seed: int = SEED) -> Floats:
    """Points at which a function must be known, shape ((d + 2) 2^exponent, d).

    Two designs A and B from one sequence in 2 d dimensions, then A with one column after
    the other from B. Source: A. Saltelli et al., Comput. Phys. Commun. 181, 259 (2010).
    """
    both = sobol_points(2 * dimensions, exponent, seed)
    A, B = both[:, :dimensions], both[:, dimensions:]
    blocks = [A, B]
    for i in range(dimensions):
        mixed = A.copy()
        mixed[:, i] = B[:, i]
        blocks.append(mixed)
    return np.concatenate(blocks)


def sobol_indices(outputs: Floats, dimensions: int, resamples: int = 200) -> Indices:
    """Indices from a function's values at `sobol_design`, shape ((d + 2) N, n_outputs).

    First order: mean(f_B (f_AB - f_A))/V, with f centred (Saltelli 2010, eq. b); total:
    mean((f_A - f_AB)^2)/2V (Jansen, Comput. Phys. Commun. 117, 35 (1999)). Rows with a value
    that is not finite are left out of every block.
    """
    values = outputs.reshape(dimensions + 2, -1, outputs.shape[-1])
    good = np.isfinite(values).all(axis=(0, 2))
    values = values[:, good]
    first, total, variance = _indices(values)
    random = np.random.default_rng(SEED)
    n = values.shape[1]
    drawn = [_indices(values[:, random.integers(0, n, n)])[:2] for _ in range(resamples)]
    errors = [np.std([entry[i] for entry in drawn], axis=0) for i in (0, 1)]
    return Indices(first, total, errors[0], errors[1], variance, outputs.shape[0])


def _indices(values: Floats) -> tuple[Floats, Floats, Floats]:
    f_A, f_B, f_AB = values[0], values[1], values[2:]
    centre = 0.5 * (f_A.mean(axis=0) + f_B.mean(axis=0))
    variance = np.concatenate([f_A, f_B]).var(axis=0)
    safe = np.where(variance > 0, variance, np.inf)
    first = np.mean((f_B - centre) * (f_AB - f_A), axis=1) / safe
    total = 0.5 * np.mean((f_A - f_AB) ** 2, axis=1) / safe
    return first, total, variance


@dataclass(frozen=True)
class Uncertain:
    """One uncertain input as a standard normal deviation: its address, and how it moves numbers.

    ``spread`` "factor": value exp(size z); "absolute": value + size z, in the unit of the file.
    ``addresses`` all move alike (the two limits of a falloff step).
    """

    name: str
    addresses: tuple[str, ...]
    spread: str
    size: float
    origin: str = ""


def conditions_of(
    uncertain: Sequence[Uncertain],
    correlation: Floats,
    base: dict[str, float],
    lowest: dict[str, float],
    scores: Floats,
) -> dict[str, Floats]:
    """Values at every address for independent standard normal ``scores`` [shape (n, n_inputs)].

    ``correlation`` [shape (n_inputs, n_inputs)] joins the deviations by its Cholesky factor; an
    address that several inputs move has their effects multiplied (factors) and added (absolute).
    ``lowest`` bounds a value that a normal deviation could make impossible.
    """
    z = scores @ np.linalg.cholesky(correlation).T
    values: dict[str, Floats] = {}
    for column, entry in enumerate(uncertain):
        for address in entry.addresses:
            now = values.get(address, np.full(len(z), base[address]))
            if entry.spread == "factor":
                now = now * np.exp(entry.size * z[:, column])
            else:
                now = np.maximum(now + entry.size * z[:, column], lowest[address])
            values[address] = now
    return values
