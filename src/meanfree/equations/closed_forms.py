"""Integrated rate laws: recognised in a System, and used to check the integrator.

A constant temperature is needed. Source of the forms: any text on kinetics, for example Espenson,
Chemical Kinetics and Reaction Mechanisms, 2nd ed. 1995, chapters 2 to 4; at constant pressure
Levenspiel, Chemical Reaction Engineering, 3rd ed. 1999, chapter 3 (varying volume).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import polynomial

from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.system import Floats, System


@dataclass(frozen=True)
class ClosedForm:
    """A recognised integrated rate law.

    ``name`` in words, ``formula`` as text, ``gas`` the one it gives, and ``amount``: times [s] to
    the amount of that gas over V(0) [mol/m^3], both of shape (n_times,).
    """

    name: str
    formula: str
    gas: str
    amount: Callable[[Floats], Floats]


def recognise(system: System) -> ClosedForm | None:
    """The integrated rate law that a System obeys exactly, or None."""
    if system.mode != "isothermal" or len(system.segments) > 1 or np.any(system.bath >= 0):
        return None
    if len(system.guards.column) or len(system.open_steps):
        return None
    equations = ArrayEquations(system)
    if not equations.constant:
        return None
    T = system.initial_temperature
    k = equations.coefficients(T, 1.0, np.ones(system.n_steps)).k
    one_reaction = system.n_steps == 1 or (system.n_steps == 2 and len(system.reverses.step) == 1)
    if not one_reaction:
        return _consecutive(system, k)
    gas = _reactant(system)
    if gas is None:
        return None
    if system.volume_varies:
        return _at_constant_pressure(system, k, gas)
    return _by_extent(system, k, gas) or _of_any_order(system, k, gas)


def _reactant(system: System) -> int | None:
    """The filled gas that the forward step exhausts first."""
    losing = [(i, -n) for i, n in system.net.row(0) if n < 0 and system.initial_x[i] > 0]
    if not losing:
        return None
    return min(losing, key=lambda pair: system.initial_x[pair[0]] / pair[1])[0]


def _net(system: System, gas: int) -> float:
    return dict(system.net.row(0)).get(gas, 0.0)


def _by_extent(system: System, k: Floats, gas: int) -> ClosedForm | None:
    """Rates that are a polynomial of degree one or two in the extent, forward and reverse.

    dxi/dt = alpha xi^2 + beta xi + gamma from xi = 0 gives xi = 2 gamma E/(1 + e - beta E) with
    e = exp(-D t), E = (1 - e)/D, D^2 = beta^2 - 4 alpha gamma. With beta > 0 (autocatalysis) the
    denominator cancels and is written ((D - beta) + (D + beta) e)/D instead.
    """
    w = 1.0 + system.dead * system.initial_temperature
    total = np.zeros(1)
    for j in range(system.n_steps):
        rate = np.array([k[j] if j == 0 else -k[j]])
        for i, order in system.orders.row(j):
            if order not in (1.0, 2.0):
                return None
            c = np.array([system.initial_x[i], _net(system, i)]) / w
            rate = polynomial.polymul(rate, polynomial.polypow(c, int(order)))
        total = polynomial.polyadd(total, rate)
    if len(total) > 3:
        return None
    gamma, beta, alpha = np.pad(total, (0, 3 - len(total)))
    square = beta**2 - 4 * alpha * gamma
    if square < -1e-12 * beta**2 or gamma <= 0:
        return None
    D = float(np.sqrt(max(square, 0.0)))
    number, start = _net(system, gas), float(system.initial_x[gas])

    def amount(t: Floats) -> Floats:
        e = np.exp(-D * t)
        E = -np.expm1(-D * t) / D if D > 0 else t
        if beta > 0:
            below = ((D + beta) * e - 4 * alpha * gamma / (D + beta)) / D
        else:
            below = 1 + e - beta * E
        return np.asarray(start + number * 2 * gamma * E / below)

    name, formula = _name_of(system)
    return ClosedForm(name, formula, system.gases[gas], amount)


def _name_of(system: System) -> tuple[str, str]:
    """Words and formula for a step whose rate is of degree one or two in the extent."""
    orders = system.orders.row(0)
    overall = sum(order for _, order in orders)
    if system.n_steps == 2:
        words = "reversible first order" if overall == 1 else "reversible second order"
        back = sum(order for _, order in system.orders.row(1))
        if {overall, back} == {1.0, 2.0}:
            words = "reversible, first order one way and second the other"
        return words, "ξ = 2 γ E/(1 + e − β E), e = exp(−D t), E = (1 − e)/D"
    if overall == 1:
        return "first order", "n = n0 exp(−a k t)"
    if len(orders) == 1:
        return "second order", "1/c = 1/c0 + a k t"
    return "second order, two reactants", "ln(c_B c_A0/(c_A c_B0)) = (a c_B0 − b c_A0) k t"


def _of_any_order(system: System, k: Floats, gas: int) -> ClosedForm | None:
    """One reactant, order q other than 1 and 2: c^(1-q) = c0^(1-q) + (q-1) a k t.

    Below first order the run stops at zero smoothly, and the form ends there.
    """
    orders = system.orders.row(0)
    if system.n_steps != 1 or len(orders) != 1 or orders[0][0] != gas or orders[0][1] == 1:
        return None
    q, a = orders[0][1], -_net(system, gas)
    w = 1.0 + system.dead * system.initial_temperature
    start = float(system.initial_x[gas])
    c0 = start / w
    # dx/dt = -a r with x = w c
    tau = (q - 1) * a / w * k[0] * c0 ** (q - 1)

    def amount(t: Floats) -> Floats:
        return np.asarray(start * np.maximum(1 + tau * t, 0.0 if q < 1 else 1.0) ** (1 / (1 - q)))

    return ClosedForm(f"order {q:g}", "c^(1−q) = c0^(1−q) + (q−1) a k t", system.gases[gas], amount)


def _at_constant_pressure(system: System, k: Floats, gas: int) -> ClosedForm | None:
    """First order in n, or second order in one reactant: a k c0 t = (1+e) X/(1-X) + e ln(1-X).

    e is the growth of the volume at full conversion. A catalyst or an inert gas only enters e.
    """
    orders = system.orders.row(0)
    if system.n_steps != 1 or len(orders) != 1 or orders[0][0] != gas or system.dead:
        return None
    q, a, start = orders[0][1], -_net(system, gas), float(system.initial_x[gas])
    name = system.gases[gas]
    if q == 1:
        return ClosedForm(
            "first order, constant pressure",
            "n = n0 exp(−a k t)",
            name,
            lambda t: np.asarray(start * np.exp(-a * k[0] * t)),
        )
    if q != 2:
        return None
    change = sum(n for _, n in system.net.row(0))
    growth = change / a * start / system.total_concentration
    rate = a * k[0] * start

    def amount(t: Floats) -> Floats:
        # u = n0/n solves (1+e)(u-1) - e ln u = a k c0 t; Newton from above, where it is convex.
        goal = rate * t
        u = 1 + goal / min(1.0, 1 + growth) + max(growth, 0.0) * np.log1p(goal)
        for _ in range(60):
            u = u - ((1 + growth) * (u - 1) - growth * np.log(u) - goal) / (1 + growth - growth / u)
            u = np.maximum(u, 1.0)
        return np.asarray(start / u)

    return ClosedForm(
        "second order, constant pressure",
        "a k c0 t = (1 + ε) X/(1 − X) + ε ln(1 − X)",
        name,
        amount,
    )


def _consecutive(system: System, k: Floats) -> ClosedForm | None:
    """A → B → …, both first order, in a rigid vessel: the intermediate B."""
    if system.n_steps != 2 or len(system.reverses.step) or system.volume_varies:
        return None
    rows = [system.orders.row(j) for j in range(2)]
    if any(len(row) != 1 or row[0][1] != 1 for row in rows):
        return None
    first, second = rows[0][0][0], rows[1][0][0]
    one, two = dict(system.net.row(0)), dict(system.net.row(1))
    if first == second or one.get(second, 0.0) <= 0 or first in two or system.dead:
        return None
    b0, a0 = float(system.initial_x[second]), float(system.initial_x[first])
    fast, slow = -one[first] * k[0], -two[second] * k[1]
    fed = one[second] * k[0] * a0

    def amount(t: Floats) -> Floats:
        # (exp(-slow t) - exp(-fast t))/(fast - slow), also where the two are equal.
        x = (fast - slow) * t
        small = np.abs(x) < 1e-6
        ratio = np.where(small, 1 - x / 2, -np.expm1(-x) / np.where(small, 1.0, x))
        return np.asarray(np.exp(-slow * t) * (b0 + fed * t * ratio))

    return ClosedForm(
        "consecutive first order",
        "n_B = n_B0 exp(−k2 t) + n_A0 k1 (exp(−k1 t) − exp(−k2 t))/(k2 − k1)",
        system.gases[second],
        amount,
    )
