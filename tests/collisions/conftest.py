"""A molecular dynamics of hard particles, to count collisions without any kinetic theory.

Spheres in a periodic box or discs in a periodic square fly straight and collide elastically;
each collision is found and carried out at its own time, so there is no time step and no
tolerance. Masses, lengths and kT are 1 kg, 1 m and 1 J or of that order: SI without any
conversion, so that no conversion can hide an error.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numba
import numpy as np
import pytest


@numba.njit(error_model="numpy")
def _row(i, now, x, v, radius, box, times):
    """Times at which i would meet the nearest image of each other particle, or infinity."""
    for j in range(x.shape[1]):
        gap2 = closing = speed2 = 0.0
        for axis in range(3):
            apart = x[axis, i] - x[axis, j]
            apart -= box * np.rint(apart / box)
            relative = v[axis, i] - v[axis, j]
            gap2 += apart * apart
            closing += apart * relative
            speed2 += relative * relative
        gap2 = max(gap2 - (radius[i] + radius[j]) ** 2, 0.0)
        inside = closing * closing - speed2 * gap2
        time = now + gap2 / (np.sqrt(max(inside, 0.0)) - closing)
        times[j] = time if (inside >= 0.0) & (closing < 0.0) else np.inf


@numba.njit
def _predict(i, now, end, x, v, radius, box, times, soonest, partner):
    """Next collision of i before the end of the window; tells the others of theirs."""
    _row(i, now, x, v, radius, box, times)
    for j in range(x.shape[1]):
        if times[j] <= end:
            if times[j] < soonest[i]:
                soonest[i], partner[i] = times[j], j
            if times[j] < soonest[j]:
                soonest[j], partner[j] = times[j], i


@numba.njit
def _collide(i, j, x, v, mass, radius, box):
    """Elastic collision of i and j: energy along the line of centres, error of the contact."""
    gap2 = closing = 0.0
    apart = np.empty(3)
    for axis in range(3):
        apart[axis] = x[axis, i] - x[axis, j]
        apart[axis] -= box * np.rint(apart[axis] / box)
        gap2 += apart[axis] ** 2
        closing += apart[axis] * (v[axis, i] - v[axis, j])
    reduced = mass[i] * mass[j] / (mass[i] + mass[j])
    for axis in range(3):
        kick = 2.0 * reduced * closing / gap2 * apart[axis]
        v[axis, i] -= kick / mass[i]
        v[axis, j] += kick / mass[j]
    return 0.5 * reduced * closing**2 / gap2, abs(np.sqrt(gap2) - radius[i] - radius[j])


@numba.njit
def _drift(duration, x, v, kind, path):
    """Let all fly straight; give the highest speed."""
    fastest = 0.0
    for i in range(x.shape[1]):
        speed2 = 0.0
        for axis in range(3):
            x[axis, i] += v[axis, i] * duration
            speed2 += v[axis, i] ** 2
        path[kind[i]] += np.sqrt(speed2) * duration
        fastest = max(fastest, speed2)
    return np.sqrt(fastest)


@numba.njit
def _forget(i, j, soonest, partner, stale):
    """Strike out i, j and whoever was to meet one of them; give how many of the latter."""
    n_stale = 0
    for k in range(soonest.shape[0]):
        if k in (i, j) or partner[k] in (i, j):
            soonest[k], partner[k] = np.inf, -1
            if k not in (i, j):
                stale[n_stale] = k
                n_stale += 1
    return n_stale


@numba.njit
def _fly(x, v, mass, radius, kind, box, duration, thresholds, counts, above, path):
    """Let all fly and collide for a time; counts[a, b], above[a, b, threshold], path[a].

    Gives the worst error of a contact: a collision that was missed would show there.
    """
    n = x.shape[1]
    times, soonest, partner = np.empty(n), np.empty(n), np.empty(n, np.int64)
    stale = np.empty(n, np.int64)
    reach = 0.5 * box - 2.0 * radius.max()
    now = worst = 0.0
    while now < duration:
        # Only nearest images are looked at, so a window ends before any pair can have moved
        # far enough for another image to matter, whatever the directions of flight.
        end = min(duration, now + reach / (2.0 * _drift(0.0, x, v, kind, path)))
        soonest[:], partner[:] = np.inf, -1
        for i in range(n):
            _predict(i, now, end, x, v, radius, box, times, soonest, partner)
        while True:
            i = np.argmin(soonest)
            if soonest[i] > end:
                break
            j = partner[i]
            _drift(soonest[i] - now, x, v, kind, path)
            now = soonest[i]
            energy, error = _collide(i, j, x, v, mass, radius, box)
            worst = max(worst, error)
            a, b = min(kind[i], kind[j]), max(kind[i], kind[j])
            counts[a, b] += 1
            for level in range(thresholds.shape[0]):
                above[a, b, level] += energy > thresholds[level]
            # A window that was right for the speeds so far is too long for a higher one.
            end = min(end, now + reach / (2.0 * _drift(0.0, x, v, kind, path)))
            n_stale = _forget(i, j, soonest, partner, stale)
            _predict(i, now, end, x, v, radius, box, times, soonest, partner)
            _predict(j, now, end, x, v, radius, box, times, soonest, partner)
            for k in stale[:n_stale]:
                _predict(k, now, end, x, v, radius, box, times, soonest, partner)
        _drift(end - now, x, v, kind, path)
        now = end
    return worst


@dataclass(frozen=True)
class Counted:
    """What happened, block by block of equal duration; kinds 0 and 1, pairs with a <= b."""

    dimensions: int
    numbers: tuple[int, int]
    masses: tuple[float, float]
    diameters: tuple[float, float]
    box: float
    block: float
    thresholds: np.ndarray
    counts: np.ndarray
    above: np.ndarray
    paths: np.ndarray
    energies: np.ndarray
    worst_contact: float

    @property
    def freedom(self) -> int:
        """Degrees of freedom of a box at rest: the centre of mass does not move."""
        return self.dimensions * (sum(self.numbers) - 1)


def _placed(rng: np.random.Generator, radius: Any, box: float, dimensions: int) -> np.ndarray:
    """Places drawn one after the other, drawn again where two would overlap."""
    x = np.zeros((len(radius), 3))
    for i in range(len(radius)):
        while True:
            x[i, :dimensions] = rng.uniform(0.0, box, dimensions)
            apart = x[:i] - x[i]
            apart -= box * np.rint(apart / box)
            if np.all(np.sum(apart**2, axis=1) > (radius[:i] + radius[i]) ** 2):
                break
    return x


def _simulate(
    dimensions: int,
    numbers: tuple[int, int],
    masses: tuple[float, float],
    diameters: tuple[float, float],
    filled: float,
    block: float,
    n_blocks: int,
    seed: int,
) -> Counted:
    """Fly two kinds of particles at kT = 1 J, where kT is 2 E over the degrees of freedom."""
    rng = np.random.default_rng(seed)
    kind = np.repeat([0, 1], numbers)
    mass = np.asarray(masses, dtype=float)[kind]
    radius = 0.5 * np.asarray(diameters, dtype=float)[kind]
    ball = math.pi ** (dimensions / 2) / math.gamma(dimensions / 2 + 1)
    box = float((ball * np.sum(radius**dimensions) / filled) ** (1.0 / dimensions))
    x = _placed(rng, radius, box, dimensions)
    v = rng.normal(size=x.shape) / np.sqrt(mass)[:, None]
    v[:, dimensions:] = 0.0  # discs are spheres that stay in a plane
    v -= np.sum(mass[:, None] * v, axis=0) / mass.sum()
    freedom = dimensions * (len(mass) - 1)
    v *= math.sqrt(freedom / float(np.sum(mass[:, None] * v**2)))
    thresholds = np.array([0.5, 1.0, 2.0, 4.0])
    counts = np.zeros((n_blocks + 1, 2, 2))
    above = np.zeros((n_blocks + 1, 2, 2, len(thresholds)))
    paths = np.zeros((n_blocks + 1, 2))
    energies = np.zeros(n_blocks + 1)
    worst = 0.0
    x, v = np.ascontiguousarray(x.T), np.ascontiguousarray(v.T)
    for k in range(n_blocks + 1):  # the first is for the places to forget how they were drawn
        seen = counts[k], above[k], paths[k]
        worst = max(worst, _fly(x, v, mass, radius, kind, box, block, thresholds, *seen))
        energies[k] = 0.5 * float(np.sum(mass * v**2))
    return Counted(
        dimensions, numbers, masses, diameters, box, block, thresholds,
        counts[1:], above[1:], paths[1:], energies, worst,
    )  # fmt: skip


@pytest.fixture(scope="session")
def hard_particles() -> Callable[..., Counted]:
    """The simulation, as a function."""
    return _simulate
