"""Kinetics of fixed rate constants with sixty digits: an implicit integrator without rounding.

Radau IIA with seven stages, order 13 (Hairer and Wanner, Solving Ordinary Differential Equations
II, IV.5), Newton's method on all stages, on the balances of a chemist; nothing of the program under
test. Thirty digits carry the answer, thirty more the cancellation of rates that differ by thirty
orders of magnitude. Nodes come from mpmath; numbers are those of `decimal`, six times as quick, and
a test holds the two equal.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from decimal import Decimal, getcontext
from functools import cache
from typing import Any

import mpmath
import numpy as np

DIGITS, GUARD = 60, 1e-8
"""Digits carried; relative difference that a step with seven stages may have from one with four.

The seven are then right to about 1e-17, as closed forms and a tighter guard show."""

FLOOR = "1e-30"
"""Amount over the total below which a difference does not count."""


@cache
def collocation(stages: int, number: Callable[[str], Any]) -> tuple[Any, Any]:
    """Nodes and matrix of Radau IIA: A maps powers of the nodes to their integrals."""
    with mpmath.workdps(3 * DIGITS):
        # Right Radau points: zeros of P_s - P_(s-1) on 0 to 1.
        def p(x: Any) -> Any:
            return mpmath.legendre(stages, 2 * x - 1) - mpmath.legendre(stages - 1, 2 * x - 1)

        coefficients = mpmath.taylor(p, 0, stages)[::-1]
        roots = mpmath.polyroots(coefficients, maxsteps=500, extraprec=1000)
        nodes = sorted(mpmath.re(root) for root in roots)
        powers = mpmath.matrix([[c**q for q in range(stages)] for c in nodes])
        integrals = mpmath.matrix([[c ** (q + 1) / (q + 1) for q in range(stages)] for c in nodes])
        matrix = integrals * powers**-1

        def text(value: Any) -> Any:
            return number(mpmath.nstr(value, DIGITS + 10))

        return (
            np.array([text(c) for c in nodes], object),
            np.array([[text(matrix[i, j]) for j in range(stages)] for i in range(stages)], object),
        )


@dataclass(frozen=True)
class ExactStep:
    """``left`` and ``right``: gas -> whole number; k [SI, per event] as it is written."""

    left: dict[int, int]
    right: dict[int, int]
    k: str


@dataclass(frozen=True)
class ExactMechanism:
    """An isothermal vessel that holds its "volume" or its "pressure"; concentrations as written."""

    holds: str
    steps: tuple[ExactStep, ...]
    fill: tuple[str, ...]
    end: str


@dataclass(frozen=True)
class Event:
    """When a gas first falls to a fraction of its fill [s], and n/|dn/dt| then [s]."""

    gas: int
    fraction: str
    time: Any
    pace: Any


class _Balances:
    """dn/dt over V(0) and its derivatives; V/V(0) is the ratio of the amounts in a piston."""

    def __init__(self, mechanism: ExactMechanism, number: Callable[[str], Any]) -> None:
        self.one, self.zero = number("1"), number("0")
        self.x = [number(c) for c in mechanism.fill]
        self.total = sum(self.x, self.zero)
        self.piston = mechanism.holds == "pressure"
        self.steps = []
        for step in mechanism.steps:
            gases = {*step.left, *step.right}
            net = {g: step.right.get(g, 0) - step.left.get(g, 0) for g in sorted(gases)}
            powers = [g for g, n in step.left.items() for _ in range(n)]
            self.steps.append((number(step.k), powers, {g: n for g, n in net.items() if n}))

    def ratio(self, x: Sequence[Any]) -> Any:
        """V/V(0)."""
        return sum(x, self.zero) / self.total if self.piston else self.one

    def derivative(self, x: Any) -> Any:
        v, out = self.ratio(x), np.array([self.zero] * len(x), object)
        for k, powers, net in self.steps:
            flow = k
            for place, gas in enumerate(powers):
                flow = flow * x[gas] if place == 0 or not self.piston else flow * x[gas] / v
            if not powers:
                flow = flow * v
            for gas, n in net.items():
                out[gas] += n * flow
        return out

    def jacobian(self, x: Any) -> Any:
        """flow = k prod(x) v^(1 - order), v = sum(x)/total."""
        v, size = self.ratio(x), len(x)
        J = np.array([[self.zero] * size for _ in range(size)], object)
        for k, powers, net in self.steps:
            spread = v ** (1 - len(powers)) if self.piston else self.one
            slopes = np.array([self.zero] * size, object)
            for place, gas in enumerate(powers):
                product = k * spread
                for other in (*powers[:place], *powers[place + 1 :]):
                    product = product * x[other]
                slopes[gas] += product
            if self.piston and len(powers) != 1:
                flow = k * spread * (1 - len(powers)) / v / self.total
                for gas in powers:
                    flow = flow * x[gas]
                slopes += flow
            for gas, n in net.items():
                J[gas] += n * slopes
        return J


def _solve(M: Any, b: Any) -> Any:
    """Gauss with row exchanges; both arguments are used up."""
    size = len(b)
    for k in range(size):
        best = k + int(np.argmax(np.abs(M[k:, k])))
        if best != k:
            M[[k, best]], b[[k, best]] = M[[best, k]], b[[best, k]]
        for i in range(k + 1, size):
            if M[i, k]:
                factor = M[i, k] / M[k, k]
                M[i, k + 1 :] -= factor * M[k, k + 1 :]
                b[i] -= factor * b[k]
    for k in reversed(range(size)):
        b[k] = (b[k] - M[k, k + 1 :] @ b[k + 1 :]) / M[k, k] if k + 1 < size else b[k] / M[k, k]
    return b


class _Method:
    """One step with so many stages."""

    def __init__(self, f: _Balances, stages: int, number: Callable[[str], Any]) -> None:
        self.f, self.stages = f, stages
        self.nodes, self.a = collocation(stages, number)
        self.floor = number("1e-45") * f.total
        self.close, self.far = number("1e-15"), number("1e3")

    def __call__(self, x: Any, h: Any, z: Any) -> Any:
        """Increments of x at the nodes [stages, size], from a guess; None where Newton failed."""
        f, s, size = self.f, self.stages, len(x)
        unit = np.array([[f.one if i == j else f.zero for j in range(size)] for i in range(size)])
        for _ in range(12):
            slopes = np.array([f.derivative(x + row) for row in z], object)
            right = (h * (self.a @ slopes) - z).reshape(-1)
            M = np.empty((s * size, s * size), object)
            for j in range(s):
                J = h * f.jacobian(x + z[j])
                for i in range(s):
                    block = -self.a[i, j] * J
                    M[i * size : (i + 1) * size, j * size : (j + 1) * size] = (
                        block + unit if i == j else block
                    )
            change = _solve(M, right).reshape(s, size)
            z = z + change
            largest = np.max(np.abs(change) / (np.abs(x + z) + self.floor))
            # Newton's method doubles the digits: what follows 1e-15 is far below what is asked.
            if largest < self.close:
                return z
            if not largest < self.far:
                return None
        return None


def solve(
    mechanism: ExactMechanism,
    fractions: Sequence[str] = (),
    number: Callable[[str], Any] = Decimal,
    guard: float = GUARD,
) -> tuple[list[Any], Any, list[Event]]:
    """Amounts over V(0) at the end, V/V(0) then, and when filled gases fall to the fractions."""
    getcontext().prec = DIGITS
    f = _Balances(mechanism, number)
    seven, four = _Method(f, 7, number), _Method(f, 4, number)
    between = _between(four.nodes, seven.nodes)
    x, t, end = np.array(f.x, object), f.zero, number(mechanism.end)
    floor = number(FLOOR) * f.total
    wanted = [(g, c) for g, start in enumerate(f.x) if start > 0 for c in fractions]
    events: list[Event] = []
    fastest = np.max(np.abs(f.derivative(x))) / f.total + f.one / end
    h = number("0.001") / fastest
    while t < end:
        last = h >= end - t
        h = end - t if last else h
        z = seven(x, h, np.array([[f.zero] * len(x)] * 7, object))
        other = None if z is None else four(x, h, between @ z)
        if z is None or other is None:
            h = h / 4
            continue
        scale = np.maximum(np.abs(x), np.abs(x + z[-1])) + floor
        error = float(np.max(np.abs(z[-1] - other[-1]) / scale))
        factor = 0.8 * (guard / (error + 1e-40)) ** 0.125
        if error > guard:
            h = h * number(f"{max(0.1, factor):.3g}")
            continue
        for gas, fraction in list(wanted):
            level = number(fraction) * f.x[gas]
            if x[gas] > level >= x[gas] + z[-1][gas]:
                wanted.remove((gas, fraction))
                events.append(_event(f, seven, x, z, t, h, gas, fraction, level))
        x, t = x + z[-1], end if last else t + h
        h = h * number(f"{min(10.0, factor):.3g}")
    return list(x), f.ratio(x), events


def _between(few: Any, many: Any) -> Any:
    """Increments at few nodes from the polynomial through those at many and 0."""
    rows = []
    for c in few:
        row = []
        for own in many:
            weight = c / own
            for other in many:
                if other != own:
                    weight = weight * (c - other) / (own - other)
            row.append(weight)
        rows.append(row)
    return np.array(rows, object)


def _event(
    f: _Balances,
    method: _Method,
    x: Any,
    z: Any,
    t: Any,
    h: Any,
    gas: int,
    fraction: str,
    level: Any,
) -> Event:
    """Newton's method for the length of the step that ends at the level, inside what was passed."""
    low, high, theta = f.zero, h, h / 2
    for _ in range(60):
        inner = method(x, theta, z * (theta / h))
        at = x + inner[-1]
        slope = f.derivative(at)[gas]
        if at[gas] > level:
            low = theta
        else:
            high = theta
        moved = theta - (at[gas] - level) / slope if slope else low
        if abs(moved - theta) <= (t + theta) / 10**20:
            return Event(gas, fraction, t + moved, level / abs(slope))
        theta = moved if low < moved < high else (low + high) / 2
    raise ArithmeticError("the time of a level was not found")
