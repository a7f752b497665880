"""Ideal-gas enthalpy, entropy and heat capacity of one gas, as one smooth form.

Inside the equations a gas carries one Chebyshev series of each, the same numbers for every
integrator, made so that dH/dT = Cp and dS/dT = Cp/T hold to rounding. The variable is ln T:
between 50 and 5000 K the series then needs a third of the terms that it needs in T, and the
integral for S is exact.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from meanfree.errors import InputError, Problem
from meanfree.sourced import Sourced

REFERENCE_TEMPERATURE: Final[float] = 298.15
"""Temperature of the tabulated enthalpies and entropies [K]."""

MARGIN: Final[float] = 10.0
"""How far outside its stated range a series may be used [K]; it is allowed and said."""

Array = NDArray[np.float64]
HeatCapacity = Callable[[Array], Array]
Range = Literal["inside", "slightly outside", "outside"]

_DEGREES: Final[tuple[int, ...]] = (0, 8, 16, 24, 32, 40, 48)


@dataclass(frozen=True)
class Thermochemistry:
    """Cp, H and S of an ideal gas at the standard pressure of 1 bar.

    ``low`` and ``high`` [K] are the range that the source states. The three coefficient
    tuples are Chebyshev series in x = `argument`(T), which runs from -1 to 1 over `domain`,
    the stated range widened by `MARGIN` on both sides. ``deviation`` is the largest relative
    difference between the Cp series and its source; it is limited by the kinks that the
    sources have, not by the series. Enthalpies are those of formation: H at 298.15 K is the
    enthalpy of formation from the elements at 298.15 K.
    """

    low: float
    high: float
    enthalpy_298: Sourced
    entropy_298: Sourced
    heat_capacity_source: str
    heat_capacity_coefficients: tuple[float, ...]
    enthalpy_coefficients: tuple[float, ...]
    entropy_coefficients: tuple[float, ...]
    cautions: tuple[str, ...] = ()
    deviation: float = 0.0

    @property
    def domain(self) -> tuple[float, float]:
        """Temperatures at which x is -1 and 1 [K]."""
        return _domain(self.low, self.high)

    def argument(self, temperature: ArrayLike) -> Array:
        """x = (2 ln T - ln(T_low T_high)) / ln(T_high / T_low), held within -1 and 1.

        ``temperature`` [K], any shape; returns that shape.
        """
        low, high = self.domain
        x = np.log(np.asarray(temperature, dtype=float) ** 2 / (low * high)) / np.log(high / low)
        return np.asarray(np.clip(x, -1.0, 1.0))

    def heat_capacity(self, temperature: ArrayLike) -> Array:
        """Cp [J/mol/K] at ``temperature`` [K], any shape; returns that shape.

        Beyond `domain` it is held at its value at the end, so that a trial step of an
        integrator stays finite; `range_problem` says whether a result may stand there.
        """
        return _series(self.heat_capacity_coefficients, self.argument(temperature))

    def enthalpy(self, temperature: ArrayLike) -> Array:
        """H [J/mol] at ``temperature`` [K], any shape; returns that shape."""
        inside = np.clip(np.asarray(temperature, dtype=float), *self.domain)
        value = _series(self.enthalpy_coefficients, self.argument(temperature))
        beyond = np.asarray(temperature, dtype=float) - inside
        return np.asarray(value + beyond * self.heat_capacity(temperature))

    def entropy(self, temperature: ArrayLike) -> Array:
        """S [J/mol/K] at 1 bar and ``temperature`` [K], any shape; returns that shape."""
        inside = np.clip(np.asarray(temperature, dtype=float), *self.domain)
        value = _series(self.entropy_coefficients, self.argument(temperature))
        beyond = np.log(np.asarray(temperature, dtype=float) / inside)
        return np.asarray(value + beyond * self.heat_capacity(temperature))

    def gibbs(self, temperature: ArrayLike) -> Array:
        """G = H - T S [J/mol] at 1 bar and ``temperature`` [K]; same shape."""
        product = np.asarray(temperature) * self.entropy(temperature)
        return np.asarray(self.enthalpy(temperature) - product)

    def range_problem(self, lowest: float, highest: float) -> Range:
        """How the temperatures from ``lowest`` to ``highest`` [K] lie to the stated range.

        "inside"; "slightly outside", by no more than `MARGIN` (allowed, and to be said);
        or "outside" (an error unless the case allows it by name).
        """
        if self.low <= lowest and highest <= self.high:
            return "inside"
        low, high = self.domain
        return "slightly outside" if low <= lowest and highest <= high else "outside"


def _domain(low: float, high: float) -> tuple[float, float]:
    return max(low - MARGIN, 0.5 * low), high + MARGIN


def _series(coefficients: tuple[float, ...], x: Array) -> Array:
    """Chebyshev sum by Clenshaw's recurrence."""
    ahead = np.zeros_like(x)
    after = np.zeros_like(x)
    for coefficient in coefficients[:0:-1]:
        ahead, after = coefficient + 2.0 * x * ahead - after, ahead
    return np.asarray(coefficients[0] + x * ahead - after)


def _interpolate(function: HeatCapacity, degree: int) -> Array:
    """Chebyshev coefficients, shape (degree + 1,), of the interpolant at Chebyshev points."""
    from numpy.polynomial import chebyshev

    count = degree + 1
    nodes = np.cos(np.pi * (np.arange(count) + 0.5) / count)
    coefficients: Array = chebyshev.chebvander(nodes, degree).T @ function(nodes) * (2.0 / count)
    coefficients[0] *= 0.5
    return coefficients


def build(
    heat_capacity: HeatCapacity,
    low: float,
    high: float,
    *,
    enthalpy_298: Sourced,
    entropy_298: Sourced,
    source: str,
    cautions: tuple[str, ...] = (),
    largest_degree: int = _DEGREES[-1],
) -> Thermochemistry:
    """Make the three series from a function for Cp.

    ``heat_capacity`` takes temperatures [K], shape (n,), and returns Cp [J/mol/K], shape
    (n,); it is asked up to `MARGIN` outside ``low`` and ``high`` [K], which must hold
    298.15 K or come within that margin of it. The degree is the smallest that follows the
    source to 1e-10, at most ``largest_degree``.
    """
    from numpy.polynomial import chebyshev

    start, end = _domain(low, high)
    if not start <= REFERENCE_TEMPERATURE <= end:
        raise ValueError(f"298.15 K lies outside {low:g} to {high:g} K")
    middle, half = 0.5 * np.log(start * end), 0.5 * np.log(end / start)

    def of_x(x: Array) -> Array:
        return np.asarray(heat_capacity(np.exp(middle + half * x)), dtype=float)

    def cp_t_of_x(x: Array) -> Array:
        return np.asarray(_series(tuple(cp), x) * np.exp(middle + half * x))

    grid = np.linspace(-1.0, 1.0, 801)
    wanted = of_x(grid)
    for degree in (d for d in _DEGREES if d <= largest_degree):
        cp = _interpolate(of_x, degree)
        deviation = float(np.max(np.abs(_series(tuple(cp), grid) / wanted - 1.0)))
        if deviation < 1e-10:
            break
    # Cp T is the integrand of H in ln T; 32 further terms carry exp(half x) to rounding.
    cp_t = _interpolate(cp_t_of_x, len(cp) + 31)
    x0 = np.array((np.log(REFERENCE_TEMPERATURE) - middle) / half)
    h = chebyshev.chebint(cp_t * half)
    s = chebyshev.chebint(cp * half)
    h[0] += enthalpy_298.value - float(_series(tuple(h), x0))
    s[0] += entropy_298.value - float(_series(tuple(s), x0))
    return Thermochemistry(
        low=low,
        high=high,
        enthalpy_298=enthalpy_298,
        entropy_298=entropy_298,
        heat_capacity_source=source,
        heat_capacity_coefficients=tuple(float(c) for c in cp),
        enthalpy_coefficients=tuple(float(c) for c in h),
        entropy_coefficients=tuple(float(c) for c in s),
        cautions=cautions,
        deviation=deviation,
    )


def from_values(
    *,
    enthalpy_298: Sourced,
    entropy_298: Sourced,
    heat_capacity: Sourced | Sequence[tuple[float, float]],
    source: str = "as given",
    low: float = 50.0,
    high: float = 5000.0,
    key: str = "thermochemistry",
) -> Thermochemistry:
    """Thermochemistry from a reader's own values.

    ``heat_capacity`` is one value [J/mol/K], constant from ``low`` to ``high`` [K], or a
    table of (T [K], Cp [J/mol/K]), which sets the range and is joined without overshoot
    (Fritsch and Carlson, SIAM J. Numer. Anal. 17, 238 (1980)). Raises `InputError`, with
    every fault found, where a value is not positive and finite, the temperatures do not
    rise, or 298.15 K is not covered.
    """
    if isinstance(heat_capacity, Sourced):
        points = [(low, heat_capacity.value), (high, heat_capacity.value)]
    else:
        points = [(float(t), float(cp)) for t, cp in heat_capacity]
    problems = _table_problems(points, f"{key}.heat_capacity")
    for name, given in (("enthalpy_298", enthalpy_298), ("entropy_298", entropy_298)):
        if not np.isfinite(given.value):
            problems.append(Problem(f"{key}.{name}", f"{given.value}", "a finite number"))
    if problems:
        raise InputError(problems)
    temperatures, values = (np.array(column) for column in zip(*points, strict=True))
    return build(
        join_points(temperatures, values),
        float(temperatures[0]),
        float(temperatures[-1]),
        enthalpy_298=enthalpy_298,
        entropy_298=entropy_298,
        source=source,
        largest_degree=32,
    )


def join_points(temperatures: Array, values: Array) -> HeatCapacity:
    """A function through tabulated Cp, without overshoot between the points.

    ``temperatures`` [K] and ``values`` [J/mol/K], shape (n_points,). Where all values are
    equal it is constant; two points make a straight line.
    """
    if np.all(values == values[0]):
        constant = float(values[0])
        return lambda t: np.full_like(t, constant)
    if len(values) == 2:
        slope = float((values[1] - values[0]) / (temperatures[1] - temperatures[0]))
        return lambda t: values[0] + slope * (t - temperatures[0])
    from scipy.interpolate import PchipInterpolator

    curve = PchipInterpolator(temperatures, values, extrapolate=True)
    return lambda t: np.asarray(curve(t), dtype=float)


def _table_problems(points: list[tuple[float, float]], key: str) -> list[Problem]:
    problems = []
    if len(points) < 2:
        problems.append(Problem(key, f"{len(points)} point(s)", "at least two, or one value"))
    for temperature, value in points:
        if not (np.isfinite(temperature) and temperature > 0 and np.isfinite(value) and value > 0):
            found = f"{value:g} J/mol/K at {temperature:g} K"
            problems.append(Problem(key, found, "finite temperatures and values above 0"))
    temperatures = [t for t, _ in points]
    if any(b <= a for a, b in pairwise(temperatures)):
        problems.append(Problem(key, "temperatures out of order", "each above the one before"))
    if not problems and not (
        temperatures[0] - MARGIN <= REFERENCE_TEMPERATURE <= temperatures[-1] + MARGIN
    ):
        found = f"{temperatures[0]:g} to {temperatures[-1]:g} K"
        problems.append(Problem(key, found, "a range that holds 298.15 K"))
    return problems
