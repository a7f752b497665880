"""Rate constants against temperature: Arrhenius, line of centres, and whether the points curve.

Both are straight lines, ln k and ln(k/Z) against 1/T. Their origins lie far outside the points, so
that errors of A and P are large and go with those of the energies: the full covariance is kept.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.gases.gas import Gas
from meanfree.measured.each_run import Point
from meanfree.measured.fits import quantile
from meanfree.measured.straight_lines import Interval, Line, interval, straight_line, widened
from meanfree.rates.ceiling import Ceiling, ceiling

DIAMETER_FACTOR: Final[float] = 1.1
"""Diameters out of viscosities are good to about a tenth; common practice, no source."""


@dataclass(frozen=True)
class LineOfCentres:
    """k = P Z exp(-E0/RT) fitted to the points.

    ``threshold`` E0 [J/mol]; ``steric`` P and ``a_over_z`` [1], their intervals with the
    diameters' uncertainty; ``steric_error_of_fit`` is that of ln P without it; ``limit`` the
    ceiling at the middle temperature.
    """

    threshold: Interval
    steric: Interval
    a_over_z: Interval
    steric_error_of_fit: float
    correlation: float
    limit: Ceiling
    diameter_factor: float


@dataclass(frozen=True)
class TemperatureSeries:
    """Arrhenius' law through the points of one step.

    ``Ea`` [J/mol], ``ln_A`` of A per event in SI, ``A``; ``covariance`` of (ln A, Ea);
    ``middle`` [K] is where k is known best. ``line`` is ln k against 1/T - 1/middle.
    ``curvature_probability`` is that of a quadratic term as large as the one found, by chance;
    ``power`` is n of A T^n exp(-E/RT) with its interval, None where three numbers are too many.
    """

    step: str
    points: tuple[Point, ...]
    line: Line
    middle: float
    Ea: Interval
    ln_A: Interval
    A: Interval
    covariance: Floats
    correlation: float
    curvature_probability: float | None
    power: Interval | None
    centres: LineOfCentres | None
    words: tuple[str, ...]

    def k(self, T: Floats | float) -> Floats:
        """k per event [SI] at temperatures [K]."""
        return np.asarray(np.exp(self.line.at(1 / np.asarray(T, float) - 1 / self.middle)))

    def band(self, T: Floats) -> tuple[Floats, Floats]:
        """95 % limits of k at temperatures [K]."""
        x = 1 / np.asarray(T, float) - 1 / self.middle
        half = self.line.quantile * self.line.error_at(x)
        middle = self.line.at(x)
        return np.asarray(np.exp(middle - half)), np.asarray(np.exp(middle + half))


def temperature_series(
    step: str,
    points: Sequence[Point],
    partners: tuple[Gas, ...] = (),
    diameter: float | None = None,
    diameter_factor: float = DIAMETER_FACTOR,
) -> TemperatureSeries:
    """The fits through rate constants of a step at three temperatures or more.

    ``partners`` are the two molecules that meet, ``diameter`` [m] that of the pair where the step
    has its own; ``diameter_factor`` says how good it is (x/÷, one standard deviation).

    Raises InputError for fewer than three temperatures.
    """
    if len({round(point.temperature, 6) for point in points}) < 3:
        temperatures = len({point.temperature for point in points})
        found = f"rate constants of {step} at {temperatures} temperatures"
        raise InputError.at("fit.analyses", found, "at least three temperatures")
    T = np.array([point.temperature for point in points])
    ln_k = np.log([point.k for point in points])
    sd = _deviations(points)
    middle = len(T) / float(np.sum(1 / T))
    x = 1 / T - 1 / middle
    line = widened(straight_line(x, ln_k, sd))
    # ln A = a - b/middle, Ea = -R b, of ln k = a + b (1/T - 1/middle)
    to = np.array([[1.0, -1.0 / middle], [0.0, -R]])
    cov = to @ line.covariance @ to.T
    t = line.quantile
    Ea = interval(-R * line.slope, math.sqrt(cov[1, 1]), t)
    ln_A = interval(line.intercept - line.slope / middle, math.sqrt(cov[0, 0]), t)
    probability, power = _curvature(T, ln_k, sd, middle)
    centres = _centres(T, ln_k, sd, middle, line, partners, diameter, diameter_factor)
    return TemperatureSeries(
        step,
        tuple(points),
        line,
        middle,
        Ea,
        ln_A,
        _exponential(ln_A),
        cov,
        float(cov[0, 1] / math.sqrt(cov[0, 0] * cov[1, 1])),
        probability,
        power,
        centres,
        tuple(_words(line, probability, power)),
    )


def _deviations(points: Sequence[Point]) -> Floats | None:
    """Standard errors of ln k, where every point has one."""
    errors = np.array([point.error for point in points])
    return errors if bool(np.all(np.isfinite(errors) & (errors > 0))) else None


def _exponential(ln: Interval) -> Interval:
    value = _exp(ln.value)
    return Interval(value, value * ln.error, _exp(ln.low), _exp(ln.high))


def _curvature(
    T: Floats, ln_k: Floats, sd: Floats | None, middle: float
) -> tuple[float | None, Interval | None]:
    """(probability of the curvature by chance, n of A T^n exp(-E/RT)); None below four points."""
    if len(set(T)) < 4 or len(T) < 5:
        return None, None
    from scipy.stats import t as student

    # ln k = a + b u + n v with u = 1/T - 1/Tm and v = ln(T/Tm)
    u = 1 / T - 1 / middle
    v = np.log(T / middle)
    w = np.ones(len(T)) if sd is None else 1 / sd
    A = np.stack([np.ones(len(T)), u / np.ptp(u), v], axis=1) * w[:, None]
    found, *_ = np.linalg.lstsq(A, ln_k * w, rcond=None)
    r = ln_k * w - A @ found
    freedom = len(T) - 3
    cov = np.linalg.inv(A.T @ A)
    scale = float(r @ r) / freedom
    if sd is not None:
        scale = max(scale, 1.0)
    error = math.sqrt(cov[2, 2] * scale)
    n = float(found[2])
    probability = float(2 * student.sf(abs(n) / error, freedom)) if error > 0 else 0.0
    return probability, interval(n, error, quantile(freedom))


def _centres(
    T: Floats,
    ln_k: Floats,
    sd: Floats | None,
    middle: float,
    arrhenius: Line,
    partners: tuple[Gas, ...],
    diameter: float | None,
    factor: float,
) -> LineOfCentres | None:
    limits = [ceiling(partners, float(one), diameter) for one in T]
    limit = ceiling(partners, middle, diameter)
    if limit is None or any(one is None for one in limits):
        return None
    ln_Z = np.log([one.Z for one in limits if one is not None])
    x = 1 / T - 1 / middle
    line = widened(straight_line(x, ln_k - ln_Z, sd))
    to = np.array([[1.0, -1.0 / middle], [0.0, -R]])
    cov = to @ line.covariance @ to.T
    t = line.quantile
    # Z goes with the square of the diameter: what that is uncertain by, P and A over Z are too.
    of_diameter = 2 * math.log(factor)
    ln_P = line.intercept - line.slope / middle
    half = math.hypot(t * math.sqrt(cov[0, 0]), quantile(None) * of_diameter)
    steric = Interval(
        _exp(ln_P),
        _exp(ln_P) * math.hypot(math.sqrt(cov[0, 0]), of_diameter),
        _exp(ln_P - half),
        _exp(ln_P + half),
    )
    # A over Z at the middle: ln A - ln Z(middle), from the Arrhenius line.
    a = arrhenius
    row = np.array([1.0, -1.0 / middle])
    ln_ratio = a.intercept - a.slope / middle - math.log(limit.Z)
    error = math.sqrt(float(row @ a.covariance @ row))
    wide = math.hypot(a.quantile * error, quantile(None) * of_diameter)
    ratio = Interval(
        _exp(ln_ratio),
        _exp(ln_ratio) * math.hypot(error, of_diameter),
        _exp(ln_ratio - wide),
        _exp(ln_ratio + wide),
    )
    return LineOfCentres(
        interval(-R * line.slope, math.sqrt(cov[1, 1]), t),
        steric,
        ratio,
        math.sqrt(cov[0, 0]),
        float(cov[0, 1] / math.sqrt(cov[0, 0] * cov[1, 1])),
        limit,
        factor,
    )


def _words(line: Line, probability: float | None, power: Interval | None) -> list[str]:
    said = []
    if probability is not None and power is not None:
        if probability < 0.05:
            way = "up" if power.value > 0 else "down"
            said.append(
                f"The points curve {way}wards at high temperature: a quadratic term like theirs "
                f"comes by chance with a probability of {probability:.2g}. A single Ea does not "
                f"describe them; A T^n exp(−E/RT) wants n = {power.value:.2g} "
                f"(95 %: {power.low:.2g} to {power.high:.2g})."
            )
        else:
            said.append(
                "The points show no curvature beyond their scatter "
                f"(n of A T^n exp(−E/RT) from {power.low:.2g} to {power.high:.2g})."
            )
    if line.sd is not None and line.freedom is not None:
        ratio = math.sqrt(line.chi_square / line.freedom)
        said.append(
            f"The points scatter about the line {ratio:.2g} times as much as their own errors say; "
            "the intervals are widened accordingly."
        )
    return said


def _exp(exponent: float) -> float:
    """exp, infinite beyond the largest number: readings that make no sense may ask for that."""
    return math.exp(exponent) if exponent < 709.0 else math.inf
