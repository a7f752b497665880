"""Thermodynamics as tests: what no run may do, whatever its rate constants.

Random mechanisms of `plain_mechanisms` in which every step is reversible by the energies of its
gases, heat capacities constant. Energies, entropies and the least Gibbs energy are worked out here
from those numbers alone.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from plain_mechanisms import PlainMechanism, PlainStep, experiment_of, random_mechanism
from scipy.constants import R
from scipy.optimize import brentq
from scipy.special import logsumexp

from meanfree.experiment.samples import Sample
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.sourced import Sourced

SEEDS = range(2)
P0 = 1e5


def reversible(seed: int, holds: str, mode: str) -> PlainMechanism:
    """Gases of a random mechanism; each step reversible, each within 1e-3 to 1e3 of the other."""
    base, rng = random_mechanism(8 * seed), np.random.default_rng([31, seed])
    sizes = base.sizes[:5]
    # Made of 1 + 1 = 2, 1 + 2 = 3, isomers, and a cycle through the isomers of size 1 and 2.
    steps = [
        ({0: 2.0}, {2: 1.0}), ({0: 1.0}, {1: 1.0}), ({2: 1.0}, {3: 1.0}),
        ({3: 1.0}, {1: 2.0}), ({0: 1.0, 2: 1.0}, {4: 1.0}), ({1: 1.0, 3: 1.0}, {4: 1.0}),
    ]  # fmt: skip
    made = []
    for left, right in steps:
        E = float(rng.uniform(1e4, 6e4))
        A = float(10 ** rng.uniform(-2, 2)) * float(np.exp(E / (R * 500.0)))
        made.append(PlainStep(left, right, A, E, reverse=True))
    fill = tuple(float(10 ** rng.uniform(-2, 0.5)) for _ in sizes)
    # Enthalpies near each other, entropies as chemistry has them: constants near one.
    h = tuple(5e3 * float(x) for x in rng.uniform(-1, 1, len(sizes)))
    gases = {"sizes": sizes, "cp": base.cp[:5], "s": base.s[:5], "h": h, "fill": fill}
    how = {"holds": holds, "mode": mode, "T": 500.0, "T_fill": 500.0, "points": (), "dead": 0.0}
    return replace(base, steps=tuple(made), end=1e9, **gases, **how)


def moles(run: Run) -> np.ndarray:
    """Amounts [mol] at every accepted time, without what is negative within the tolerance."""
    return np.maximum(run.amounts(run.trajectory.times), 1e-300)


def enthalpies(plain: PlainMechanism, T: np.ndarray) -> np.ndarray:
    """H of each gas [J/mol, shape (n_gases, n_times)]."""
    return np.array(plain.h)[:, None] + np.array(plain.cp)[:, None] * (T - 298.15)


def entropies(plain: PlainMechanism, T: np.ndarray, p: np.ndarray) -> np.ndarray:
    """S of each gas at its partial pressure p [J/mol/K]."""
    standard = np.array(plain.s)[:, None] + np.array(plain.cp)[:, None] * np.log(T / 298.15)
    return standard - R * np.log(p / P0)


def whole_run(plain: PlainMechanism) -> tuple[Run, np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """A run, its amounts, T, V and partial pressures at every accepted time."""
    run = integrate(experiment_of(plain))
    times, n = run.trajectory.times, moles(run)
    T, V = run.temperature(times), run.volume(times)
    return run, n, T, V, n * R * T / V


# Sums over gases of numbers of either sign, each right to a few tolerances of 1e-8; a slope of
# entropy is mu/T, some 100 J/mol/K a mole, of the order of what is compared.
NOISE = 1e-7


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("seed", SEEDS)
def test_free_energy_falls_and_ends_at_its_minimum(seed: int, holds: str) -> None:
    """Isothermal: G never rises at constant p, A never at constant V; no cycle runs for ever."""
    plain = reversible(seed, holds, "isothermal")
    run, n, T, V, p = whole_run(plain)
    chemical = enthalpies(plain, T) - T * entropies(plain, T, p)
    free = np.sum(n * chemical, axis=0)
    if holds == "volume":
        free = free - (p.sum(axis=0) * V)
    fall = free[0] - free[-1]
    assert fall > 0
    assert np.all(np.diff(free) <= NOISE * fall)
    end = run.end
    forward_and_back = run.rates([end])[:, 0]
    half = len(plain.steps)
    net, gross = _net_and_gross(run, forward_and_back, half)
    # Rates of first and second order in amounts that are right to some 1e-8.
    assert np.all(np.abs(net) <= 1e-6 * gross)
    # Independent of any kinetics: the amounts with the least free energy.
    least = least_free_energy(plain, n[:, 0], float(V[0]))
    np.testing.assert_allclose(run.amounts(end)[:, 0], least, rtol=1e-6)


def _net_and_gross(run: Run, rates: np.ndarray, steps: int) -> tuple[np.ndarray, np.ndarray]:
    """Forward less backward rate of each step, and the larger of the two."""
    reverses = run.system.reverses
    assert len(reverses.step) == steps
    forward, back = rates[reverses.forward], rates[reverses.step]
    return forward - back, np.maximum(forward, back)


def least_free_energy(plain: PlainMechanism, n0: np.ndarray, V: float) -> np.ndarray:
    """The amounts of the least G (constant p) or A (constant V) that CH2 units allow.

    Both are convex in the amounts; with one kind of atom the minimum is where mu_i = lambda s_i for
    one lambda, which a root finder gives to rounding (W. R. Smith and R. W. Missen, Chemical
    Reaction Equilibrium Analysis, 1982; from memory).
    """
    T, sizes = plain.T, np.array(plain.sizes)
    units = float(sizes @ n0)
    at = np.array([T])
    g = ((enthalpies(plain, at) - T * entropies(plain, at, np.array([P0])))[:, 0]) / (R * T)
    if plain.holds == "volume":
        amount = P0 * V / (R * T)
        root = brentq(lambda x: logsumexp(x * sizes - g, b=sizes * amount / units), -500, 500)
        return np.asarray(amount * np.exp(root * sizes - g))
    p = n0.sum() * R * T / V
    root = brentq(lambda x: logsumexp(x * sizes - g, b=P0 / p), -500, 500)
    fractions = np.exp(root * sizes - g) * P0 / p
    return np.asarray(fractions * units / (sizes @ fractions))


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("seed", SEEDS)
def test_entropy_never_falls_and_energy_stays_in_an_isolated_vessel(seed: int, holds: str) -> None:
    """Adiabatic and rigid: U stays; adiabatic in a piston: H. S rises to where it rests."""
    plain = reversible(seed, holds, "adiabatic")
    run, n, T, V, p = whole_run(plain)
    S = np.sum(n * entropies(plain, T, p), axis=0)
    rise = S[-1] - S[0]
    assert rise > 0
    assert np.all(np.diff(S) >= -NOISE * rise)
    energy = np.sum(n * enthalpies(plain, T), axis=0)
    if holds == "volume":
        energy = energy - p.sum(axis=0) * V
    turned = np.sum(n * np.array(plain.cp)[:, None], axis=0)[0] * T[0]
    assert np.max(np.abs(energy - energy[0])) <= 1e-7 * turned
    net, gross = _net_and_gross(run, run.rates([run.end])[:, 0], len(plain.steps))
    assert np.all(np.abs(net) <= 1e-6 * gross)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("mode", ["isothermal", "adiabatic"])
@pytest.mark.parametrize("seed", [0])
def test_atoms_are_kept_and_samples_take_their_share(seed: int, mode: str, holds: str) -> None:
    """CH2 units: all there without samples; (1 - f1)(1 - f2) of them after two."""
    plain = replace(reversible(seed, holds, mode), end=10.0)
    sizes = np.array(plain.sizes)
    run = integrate(experiment_of(plain))
    units = sizes @ run.amounts(run.trajectory.times)
    assert np.max(np.abs(units / units[0] - 1)) < 1e-11
    # What follows a sample takes some 1e-15 s here, and the time of a run has sixteen digits.
    drawn = tuple(
        Sample(Sourced(t, "s", dimension="time"), fraction=Sourced(f, "", dimension="fraction"))
        for t, f in ((1e-3, 0.2), (1e-2, 0.5))
    )
    sampled = integrate(replace(experiment_of(plain), samples=drawn))
    left = sizes @ sampled.amounts([1e-4, 5e-3, 10.0])
    assert left == pytest.approx(units[0] * np.array([1.0, 0.8, 0.4]), rel=1e-11)
