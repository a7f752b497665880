"""Every reader of a System gives the same equations, and they are those of the textbook.

Random experiments (`random_experiments`) visit rigid vessels and pistons, dead space, all
temperature modes and every kind of step. `plain_equations` writes their balances independently.
"""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from itertools import product

import numpy as np
import plain_equations as plain
import pytest
from random_experiments import (
    FRAMES,
    MAKERS,
    random_experiment,
    random_state,
)
from rare_experiments import RARE, rare_experiment

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations import thermal
from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.build import build_system
from meanfree.equations.compiled import CompiledEquations
from meanfree.equations.system import Segment, System
from meanfree.equations.templates import depends_on
from meanfree.experiment.equilibrium import ln_K
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.temperature import has_energy_balance
from meanfree.rates.capture import Capture
from meanfree.rates.registry import LAWS
from meanfree.rates.wall import Wall

COUNT = 3 * len(FRAMES)
INDICES = range(COUNT + RARE)
"""The random ones, and after them those with exact walls, ions and lamps."""

# Both sides round differently: exp(-E/RT) and exp(-dG/RT) turn the rounding of an exponent of
# size up to 100 into 100 eps = 2e-14, and G = H - TS loses up to a factor 30 more.
ROUNDING = 1e-11
# Orders below one are smoothed at 1e-9 of the total; the states hold 0.02 of it or more, so
# that the smoothing itself is (1e-9/0.02)^2 = 3e-15 and far below the rounding.


@cache
def experiment(index: int) -> Experiment:
    return random_experiment(index) if index < COUNT else rare_experiment(index - COUNT)


@cache
def system(index: int) -> System:
    return build_system(experiment(index))


@cache
def compiled(index: int) -> CompiledEquations:
    return CompiledEquations(system(index))


def moment(index: int) -> tuple[float, Segment]:
    """A time inside one of the System's segments."""
    segments = system(index).segments
    segment = segments[index % len(segments)]
    return segment.start + (0.4 * (segment.end - segment.start) if segment.slope else 7.0), segment


def gross_derivative(index: int, found: plain.Parts) -> np.ndarray:
    """What the terms of dy/dt add up to without their signs: the scale of its rounding."""
    names = [gas.name for gas in experiment(index).gases]
    flow = np.abs(found.flow)
    dx = [
        sum(f * abs(row.get(g, 0.0)) for f, row in zip(flow, found.net, strict=True)) for g in names
    ]
    rest = np.abs(found.dy[len(names) :])
    gross = np.array([*dx, *rest])
    if has_energy_balance(experiment(index).temperature):
        gross[-1] += np.sum(flow * np.abs(found.energy)) / found.capacity
    if not experiment(index).vessel.is_rigid:
        n, here = len(names), system(index).volume_index
        T = 700.0 if has_energy_balance(experiment(index).temperature) else 500.0
        gross[here] += R * T / experiment(index).held_pressure * sum(gross[:n])
        gross[here] += gross[-1] / T if here != len(gross) - 1 else 0.0
    return gross


def gross_jacobian(index: int, y: np.ndarray, found: plain.Parts, moved: list) -> np.ndarray:
    """The same scale for each entry of the Jacobian."""
    names = [gas.name for gas in experiment(index).gases]
    frame, n, size = system(index), len(names), len(y)
    gross = np.zeros((size, size))
    for j, parts in enumerate(moved):
        by = np.abs(parts.flow.imag) / 1e-30
        for i, name in enumerate(names):
            gross[i, j] = sum(
                f * abs(row.get(name, 0.0)) for f, row in zip(by, found.net, strict=True)
            )
        gross[n : n + frame.n_ledger, j] = np.abs(parts.dy.imag[n : n + frame.n_ledger]) / 1e-30
        if frame.temperature_varies:
            energies = np.abs(parts.energy.imag) / 1e-30
            heat = by @ np.abs(found.energy) + np.abs(found.flow) @ energies
            heat += frame.exchange * (j == size - 1)
            heat += abs(found.dy[-1]) * abs(parts.capacity.imag) / 1e-30
            gross[-1, j] = heat / found.capacity
    if frame.volume_varies:
        T = y[-1] if frame.temperature_varies else frame.initial_temperature
        dT = found.dy[-1] if frame.temperature_varies else 1.0
        row = R * T / frame.held_pressure * gross[:n].sum(axis=0) + abs(dT) / T
        gross[frame.volume_index] = row + (gross[-1] / T if frame.temperature_varies else 0.0)
    # The smoothed power of order 0 has the slope e^2/c^3, found as a difference of order 1/c.
    return gross + np.outer(gross_derivative(index, found), 1 / np.where(y == 0, np.inf, y))


def assert_same_jacobians(
    first: np.ndarray, second: np.ndarray, dy: np.ndarray, y: np.ndarray
) -> None:
    """Two readers add the same terms in another order: hold them to the largest of each row."""
    largest = np.abs(first).max(axis=1)[:, None] + np.abs(dy)[:, None] / np.abs(y).max()
    assert np.all(np.abs(first - second) <= 1e-10 * np.abs(first) + ROUNDING * largest)


def test_the_random_experiments_visit_everything() -> None:
    steps = [step for index in INDICES for step in experiment(index).steps]
    assert COUNT >= 60
    assert {type(step.law).word for step in steps} == set(MAKERS) == set(LAWS)
    reverses = [step.reverse for step in steps if step.reverse is not None]
    kinds = {reverse if isinstance(reverse, str) else reverse.kind for reverse in reverses}
    assert kinds == {"thermochemistry", "Kp", "Kc", "K"}
    assert {r.enthalpy is None for r in reverses if not isinstance(r, str)} == {True, False}
    orders = {order for step in steps if step.stated_orders for _, order in step.stated_orders}
    assert orders == {0.0, 0.5, 1.5, 2.0}
    assert any(set(dict(s.reactants)) & set(dict(s.products)) for s in steps)
    assert any(s.bath is not None and s.reverse is not None for s in steps)
    assert {s.bath.others for s in steps if s.bath is not None} == {1.0, 0.4}
    assert any(not s.reactants for s in steps)
    assert any(not s.products for s in steps)
    free = [s for i in INDICES if system(i).temperature_varies for s in experiment(i).steps]
    assert any(s.heat is not None and s.reverse is not None for s in free)
    assert any(s.photon is not None for s in free)
    like = {s.partners[0] == s.partners[1] for s in steps if s.law.word == "collision"}
    assert like == {True, False}
    assert any(s.change_of_moles for s in free)
    guarded = [len(system(i).guards.column) for i in INDICES]
    assert any(guarded)
    depend = [depends_on(b.law) for i in INDICES for b in system(i).blocks]
    assert {"T"} in depend
    assert {"T", "M"} in depend
    assert {"T", "p"} in depend
    walls = {
        (s.law.form, experiment(i).vessel.shape.form)
        for i in INDICES
        for s in experiment(i).steps
        if isinstance(s.law, Wall)
    }
    assert walls >= set(product(("exact", "quick"), ("sphere", "cylinder"))) - {
        ("quick", "cylinder")
    }
    lit = [s.switches.min() for i in INDICES for s in [moment(i)[1]] if s.switches is not None]
    assert set(lit) == {0.0, 1.0}
    ions = [s.law for s in steps if isinstance(s.law, Capture) and s.law.dipole is not None]
    # x = mu_D/sqrt(2 alpha k T) [SI: over 4 pi eps0] about 500 K, on both sides of 2
    sizes = [
        law.dipole.value / (2 * 1.1e-10 * law.polarisability["NO2"].value * 7e-21) ** 0.5
        for law in ions
    ]
    assert min(sizes) < 1.7
    assert max(sizes) > 2.3


@pytest.mark.parametrize("index", INDICES, scope="module")
def test_right_hand_sides_are_those_of_the_textbook(index: int) -> None:
    y, (t, segment) = random_state(index, system(index)), moment(index)
    found = plain.parts(experiment(index), t, y)
    scale = ROUNDING * gross_derivative(index, found)
    arrays = ArrayEquations(system(index)).derivative(t, y, segment)
    symbolic = compiled(index).derivative(t, y, segment)
    assert np.all(np.abs(arrays - found.dy) <= scale)
    assert np.all(np.abs(symbolic - found.dy) <= scale)


@pytest.mark.parametrize("index", INDICES, scope="module")
def test_jacobians_are_the_derivatives_by_a_complex_step(index: int) -> None:
    """A complex step of 1e-30 has no truncation error (Squire and Trapp 1998): rounding only."""
    y, (t, segment) = random_state(index, system(index)), moment(index)
    moved = plain.complex_step(experiment(index), t, y)
    exact = plain.jacobian(experiment(index), t, y)
    scale = ROUNDING * gross_jacobian(index, y, plain.parts(experiment(index), t, y), moved)
    arrays = ArrayEquations(system(index)).jacobian(t, y, segment).toarray()
    symbolic = compiled(index).jacobian(t, y, segment)
    assert np.all(np.abs(arrays - exact) <= scale)
    assert np.all(np.abs(symbolic - exact) <= scale)


@pytest.mark.parametrize("index", INDICES, scope="module")
def test_readers_agree_where_gases_are_absent(index: int) -> None:
    """At zero, and a little below, where the smoothing of low orders acts."""
    frame = system(index)
    y, (t, segment) = random_state(index, frame), moment(index)
    rng = np.random.default_rng(index)
    absent = rng.choice([0.0, 1e-12, -1e-12, 1e-9], frame.n_gases) * frame.total_concentration
    y[: frame.n_gases] = np.where(rng.random(frame.n_gases) < 0.5, absent, y[: frame.n_gases])
    one, other = ArrayEquations(frame), compiled(index)
    first, second = one.derivative(t, y, segment), other.derivative(t, y, segment)
    # The same terms in another order: compare with the largest term of a row.
    largest = np.abs(first).max()
    np.testing.assert_allclose(first, second, rtol=1e-10, atol=1e-12 * largest)
    jacobians = one.jacobian(t, y, segment).toarray(), other.jacobian(t, y, segment)
    assert_same_jacobians(*jacobians, first, y)


@pytest.mark.parametrize("index", INDICES, scope="module")
def test_switched_off_steps_take_no_part(index: int) -> None:
    """A step that is switched off takes no part in either reader, nor in the Jacobian."""
    frame = system(index)
    y, (t, segment) = random_state(index, frame), moment(index)
    switches = np.random.default_rng(index).choice([0.0, 1.0, 0.3], frame.n_steps)
    lit = Segment(segment.start, segment.end, segment.temperature, segment.slope, switches)
    arrays, unlit = ArrayEquations(frame), replace(segment, switches=None)
    full, part = arrays.rates(t, y, unlit), arrays.rates(t, y, lit)
    np.testing.assert_allclose(part, full * switches, rtol=1e-14)
    jacobians = arrays.jacobian(t, y, lit).toarray(), compiled(index).jacobian(t, y, lit)
    assert_same_jacobians(*jacobians, arrays.derivative(t, y, segment), y)


@pytest.mark.parametrize("index", INDICES, scope="module")
def test_elements_are_conserved(index: int) -> None:
    """Nothing but sources and losses (the ledger) changes the atoms in the vessel."""
    frame, gases = system(index), experiment(index).gases
    y, (t, segment) = random_state(index, frame), moment(index)
    dy = ArrayEquations(frame).derivative(t, y, segment)
    flows = ArrayEquations(frame).rates(t, y, segment)
    ledger = dict(zip(frame.open_steps, dy[frame.n_gases :], strict=False))
    for element in ("N", "O", "Ar"):
        atoms = np.array([gas.formula.count(element) for gas in gases], float)
        gained = sum(
            extent * sum(number * atoms[i] for i, number in frame.net.row(int(j)))
            for j, extent in ledger.items()
        )
        # Ten terms of size 10 flows each, summed in two orders.
        assert abs(atoms @ dy[: frame.n_gases] - gained) <= 1e-13 * 100 * np.abs(flows).max()


def reversible() -> list[int]:
    return [i for i in INDICES if any(s.reverse is not None for s in experiment(i).steps)]


@pytest.mark.parametrize("index", reversible(), scope="module")
def test_equilibrium_constants_are_those_of_the_experiment(index: int) -> None:
    """ln K_c of the System against ln K of `experiment.equilibrium`, K_c = K (p0/RT)^change."""
    frame = system(index)
    arrays, reverses = ArrayEquations(frame), frame.reverses
    for T in (310.0, 480.0, 900.0):
        dG = dH = np.zeros(len(reverses.step))
        if frame.thermal is not None:
            dG = arrays.of_reaction(thermal.properties(frame.thermal, T).g)[reverses.forward]
            dH = arrays.of_reaction(thermal.properties(frame.thermal, T).h)[reverses.forward]
        change = arrays.change[reverses.forward]
        lnKc, slope = thermal.ln_Kc(reverses, T, change, dG, dH)
        steps = [s for s in experiment(index).steps if s.reverse is not None]
        expected = [
            ln_K(s, experiment(index).gas_named, T)
            + s.change_of_moles * np.log(STANDARD_PRESSURE / (R * T))
            for s in steps
        ]
        # G of size 1e6 J/mol over RT of 2500 to 7500: eps times 400, summed.
        np.testing.assert_allclose(lnKc, expected, rtol=1e-12, atol=1e-12)
        # Both K_c of the textbook and its own slope, by a complex step.
        own = [
            np.log(plain.concentration_constant(experiment(index), s, T + 1e-30j)) for s in steps
        ]
        np.testing.assert_allclose(lnKc, np.real(own), rtol=1e-12, atol=1e-12)
        np.testing.assert_allclose(slope, np.imag(own) / 1e-30, rtol=1e-9, atol=1e-14)


@pytest.mark.parametrize("index", reversible(), scope="module")
def test_rates_balance_at_equilibrium(index: int) -> None:
    """Where the product of powers of c is K_c, a step and its reverse are equally fast."""
    frame, arrays = system(index), ArrayEquations(system(index))
    _, (t, segment) = random_state(index, frame), moment(index)
    y = random_state(index, frame)
    state = arrays.unpack(t, y, segment)
    rates = arrays.rates(t, y, segment)
    for step in experiment(index).steps:
        if step.reverse is None:
            continue
        forward = frame.step_index[step.name]
        quotient = np.prod([state.c[i] ** number for i, number in frame.net.row(forward)])
        Kc = plain.concentration_constant(experiment(index), step, state.T)
        np.testing.assert_allclose(
            rates[forward + 1] / rates[forward], quotient / Kc, rtol=ROUNDING
        )


def test_a_temperature_beyond_the_series_keeps_energy_and_its_slope_together() -> None:
    """A trial step of the integrator may leave the range: H must then go on with slope Cp."""
    index = next(i for i in INDICES if system(i).temperature_varies)
    table, gases = system(index).thermal, experiment(index).gases
    for T in (150.0, 4000.0):
        Cp, slope = thermal.properties(table, T).cp, thermal.properties(table, T).cp_slope
        np.testing.assert_array_equal(slope, 0.0)
        step = 0.5
        rise = thermal.properties(table, T + step).h - thermal.properties(table, T - step).h
        # A straight line: exact but for the rounding of H, 1e5 J/mol times eps.
        np.testing.assert_allclose(rise / (2 * step), Cp, rtol=1e-9)
        for i, gas in enumerate(gases):
            assert thermal.properties(table, T).h[i] == pytest.approx(
                float(gas.thermochemistry.enthalpy(T)), rel=1e-12, abs=1e-6
            )
            assert thermal.properties(table, T).g[i] == pytest.approx(
                float(gas.thermochemistry.gibbs(T)), rel=1e-12, abs=1e-6
            )
