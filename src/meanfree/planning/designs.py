"""When to sample: designs that make the parameters as sharp as n samples can.

Pure functions of sensitivities at candidate times; nothing here knows a reaction.
Source: A. C. Atkinson, A. N. Donev and R. D. Tobias, Optimum Experimental Designs, with SAS (2007),
chapters 10 (criteria) and 12 (exchange).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Places = NDArray[np.intp]
Criterion = Literal["D", "A", "E"]

ALIKE = 1e-12
"""Smallest eigenvalue of the parameters' correlations below which they cannot be told apart: what
slopes that are good to 1e-7 could make of nothing."""

STARTS = 8
ROUNDS = 60
SEED = 20240229


@dataclass(frozen=True)
class Candidates:
    """Times at which a sample could be drawn [s, shape (m,)] and how the signal there follows the
    parameters, over its standard deviation [shape (m, n_parameters)]."""

    times: Floats
    slopes: Floats


def information(slopes: Floats) -> Floats:
    """Sum of s s^T over the samples, shape (n_parameters, n_parameters)."""
    return np.asarray(slopes.T @ slopes)


def standard_errors(slopes: Floats) -> Floats:
    """Standard errors of the parameters [shape (n_parameters,)]; infinite where not determined."""
    size = np.sqrt(np.sum(slopes**2, axis=0))
    if not (size > 0).all():
        return np.full(slopes.shape[1], np.inf)
    matrix = information(slopes / size)
    if np.linalg.eigvalsh(matrix)[0] <= ALIKE:
        return np.full(slopes.shape[1], np.inf)
    return np.asarray(np.sqrt(np.diag(np.linalg.inv(matrix))) / size)


def merit(matrices: Floats, criterion: Criterion) -> Floats:
    """What a design is worth, larger is better, for matrices of shape (..., p, p).

    D: ln det; A: minus the trace of the inverse; E: the smallest eigenvalue.
    """
    if criterion == "E":
        return np.asarray(np.linalg.eigvalsh(matrices)[..., 0])
    sign, logarithm = np.linalg.slogdet(matrices)
    value = np.where(sign > 0, logarithm, -np.inf)
    if criterion == "D":
        return np.asarray(value)
    worth = np.full(value.shape, -np.inf)
    good = np.isfinite(value) & (value > -600)
    if good.any():
        inverses = np.linalg.inv(matrices[good])
        worth[good] = -np.trace(inverses, axis1=-2, axis2=-1)
    return worth


def optimal(candidates: Candidates, count: int, criterion: Criterion, apart: float = 0.0) -> Places:
    """Places of the best ``count`` samples at least ``apart`` [s] from each other, in order.

    With one parameter the best is found for certain, by dynamic programming; with more, one
    sample after the other is exchanged for the best other time, from several starts, and with
    ``apart`` they are then moved together.
    With ``apart`` 0 a time may be used more than once. Raises ValueError where so many samples
    do not fit.
    """
    if candidates.slopes.shape[1] == 1:
        return _best_of_one(candidates, count, apart)
    random = np.random.default_rng(SEED)
    starts = [np.linspace(0, len(candidates.times) - 1, count + 1)[1:]]
    starts += [np.sort(random.uniform(0, len(candidates.times) - 1, count)) for _ in range(STARTS)]
    found: dict[tuple[int, ...], float] = {}
    for start in starts:
        places = spaced(candidates.times, start.round().astype(np.intp), apart)
        value, places = _exchanged(candidates, places, criterion, apart)
        found.setdefault(tuple(int(place) for place in places), value)
    ends = [np.array(places, np.intp) for places in found]
    if apart == 0:
        return ends[int(np.argmax(list(found.values())))]

    # Samples that stand as close as they may block each other: they are moved together.
    def worth(places: Places) -> float:
        return float(merit(information(candidates.slopes[places])[None], criterion)[0])

    return improved(candidates.times, ends, worth, apart)


def spaced(times: Floats, places: Places, apart: float) -> Places:
    """Places moved later, and then earlier from the end, until they are ``apart`` [s].

    Raises ValueError where they do not fit.
    """
    slack = 1e-9 * apart
    moved: list[int] = []
    for place in np.sort(places):
        earliest = times[moved[-1]] + apart - slack if moved else -np.inf
        fitting = np.flatnonzero(times >= earliest)
        later = fitting[fitting >= place] if len(fitting) else fitting
        moved.append(int(later[0]) if len(later) else len(times) - 1)
    for i in range(len(moved) - 2, -1, -1):
        latest = times[moved[i + 1]] - apart + slack
        if times[moved[i]] > latest:
            fitting = np.flatnonzero(times <= latest)
            if not len(fitting):
                raise ValueError("so many samples do not fit so far apart")
            moved[i] = int(fitting[-1])
    return np.array(moved, np.intp)


def improved(
    times: Floats, starts: Sequence[Places], worth: Callable[[Places], float], apart: float
) -> Places:
    """The best design found from several, where what a sample tells depends on those before it.

    ``worth`` judges a whole design. One sample, or one with all later ones, is moved by ever fewer
    places, at last by one, for as long as that is better. Wide moves are tried from every start,
    narrow ones from the best that they led to.
    """
    most = max(1, len(times) // 8)
    wide, narrow = [most], [1]
    while wide[-1] > max(1, len(times) // 100):
        wide.append(wide[-1] // 2)
    while narrow[-1] < wide[-1]:
        narrow.append(narrow[-1] * 2)
    found = [_moved(times, start, worth, apart, wide) for start in starts]
    best = max(found, key=lambda pair: pair[0])[1]
    return _moved(times, best, worth, apart, narrow[::-1])[1]


def _moved(
    times: Floats, places: Places, worth: Callable[[Places], float], apart: float, sizes: list[int]
) -> tuple[float, Places]:
    """(worth, places) after moves of these sizes, each for as long as one betters the design."""
    value = worth(places)
    for size in sizes:
        better = True
        while better:
            better = False
            for move in _moves(len(places), size):
                tried = places + move
                if not _fits(times, tried, apart):
                    continue
                now = worth(tried)
                # while it helps, on in the same direction
                while now > value + 1e-12 * abs(value):
                    value, places, better = now, tried, True
                    tried = places + move
                    if not _fits(times, tried, apart):
                        break
                    now = worth(tried)
    return value, places


def _moves(count: int, size: int) -> Iterator[Places]:
    """One sample, or one with all later ones, earlier or later."""
    for i in range(count):
        for stop in dict.fromkeys((i + 1, count)):
            for sign in (-1, 1):
                move = np.zeros(count, np.intp)
                move[i:stop] = sign * size
                yield move


def _fits(times: Floats, places: Places, apart: float) -> bool:
    if places[0] < 0 or places[-1] >= len(times) or np.any(np.diff(places) < 0):
        return False
    return bool(np.all(np.diff(times[places]) >= apart * (1 - 1e-9)))


def _exchanged(
    candidates: Candidates, places: Places, criterion: Criterion, apart: float
) -> tuple[float, Places]:
    """A design in which no single sample has a better time."""
    times, slopes = candidates.times, candidates.slopes
    products = slopes[:, :, None] * slopes[:, None, :]
    places = places.copy()
    value = float(merit(information(slopes[places])[None], criterion)[0])
    for _ in range(ROUNDS):
        before = value
        for i in range(len(places)):
            others = np.delete(places, i)
            free = _free(times, others, apart)
            rest = information(slopes[others])
            values = merit(rest + products[free], criterion)
            if not len(values):
                continue
            j = int(np.argmax(values))
            if values[j] > value or not np.isfinite(value):
                value, places[i] = float(values[j]), free[j]
        if not value > before + 1e-12 * abs(before):
            break
    return value, np.sort(places)


def _free(times: Floats, others: Places, apart: float) -> Places:
    if apart <= 0 or not len(others):
        return np.arange(len(times))
    gaps = np.abs(times[:, None] - times[others]).min(axis=1)
    return np.flatnonzero(gaps >= apart * (1 - 1e-9))


def _best_of_one(candidates: Candidates, count: int, apart: float) -> Places:
    """The ``count`` times that are ``apart`` with the largest sum of squared slopes."""
    times, worth = candidates.times, candidates.slopes[:, 0] ** 2
    m = len(times)
    if apart <= 0:
        return np.full(count, int(np.argmax(worth)), np.intp)
    # last[j]: how many candidates come early enough before candidate j
    last = np.searchsorted(times, times - apart * (1 - 1e-9), side="right")
    best = np.zeros(m + 1)
    choices = []
    for k in range(count):
        taken = worth + best[last] if k else worth.copy()
        if k:
            taken[last == 0] = -np.inf
        choice = np.empty(m + 1, np.intp)
        running, best_so_far, at = np.full(m + 1, -np.inf), -np.inf, -1
        for j in range(m):
            if taken[j] > best_so_far:
                best_so_far, at = taken[j], j
            running[j + 1], choice[j + 1] = best_so_far, at
        choices.append(choice)
        best = running
    if not np.isfinite(best[m]):
        raise ValueError("so many samples do not fit so far apart")
    places, limit = [], m
    for choice in reversed(choices):
        place = int(choice[limit])
        places.append(place)
        limit = int(last[place])
    return np.array(places[::-1], np.intp)
