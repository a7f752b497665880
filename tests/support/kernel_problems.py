"""Stiff problems for the kernel: published ones and random mechanisms, in both vessels."""

from __future__ import annotations

import numpy as np

from meanfree.equations.system import System
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Bath, Step
from meanfree.experiment.plan import RunPlan
from meanfree.experiment.temperature import Isothermal
from meanfree.experiment.vessel import DeadSpace, Vessel
from meanfree.gases.gas import Gas
from meanfree.kernel.parameters import Variation
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced as S


def experiment(
    steps: list[Step], fill: dict[str, float], holds: str = "volume", dead: bool = False
) -> Experiment:
    """An isothermal experiment with amounts [mol] in one cubic metre at 300 K."""
    names = dict.fromkeys([*fill, *(name for step in steps for name in step.net)])
    vessel = Vessel(
        holds,  # type: ignore[arg-type]
        S(1.0),
        dead_space=DeadSpace(S(0.05), S(290.0)) if dead else None,
    )
    portions = {name: Portion(S(amount), "amount") for name, amount in fill.items()}
    gases = tuple(Gas.label(name) for name in names)
    return Experiment(
        "t", gases, tuple(steps), vessel, Isothermal(S(300.0)), Fill(portions), RunPlan()
    )


def step(
    name: str, left: dict[str, float], right: dict[str, float], k: float, **more: object
) -> Step:
    """A step with a fixed rate constant."""
    return Step(name, tuple(left.items()), tuple(right.items()), Fixed(S(k)), **more)  # type: ignore[arg-type]


def rober(holds: str = "volume") -> Experiment:
    """H. H. Robertson, in Numerical Analysis: An Introduction (J. Walsh, ed.), 1966, p. 178."""
    return experiment(
        [
            step("1", {"A": 1}, {"B": 1}, 0.04),
            step("2", {"B": 2}, {"B": 1, "C": 1}, 3e7),
            step("3", {"B": 1, "C": 1}, {"A": 1, "C": 1}, 1e4),
        ],
        {"A": 1.0},
        holds,
    )


def random_network(seed: int, n: int = 6, m: int = 9, holds: str = "volume") -> Experiment:
    """A random mechanism: rates over eight decades, one and two reactants, baths, odd orders.

    Losses, sources and changes of the number of moles occur; nothing grows without bound.
    """
    rng = np.random.default_rng(seed)
    names = [f"G{i}" for i in range(n)]
    steps = []
    for j in range(m):
        k = float(10 ** rng.uniform(-4, 4))
        kind = rng.choice(["one", "split", "two", "join", "bath", "half", "loss", "zero"])
        a, b, c, d = (names[i] for i in rng.choice(n, 4, replace=False))
        if kind == "one":
            steps.append(step(str(j), {a: 1}, {b: 1}, k))
        elif kind == "split":
            steps.append(step(str(j), {a: 1}, {b: 1, c: 1}, 1e-2 * k))
        elif kind == "two":
            steps.append(step(str(j), {a: 1, b: 1}, {c: 1, d: 1}, k))
        elif kind == "join":
            steps.append(step(str(j), {a: 2}, {c: 1}, k))
        elif kind == "bath":
            bath = Bath({a: float(rng.uniform(0, 6))})
            steps.append(step(str(j), {a: 1, b: 1}, {c: 1}, k, bath=bath))
        elif kind == "half":
            orders = ((a, float(rng.choice([0.5, 1.5]))),)
            steps.append(step(str(j), {a: 1}, {b: 1}, min(k, 10.0), stated_orders=orders))
        elif kind == "loss":
            steps.append(step(str(j), {a: 1}, {}, 1e-3 * k))
        else:
            steps.append(step(str(j), {}, {a: 1}, 1e-6 * k))
    fill = {name: float(10 ** rng.uniform(-3, 0)) for name in names[: n // 2 + 1]}
    return experiment(steps, fill, holds, dead=bool(rng.random() < 0.3))


def spread(system: System, count: int, seed: int, width: float = 0.7) -> Variation:
    """Conditions with rate constants and fill within a factor e^width of the System's."""
    rng = np.random.default_rng(seed)
    values = {}
    for b, block in enumerate(system.blocks):
        for position in range(len(block.steps)):
            factors = np.exp(rng.uniform(-width, width, count))
            values["number", b, 0, position] = block.numbers[0, position] * factors
    return Variation(system, count, values)


def system_of(variation: Variation, c: int) -> System:
    """The System of one condition."""
    from dataclasses import replace

    blocks = []
    for b, block in enumerate(variation.system.blocks):
        numbers = block.numbers.copy()
        for slot in range(numbers.shape[0]):
            for position in range(numbers.shape[1]):
                value = variation.get("number", b, slot, position)
                numbers[slot, position] = value[min(c, len(value) - 1)]
        blocks.append(replace(block, numbers=numbers))
    return replace(variation.system, blocks=tuple(blocks))


def reference(system: System, end: float, rtol: float = 1e-12) -> np.ndarray:
    """The state at the end by scipy's Radau at its tightest."""
    return reference_solution(system, end, rtol).y[:, -1]


def reference_solution(system: System, end: float, rtol: float = 1e-12, dense: bool = False):  # type: ignore[no-untyped-def]
    """scipy's Radau at its tightest, restarted nowhere: for Systems without breaks."""
    from scipy.integrate import solve_ivp

    from meanfree.equations.compiled import CompiledEquations

    equations, segment = CompiledEquations(system), system.segments[0]
    with np.errstate(all="ignore"):
        return solve_ivp(
            lambda t, y: equations.derivative(t, y, segment),
            (0.0, end),
            system.initial_state,
            method="Radau",
            rtol=rtol,
            atol=1e-22 * system.total_concentration,
            jac=lambda t, y: equations.jacobian(t, y, segment),
            dense_output=dense,
        )
