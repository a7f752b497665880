"""One encounter at any temperature: its k, its ceilings, and where they cross."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.experiment.rate_constants import activation_energy_at, rate_constant
from meanfree.gases.gas import Gas
from meanfree.rates.attraction import Attraction
from meanfree.rates.ceiling import (
    Ceiling,
    Judgement,
    Standing,
    against_capture,
    ceiling,
    judge,
)

Floats = NDArray[np.float64]

CURVE_POINTS = 61
SEARCH_POINTS = 241

SAME = 1e-9
"""Below this in ln k two rate constants are one: a law that is its own ceiling crosses nothing."""


@dataclass(frozen=True)
class Level:
    """A step at one temperature [K].

    ``k`` [m^3/mol/s] per event; ``Ea`` [J/mol]; ``limit`` (hard spheres, with the ``judgement``
    against it) and ``long_range`` [m^3/mol/s] are None where not known, never both; ``outside`` is
    True beyond the range that the step states for its law.
    """

    temperature: float
    k: float
    Ea: float | None
    limit: Ceiling | None
    long_range: float | None
    judgement: Judgement | None
    is_run: bool
    outside: bool

    @property
    def standing(self) -> Standing:
        """Where k stands."""
        if self.judgement is not None:
            return self.judgement.standing(self.long_range)
        assert self.long_range is not None, "one of the two ceilings is known"
        return against_capture(self.k, self.long_range)

    @property
    def ceiling(self) -> float:
        """The higher of the known ceilings [m^3/mol/s]."""
        Z = 0.0 if self.limit is None else self.limit.Z
        return Z if self.long_range is None else max(Z, self.long_range)


@dataclass(frozen=True)
class Crossing:
    """A temperature [K] at which k equals a ceiling; ``rising`` where it is above it beyond."""

    temperature: float
    ceiling: str
    rising: bool
    inside: bool


@dataclass(frozen=True)
class Curve:
    """k and its ceilings against temperature [m^3/mol/s, shape (n_temperatures,)]."""

    temperatures: Floats
    k: Floats
    Z: Floats | None
    long_range: Floats | None

    @property
    def ceiling(self) -> Floats:
        """The higher of the known ceilings."""
        known = [line for line in (self.Z, self.long_range) if line is not None]
        return np.asarray(np.max(known, axis=0))


class Known:
    """Where k of a step can be worked out: within its table, and the energies of its gases."""

    def __init__(self, experiment: Experiment, step: Step, back: bool) -> None:
        self.law = step.law
        self.energies = [
            (gas.thermochemistry, gas.extrapolate)
            for name in step.net
            if (gas := experiment.gas_named[name]).thermochemistry is not None
            and back
            and step.reverse == "thermochemistry"
        ]

    def at(self, T: float) -> bool:
        """Whether k is known at T [K]."""
        if any(error for _, error in self.law.strains(T, T)):
            return False
        return all(
            extrapolate or energies.range_problem(T, T) != "outside"
            for energies, extrapolate in self.energies
        )

    def part_of(
        self, low: float, high: float, around: tuple[float, float] | None = None
    ) -> tuple[float, float] | None:
        """The part of a range where k is known, ends to 1 mK; None where that is nowhere."""
        inner = around or self._inner(low, high)
        if inner is None:
            return None
        return self._end(inner[0], low), self._end(inner[1], high)

    def _inner(self, low: float, high: float) -> tuple[float, float] | None:
        good = [float(T) for T in np.geomspace(low, high, 41) if self.at(float(T))]
        return (good[0], good[-1]) if good else None

    def _end(self, good: float, wanted: float) -> float:
        if self.at(wanted):
            return wanted
        bad = wanted
        while abs(bad - good) > 1e-3:
            middle = 0.5 * (good + bad)
            good, bad = (middle, bad) if self.at(middle) else (good, middle)
        return good


class Look:
    """One encounter at any temperature."""

    def __init__(
        self,
        experiment: Experiment,
        step: Step,
        back: bool,
        partners: tuple[Gas, ...],
        diameter: float | None,
        attraction: Attraction | str,
    ) -> None:
        self.step, self.partners, self.diameter = step, partners, diameter
        self.k = rate_constant(experiment, step, back)
        self.long_range: Callable[[float], float] | None = (
            attraction.rate_constant if isinstance(attraction, Attraction) else None
        )

    def limit(self, T: float) -> Ceiling | None:
        """The hard-sphere ceiling, None where a mass or a diameter is not known."""
        return ceiling(self.partners, T, self.diameter)

    def Z(self, T: float) -> float:
        """The collision rate constant [m^3/mol/s], where there is one."""
        limit = self.limit(T)
        assert limit is not None, "masses and diameters are known: looked at before"
        return limit.Z

    def level(self, T: float, is_run: bool) -> Level:
        """k against its ceilings at T [K]."""
        k, limit, valid = self.k(T), self.limit(T), self.step.valid
        Ea = activation_energy_at(self.step, self.k, T)
        outside = valid is not None and not (
            valid[0].value * (1 - 1e-12) <= T <= valid[1].value * (1 + 1e-12)
        )
        return Level(
            T,
            k,
            Ea,
            limit,
            None if self.long_range is None else self.long_range(T),
            None if limit is None else judge(k, Ea, limit),
            is_run,
            outside,
        )

    def ceilings(self, T: float) -> list[tuple[str, Callable[[float], float]]]:
        """The ceilings that are known, by name."""
        found: list[tuple[str, Callable[[float], float]]] = []
        if self.limit(T) is not None:
            found.append(("hard spheres", self.Z))
        if self.long_range is not None:
            found.append(("long range", self.long_range))
        return found

    def curve(self, low: float, high: float) -> Curve:
        """k and its ceilings, even in 1/T."""
        T = 1.0 / np.linspace(1 / high, 1 / low, CURVE_POINTS)[::-1]
        lines = {
            name: np.array([of(float(t)) for t in T]) for name, of in self.ceilings(float(T[0]))
        }
        k = np.array([self.k(float(t)) for t in T])
        return Curve(T, k, lines.get("hard spheres"), lines.get("long range"))

    def crossings(
        self, searched: tuple[float, float], span: tuple[float, float]
    ) -> Iterator[Crossing]:
        """Where k equals a ceiling, lowest temperature first."""
        found = [
            Crossing(T, name, rising, span[0] <= T <= span[1])
            for name, ceiling_of in self.ceilings(span[0])
            for T, rising in _roots(self.k, ceiling_of, *searched)
        ]
        yield from sorted(found, key=lambda crossing: crossing.temperature)


def _roots(
    k_of: Callable[[float], float], ceiling_of: Callable[[float], float], low: float, high: float
) -> Iterator[tuple[float, bool]]:
    """(T [K], does k rise above the ceiling there) of every crossing between two temperatures."""
    from scipy.optimize import brentq

    def excess(T: float) -> float:
        k = k_of(T)
        return math.log(k / ceiling_of(T)) if k > 0 and math.isfinite(k) else -math.inf

    grid = np.geomspace(low, high, SEARCH_POINTS)
    values = np.array([excess(float(T)) for T in grid])
    values[np.abs(values) < SAME] = 0.0
    for i in np.flatnonzero(values[:-1] * values[1:] < 0):
        a, b = float(grid[i]), float(grid[i + 1])
        if math.isfinite(values[i]) and math.isfinite(values[i + 1]):
            yield float(brentq(excess, a, b, xtol=1e-9, rtol=1e-12)), bool(values[i + 1] > 0)
