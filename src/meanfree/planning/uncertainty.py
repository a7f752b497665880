"""What uncertain inputs make of the answers: bands, intervals, convergence, and what matters."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.experiment.plan import Solver
from meanfree.planning.factors import factor_addresses, factored
from meanfree.planning.readings import Reading, read_many
from meanfree.planning.request import PlanRequest
from meanfree.planning.sampling import (
    Indices,
    Uncertain,
    conditions_of,
    normal_scores,
    sobol_design,
    sobol_indices,
    sobol_points,
)
from meanfree.progress import Progress, silent

BAND = (0.025, 0.16, 0.5, 0.84, 0.975)
"""Levels of the bands: the median, about one and about two standard deviations each way."""


ROUGH = 1e-6
"""Relative tolerance of these runs: far below what the number of draws leaves open."""


@dataclass(frozen=True)
class Uncertainty:
    """Answers under uncertainty.

    ``quantiles[r]`` [shape (5, columns)] of reading r at the levels `BAND`; ``growing[r]`` the same
    at 2^j runs for rising j (``counts``), so that convergence can be seen. ``reached[r]`` [shape
    (columns,)] is the share of runs in which the reading has a value. ``indices`` are Sobol indices
    of the logarithm of the first column of each reading, with more than one input.
    """

    inputs: tuple[Uncertain, ...]
    readings: tuple[Reading, ...]
    quantiles: tuple[Floats, ...]
    counts: tuple[int, ...]
    growing: tuple[Floats, ...]
    reached: tuple[Floats, ...]
    indices: Indices | None
    runs: int


def uncertain_inputs(
    experiment: Experiment, request: PlanRequest
) -> tuple[tuple[Uncertain, ...], Floats]:
    """Every uncertain number, and the correlations of their deviations.

    k of a step with ``uncertainty`` in the case; whatever ``[plan]`` gives a tolerance. The
    experiment is expected to be `factored`.
    """
    found: list[Uncertain] = []
    given = {tolerance.address for tolerance in request.tolerances}
    for step in experiment.steps:
        stated = step.uncertainty
        addresses = factor_addresses(experiment, step) if stated is not None else ()
        if stated is None or not addresses or given & set(addresses):
            continue
        size = math.log(stated.factor) / stated.sigmas
        text = f"factor {stated.factor:g}"
        if stated.sigmas != 1:
            text += f" at {stated.sigmas:g} standard deviations"
        found.append(Uncertain(f"k of {step.name}", addresses, "factor", size, text))
    for tolerance in request.tolerances:
        address = tolerance.address
        found.append(
            Uncertain(address, (address,), tolerance.spread, tolerance.size, tolerance.text)
        )
    correlation = np.eye(len(found))
    place = {entry.name: i for i, entry in enumerate(found)}
    for one, two, value in request.correlations:
        correlation[place[one], place[two]] = correlation[place[two], place[one]] = value
    return tuple(found), correlation


def spread_of(
    experiment: Experiment,
    request: PlanRequest,
    readings: Sequence[Reading],
    *,
    exponent: int = 8,
    until: float | None = None,
    progress: Progress = silent,
) -> Uncertainty | None:
    """Readings under all stated uncertainties, by 2^exponent runs; None where nothing is stated.

    Correlated inputs share one set of independent deviations, so Sobol indices, which need
    independent inputs, are left out where a correlation is stated.
    """
    experiment = factored(experiment)
    uncertain, correlation = uncertain_inputs(experiment, request)
    if not uncertain:
        return None
    d = len(uncertain)
    independent = bool(np.all(correlation == np.eye(d)))
    with_indices = d > 1 and independent
    points = sobol_design(d, exponent) if with_indices else sobol_points(d, exponent)
    known = inputs(experiment)
    addresses = [address for entry in uncertain for address in entry.addresses]
    base = {address: known[address].value for address in addresses}
    # An absolute tolerance may reach what cannot be: hold it above, where the tail is cut.
    lowest = {a: known[a].low + 1e-6 * abs(known[a].value) for a in addresses}
    conditions = conditions_of(uncertain, correlation, base, lowest, normal_scores(points))
    read = read_many(
        experiment,
        conditions,
        readings,
        until=until,
        solver=Solver(experiment.plan.solver.method, ROUGH, ROUGH * 1e-10),
        progress=progress,
        note="runs with uncertain inputs",
    )
    plain = 2 ** (exponent + 1) if with_indices else 2**exponent
    counts = tuple(2**j for j in range(4, int(math.log2(plain)) + 1))
    return Uncertainty(
        inputs=uncertain,
        readings=tuple(readings),
        quantiles=tuple(_quantiles(answer[:plain]) for answer in read),
        counts=counts,
        growing=tuple(np.array([_quantiles(a[:n]) for n in counts]) for a in read),
        reached=tuple(np.isfinite(answer[:plain]).mean(axis=0) for answer in read),
        indices=_indices(read, d) if with_indices else None,
        runs=len(points),
    )


def _quantiles(answer: Floats) -> Floats:
    """Quantiles of each column; a time that is not reached counts as longer than any."""
    held = np.where(np.isfinite(answer), answer, np.inf)
    ordered = np.sort(held, axis=0)
    n = len(ordered)
    found = np.empty((len(BAND), answer.shape[1]))
    for row, level in enumerate(BAND):
        # Between order statistics at (i - 1/2)/n (Hazen); infinite neighbours stay infinite.
        place = level * n - 0.5
        low = min(max(math.floor(place), 0), n - 1)
        high = min(low + 1, n - 1)
        share = min(max(place - low, 0.0), 1.0)
        with np.errstate(invalid="ignore"):
            mixed = (1 - share) * ordered[low] + share * ordered[high]
        found[row] = np.where(np.isfinite(ordered[high]), mixed, np.inf)
    return np.where(np.isfinite(found), found, np.nan)


def _indices(read: Sequence[Floats], d: int) -> Indices:
    with np.errstate(invalid="ignore", divide="ignore"):
        logs = np.log(np.stack([answer[:, 0] for answer in read], axis=1))
    return sobol_indices(logs, d)
