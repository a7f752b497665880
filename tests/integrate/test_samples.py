"""Samples drawn from a running vessel: what they take, what they leave, what is conserved."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from encounters import molecule
from laboratory import experiment, si, step
from scipy.constants import R

from meanfree.errors import ComputationError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Adiabatic
from meanfree.gases.thermochemistry import from_values
from meanfree.integrate.run import Run, Status
from meanfree.integrate.single import integrate

K = 1e-3
GASES = [molecule(name) for name in ("N2O4", "NO2", "Ar")]
TIMES = (200.0, 500.0, 900.0)


def vessel(
    holds: str = "volume", dead: tuple[float, float] | None = None, until: float | None = 1500.0
) -> Experiment:
    return experiment(
        [step("N2O4 -> 2 NO2", K)],
        {"N2O4": 1.5, "Ar": 4.0},
        gases=GASES,
        holds=holds,
        T=400.0,
        until=until,
        dead=dead,
        volume=1e-3,
    )


def fractions(*shares: float) -> tuple[Sample, ...]:
    return tuple(Sample(si(t), fraction=si(f)) for t, f in zip(TIMES, shares, strict=False))


def volumes(*sizes: float) -> tuple[Sample, ...]:
    return tuple(Sample(si(t), volume=si(v)) for t, v in zip(TIMES, sizes, strict=False))


def jump(run: Run, t: float) -> tuple[np.ndarray, np.ndarray]:
    """Amounts of each gas just before and just after a time [mol]."""
    n, V0 = run.system.n_gases, run.system.initial_volume
    return tuple(run.trajectory(t, after_break=side)[:n, 0] * V0 for side in (False, True))  # type: ignore[return-value]


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("dead", [None, (2e-4, 300.0)], ids=["", "dead space"])
@pytest.mark.parametrize("by", ["fraction", "volume"])
def test_vessel_and_samples_together_keep_every_atom(
    holds: str, dead: tuple[float, float] | None, by: str
) -> None:
    """1e-12: the solver keeps linear invariants to rounding, a sample is one multiplication."""
    drawn = fractions(0.1, 0.3, 0.05) if by == "fraction" else volumes(1e-4, 2e-4, 3e-5)
    run = integrate(replace(vessel(holds, dead), samples=drawn))
    taken = sum(before - after for before, after in (jump(run, t) for t in TIMES))
    total = taken + run.amounts(run.end)[:, 0]
    nitrogen, oxygen, argon = total @ [[2, 4, 0], [1, 2, 0], [0, 0, 1]]
    start = 1.5 * (1e-3 + (0.0 if dead is None else 2e-4 * 400 / 300))
    assert nitrogen == pytest.approx(2 * start, rel=1e-12)
    assert oxygen == pytest.approx(4 * start, rel=1e-12)
    assert argon == pytest.approx(start * 4 / 1.5, rel=1e-12)
    assert max(run.invariants.elements.values()) < 1e-12


def test_pressure_drops_in_a_rigid_vessel_and_volume_in_a_piston() -> None:
    for holds, quantity in (("volume", Run.pressure), ("pressure", Run.volume)):
        run = integrate(replace(vessel(holds), samples=fractions(0.25)))
        before = quantity(run, [200.0])[0]
        state = run.trajectory(200.0, after_break=True)[:, 0]
        if holds == "volume":
            after = float(state[:3].sum()) * R * 400.0
        else:
            after = float(state[run.system.volume_index]) * run.system.initial_volume
        assert after == pytest.approx(0.75 * before, rel=1e-12)
        # a little later the other quantity is what it was
        other = Run.volume if holds == "volume" else Run.pressure
        assert other(run, [210.0])[0] == pytest.approx(other(run, [190.0])[0], rel=1e-9)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("dead", [None, (2e-4, 300.0)], ids=["", "dead space"])
def test_a_volume_takes_its_concentration(holds: str, dead: tuple[float, float] | None) -> None:
    """A sample of 50 mL at vessel conditions holds 50 mL times the concentrations then."""
    run = integrate(replace(vessel(holds, dead), samples=volumes(5e-5)))
    before, after = jump(run, 200.0)
    taken = run.concentrations(200.0)[:, 0] * 5e-5
    assert before - after == pytest.approx(taken, rel=1e-11)


def test_first_order_conversion_knows_nothing_of_samples() -> None:
    """X = 1 - n/(theta n0) is 1 - exp(-kt) with samples and without; so are the half-lives."""
    run = integrate(replace(vessel(), samples=fractions(0.1, 0.5)))
    t = np.array([100.0, 300.0, 1400.0])
    assert run.conversion("N2O4", t) == pytest.approx(1 - np.exp(-K * t), rel=1e-7)
    assert run.retained(t) == pytest.approx([1.0, 0.9, 0.45], rel=1e-14)
    first = run.half_lives("N2O4")[0].duration
    assert first == pytest.approx(math.log(2) / K, rel=1e-7)


def test_a_second_order_reaction_slows_by_what_is_taken() -> None:
    """2 A -> products at constant volume: 1/c grows by 2kt, and c falls to 0.6 c in between."""
    k, c0 = 2e-4, 5.0
    made = experiment([step("2 A -> B", k)], {"A": c0}, until=1000.0)
    run = integrate(replace(made, samples=(Sample(si(400.0), fraction=si(0.4)),)))
    middle = 0.6 / (1 / c0 + 2 * k * 400)
    expected = 1 / (1 / middle + 2 * k * 600)
    assert run.concentrations(1000.0)[0, 0] == pytest.approx(expected, rel=1e-7)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_a_sample_leaves_at_the_temperature_of_the_gas(holds: str) -> None:
    """Adiabatic: T does not jump, and energy is conserved with what the sample took along."""
    gases = [
        replace(
            gas,
            thermochemistry=from_values(
                enthalpy_298=si(H),
                entropy_298=si(200.0),
                heat_capacity=[(200.0, 35.0), (2e3, 50.0)],
            ),
        )
        for gas, H in zip(GASES, (30e3, 20e3, 0.0), strict=True)
    ]
    made = replace(
        vessel(holds), gases=tuple(gases), temperature=Adiabatic(si(500.0)), samples=fractions(0.3)
    )
    run = integrate(made)
    T = [run.trajectory(200.0, after_break=side)[-1, 0] for side in (False, True)]
    assert T[0] == T[1] < 500.0
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-8


def test_an_open_run_ends_where_conversion_does() -> None:
    """99.9 % of what samples left: at ln(1000)/k, whatever was drawn."""
    run = integrate(replace(vessel(until=None), samples=fractions(0.5, 0.5)))
    assert run.status is Status.CONVERTED
    assert run.end == pytest.approx(math.log(1000) / K, rel=1e-6)


def test_a_sample_larger_than_the_vessel_is_refused() -> None:
    with pytest.raises(ComputationError) as refused:
        integrate(replace(vessel("pressure"), samples=volumes(5e-3)))
    assert str(refused.value) == ("the sample at 200 s, 0.005 m^3, is more than the vessel holds")
