"""An independent integrator for plain mechanisms: collocation of order 13, compiled.

Radau IIA with seven stages (Hairer and Wanner, Solving Ordinary Differential Equations II, IV.5
and IV.8), Newton's method on all stages at once. Each step is made with four stages as well, and
kept where the two differ by less than ``guard``; the seven-stage result is then far closer. The
balances are written from the plain numbers, volume from the equation of state, derivatives by
complex steps. Nothing of the program under test is used.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from collocation_nodes import A4, A7, BETWEEN, NODES4, NODES7
from numba import njit
from plain_mechanisms import DEAD_T, PlainMechanism
from scipy.constants import R

MOST_STEPS = 5_000
"""Steps after which a run is given up; ordinary ones take some hundred."""

STANDARD = 1e5
"""Pressure of the standard state [Pa]."""


@dataclass(frozen=True)
class Numbers:
    """A plain mechanism as arrays. ``setting``: rigid, free temperature, T or start of the ramp,

    its slope, its time, held pressure, dead space over volume and temperature, scale.
    """

    orders: np.ndarray
    net: np.ndarray
    law: np.ndarray
    baths: np.ndarray
    energies: np.ndarray
    setting: np.ndarray

    @property
    def all(self) -> tuple[np.ndarray, ...]:
        return self.orders, self.net, self.law, self.baths, self.energies, self.setting


def numbers_of(plain: PlainMechanism) -> tuple[Numbers, np.ndarray]:
    """The arrays, and the state at time zero: n_i/V(0), and T where it is free."""
    n, m = len(plain.sizes), len(plain.steps)
    orders, net, law = np.zeros((m, n)), np.zeros((m, n)), np.zeros((m, 4))
    baths = np.ones((m, n))
    for j, s in enumerate(plain.steps):
        for g, order in (s.left if s.orders is None else s.orders).items():
            orders[j, g] = order
        for side, sign in ((s.left, -1.0), (s.right, 1.0)):
            for g, number in side.items():
                net[j, g] += sign * number
        law[j] = s.A, s.E, float(s.bath is not None), float(s.reverse)
        for g, efficiency in (s.bath or {}).items():
            baths[j, g] = efficiency
    c = np.array(plain.fill)
    # n = p V/(R T_fill) in the vessel and p V_d/(R T_d) beside it; c = p/(R T_fill).
    moles = c * (1.0 + plain.dead * plain.T_fill / DEAD_T)
    p = c.sum() * R * plain.T_fill
    first = 1.0
    if plain.holds == "pressure":
        first = moles.sum() * R * plain.T / p - plain.dead * plain.T / DEAD_T
    x = moles / first
    setting = np.array(
        [
            float(plain.holds == "volume"), float(plain.mode == "adiabatic"), plain.T, 0.0, 0.0, p,
            plain.dead / DEAD_T / first, x.sum(),
        ]
    )  # fmt: skip
    energies = np.array([plain.cp, plain.h, plain.s])
    start = np.append(x, plain.T) if plain.mode == "adiabatic" else x
    return Numbers(orders, net, law, baths, energies, setting), start


@njit(cache=True)
def derivative(t, y, orders, net, law, baths, energies, setting, out):  # type: ignore[no-untyped-def]
    """dy/dt; complex states are as good as real ones."""
    m, n = orders.shape
    rigid, free = setting[0] > 0, setting[1] > 0
    T = y[n] if free else y[0] * 0 + setting[2] + setting[3] * (t - setting[4])
    total = y[0] * 0
    for i in range(n):
        total += y[i]
    v = y[0] * 0 + 1.0
    if not rigid:
        v = total * R * T / setting[5] - setting[6] * T
    w = v + setting[6] * T
    for i in range(len(out)):
        out[i] = y[0] * 0
    heat, capacity = y[0] * 0, y[0] * 0
    log_T, log_p = np.log(T / 298.15), np.log(R * T / STANDARD)
    for i in range(n):
        capacity += y[i] * (energies[0, i] - (R if rigid else 0.0))
    for j in range(m):
        k = law[j, 0] * np.exp(-law[j, 1] / (R * T))
        gibbs, enthalpy, change = y[0] * 0, y[0] * 0, 0.0
        for i in range(n):
            if net[j, i] != 0:
                H = energies[1, i] + energies[0, i] * (T - 298.15)
                S = energies[2, i] + energies[0, i] * log_T
                gibbs += net[j, i] * (H - T * S)
                enthalpy += net[j, i] * H
                change += net[j, i]
        forward, back, M = k, k * 0, y[0] * 0 + 1.0
        if law[j, 3] > 0:
            back = k * np.exp(gibbs / (R * T) + change * log_p)
        for i in range(n):
            order = orders[j, i]
            c = y[i] / w
            if order == 1.0:
                forward *= c
            elif order == 2.0:
                forward *= c * c
            elif order == 3.0:
                forward *= c * c * c
            elif order != 0:
                # As documented: c^q, q no whole number, is c (c^2 + e^2)^((q - 1)/2).
                e = (1e-9 if order < 1 else 1e-20) * setting[7]
                forward *= c * (c * c + e * e) ** ((order - 1) / 2)
            other = order + net[j, i]
            if law[j, 3] > 0:
                if other == 1.0:
                    back *= c
                elif other == 2.0:
                    back *= c * c
        if law[j, 2] > 0:
            M = y[0] * 0
            for i in range(n):
                M += baths[j, i] * y[i] / w
        flow = (forward - back) * M * v
        for i in range(n):
            if net[j, i] != 0:
                out[i] += net[j, i] * flow
        heat -= flow * (enthalpy - (change * R * T if rigid else 0.0))
    if free:
        out[n] = heat / capacity


@njit(cache=True)
def jacobian(t, y, orders, net, law, baths, energies, setting, out):  # type: ignore[no-untyped-def]
    """d(dy/dt)/dy by complex steps (Squire and Trapp, SIAM Review 40 (1998) 110)."""
    size = len(y)
    z, f = np.empty(size, np.complex128), np.empty(size, np.complex128)
    for j in range(size):
        for i in range(size):
            z[i] = y[i]
        z[j] += 1e-40j
        derivative(t, z, orders, net, law, baths, energies, setting, f)
        for i in range(size):
            out[i, j] = f[i].imag / 1e-40


@njit(cache=True)
def _stages(t, h, y, z, nodes, a, floor, orders, net, law, baths, energies, setting):  # type: ignore[no-untyped-def]
    """Newton's method for the increments z [stages, size] of one step; True where it ended."""
    s, size = z.shape
    big, right = np.zeros((s * size, s * size)), np.empty(s * size)
    J, f = np.empty((size, size)), np.empty((s, size))
    before = 1e300
    for turn in range(14):
        for i in range(s):
            derivative(t + nodes[i] * h, y + z[i], orders, net, law, baths, energies, setting, f[i])
        for i in range(s):
            for q in range(size):
                total = -z[i, q]
                for j in range(s):
                    total += h * a[i, j] * f[j, q]
                right[i * size + q] = total
        # The Jacobian is renewed at every stage while that helps; then it stays.
        if turn < 2:
            for j in range(s):
                jacobian(t + nodes[j] * h, y + z[j], orders, net, law, baths, energies, setting, J)
                for i in range(s):
                    for q in range(size):
                        for r in range(size):
                            one = 1.0 if i == j and q == r else 0.0
                            big[i * size + q, j * size + r] = one - h * a[i, j] * J[q, r]
        if not np.isfinite(np.sum(np.abs(big)) + np.sum(np.abs(right))):
            return False
        try:
            step = np.linalg.solve(big, right)
        except Exception:  # noqa: BLE001  # a singular matrix; numba knows no narrower one
            return False
        size_of = 0.0
        for i in range(s):
            for q in range(size):
                z[i, q] += step[i * size + q]
                scale = abs(y[q] + z[i, q]) + floor
                size_of = max(size_of, abs(step[i * size + q]) / scale)
        if not np.isfinite(size_of):
            return False
        if size_of < 3e-15 or (size_of < 1e-12 and size_of > 0.3 * before):
            return True
        before = size_of
    return size_of < 1e-11


@njit(cache=True)
def _cross(t, h, y, z, gas, level, nodes, a, floor, orders, net, law, baths, energies, setting):  # type: ignore[no-untyped-def]
    """The time within a step at which a gas reaches a level, and n over dn/dt there.

    Secants over steps of other lengths.
    """
    size, low, high = len(y), 0.0, h
    f_low, f_high = y[gas] - level, y[gas] + z[-1, gas] - level
    inner, guess = np.empty_like(z), h
    for turn in range(60):
        guess = low - f_low * (high - low) / (f_high - f_low)
        if turn % 3 == 2:
            guess = 0.5 * (low + high)
        for i in range(len(nodes)):
            for q in range(size):
                inner[i, q] = z[i, q] * guess / h
        if not _stages(
            t, guess, y, inner, nodes, a, floor, orders, net, law, baths, energies, setting
        ):
            return np.nan, np.nan
        f = y[gas] + inner[-1, gas] - level
        if f == 0 or high - low < 1e-13 * (t + high):
            break
        if (f > 0) == (f_low > 0):
            low, f_low = guess, f
        else:
            high, f_high = guess, f
    state, slope = y + inner[-1], np.empty(size)
    derivative(t + guess, state, orders, net, law, baths, energies, setting, slope)
    return t + guess, state[gas] / abs(slope[gas])


@njit(cache=True)
def march(
    t,
    end,
    h,
    y,
    levels,
    found,
    guard,
    floor,
    n7,
    a7,
    n4,
    a4,
    between,
    orders,
    net,
    law,
    baths,
    energies,
    setting,
):  # type: ignore[no-untyped-def]
    """From t to ``end``; the state is left in ``y``, first times at ``levels`` in ``found``.

    ``levels`` [events, 2]: gas and amount; ``found`` [events, 2] as `solve` gives it. The number
    of steps, or -1 where it failed.
    """
    size, count, tried = len(y), 0, 0
    z7, z4 = np.zeros((7, size)), np.zeros((4, size))
    while t < end:
        h = min(h, end - t)
        last, tried = h == end - t, tried + 1
        if tried > MOST_STEPS:
            return -1
        z7[:] = 0.0
        good = _stages(t, h, y, z7, n7, a7, floor, orders, net, law, baths, energies, setting)
        if good:
            z4[:] = np.dot(between, z7)
            good = _stages(t, h, y, z4, n4, a4, floor, orders, net, law, baths, energies, setting)
        error = 0.0
        for q in range(size):
            scale = max(abs(y[q]), abs(y[q] + z7[-1, q])) + 1e3 * floor
            error = max(error, abs(z7[-1, q] - z4[-1, q]) / scale)
        if not good or not error < guard:
            h *= 0.25 if not good else max(0.1, 0.8 * (guard / error) ** 0.125)
            if h < 1e-14 * t or h < 1e-200:
                return -1
            continue
        for e in range(len(levels)):
            gas, level = int(levels[e, 0]), levels[e, 1]
            if np.isnan(found[e, 0]) and y[gas] > level and y[gas] + z7[-1, gas] <= level:
                found[e, 0], found[e, 1] = _cross(
                    t,
                    h,
                    y,
                    z7,
                    gas,
                    level,
                    n7,
                    a7,
                    floor,
                    orders,
                    net,
                    law,
                    baths,
                    energies,
                    setting,
                )
        for q in range(size):
            y[q] += z7[-1, q]
        t = end if last else t + h
        count += 1
        h *= min(4.0, 0.8 * (guard / (error + 1e-30)) ** 0.125)
    return count


def legs(plain: PlainMechanism, numbers: Numbers) -> list[tuple[float, float, np.ndarray]]:
    """(start, end, setting) between the kinks of a program; one leg without."""
    if plain.mode != "program":
        return [(0.0, plain.end, numbers.setting)]
    found, points = [], [*plain.points, (1e300, plain.points[-1][1])]
    for (t0, T0), (t1, T1) in pairwise(points):
        setting = numbers.setting.copy()
        setting[2:5] = T0, (T1 - T0) / (t1 - t0), t0
        if t0 < plain.end:
            found.append((t0, min(t1, plain.end), setting))
    return found


def solve(
    plain: PlainMechanism, levels: np.ndarray, guard: float = 1e-6
) -> tuple[np.ndarray, np.ndarray]:
    """The state at the end, and when each gas first falls to a level, with n/|dn/dt| then [s].

    ``levels`` [events, 2] are (gas, fraction of its fill). NaN where a level was not reached, and
    everywhere if it failed.
    """
    numbers, y = numbers_of(plain)
    amounts = levels.copy()
    amounts[:, 1] *= y[levels[:, 0].astype(int)]
    found, floor = np.full((len(levels), 2), np.nan), 1e-22 * numbers.setting[7]
    for start, end, setting in legs(plain, numbers):
        rest: tuple[Any, ...] = (*numbers.all[:-1], setting)
        h = min(1e-6, 1e-3 * (end - start))
        method = (NODES7, A7, NODES4, A4, BETWEEN)
        if march(start, end, h, y, amounts, found, guard, floor, *method, *rest) < 0:
            return np.full_like(y, np.nan), np.full_like(found, np.nan)
    return y, found
