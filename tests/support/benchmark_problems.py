"""Problems for benchmarks, and their equations as people write them by hand: straight-line code."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from kernel_problems import experiment, rober, spread, step

from meanfree.equations.build import build_system
from meanfree.equations.system import System
from meanfree.experiment.experiment import Experiment
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation


@dataclass(frozen=True)
class Problem:
    """A System, how long it runs [s] and what it is called."""

    title: str
    system: System
    end: float

    @property
    def atol(self) -> float:
        """Absolute tolerance of the others [mol/m^3]; far below what is compared."""
        return 1e-14 * self.system.total_concentration

    def spread(self, count: int) -> Variation:
        """Conditions within a factor e^0.34 of the nominal one, which comes last."""
        found = spread(self.system, count, 0, 0.34)
        for name, value in found.values.items():
            value[-1] = self.system.blocks[int(name[1])].numbers[0, int(name[3])]
        return found

    def exact(self) -> np.ndarray:
        """The end by the kernel at 1e-12; tests hold the kernel against scipy's Radau."""
        task = Task(np.array([self.end]), rtol=1e-12, atol=1e-20)
        return Kernel(self.system, compiled=False).run(Variation(self.system, 1), task).ends[0]


def hires() -> Experiment:
    """E. Schafer, J. Math. Biol. 2 (1975) 41, with the numbers of Hairer and Wanner II, IV.10.

    High irradiance responses of photomorphogenesis: eight reactants, written as steps.
    """
    steps = [
        ("1", "2", 1.71), ("2", "1", 0.43), ("2", "4", 8.32), ("3", "1", 8.32), ("3", "4", 1.71),
        ("", "1", 0.0007), ("4", "3", 0.43), ("4", "6", 0.69), ("5", "3", 0.035), ("5", "6", 1.71),
        ("6", "5", 0.43), ("68", "7", 280.0), ("7", "58", 0.43), ("7", "68", 0.69),
        ("7", "8", 0.69),
    ]  # fmt: skip
    made = [
        step(f"{left or 0} to {right}", {f"y{g}": 1 for g in left}, {f"y{g}": 1 for g in right}, k)
        for left, right, k in steps
    ]
    fill = {f"y{i}": 0.0 for i in range(1, 9)} | {"y1": 1.0, "y8": 0.0057}
    return experiment(made, fill)


def bromine() -> Experiment:
    """H2 + Br2 -> 2 HBr by its chain; rate constants of the size found near 600 K, illustrative."""
    steps = [
        step("start", {"Br2": 1}, {"Br": 2}, 4e-6),
        step("stop", {"Br": 2}, {"Br2": 1}, 2e5),
        step("chain 1", {"Br": 1, "H2": 1}, {"HBr": 1, "H": 1}, 3.0),
        step("chain 2", {"H": 1, "Br2": 1}, {"HBr": 1, "Br": 1}, 1e8),
        step("back", {"H": 1, "HBr": 1}, {"H2": 1, "Br": 1}, 1e7),
    ]
    return experiment(steps, {"H2": 10.0, "Br2": 10.0})


def network(n: int, m: int, seed: int) -> Experiment:
    """A conservative random mechanism with rates over eight decades: A -> B, A + B -> C + D.

    Partners lie near each other on a ring, so that factors stay sparse as they do in chemistry.
    """
    rng = np.random.default_rng(seed)
    reach = n if n <= 20 else 8
    steps = []
    for j in range(m):
        a = int(rng.integers(n))
        b, c, d = ((a + int(i)) % n for i in rng.choice(np.arange(1, reach), 3, replace=False))
        k = float(10 ** rng.uniform(-4, 4))
        if rng.random() < 0.5:
            steps.append(step(str(j), {f"G{a}": 1}, {f"G{b}": 1}, k))
        else:
            steps.append(step(str(j), {f"G{a}": 1, f"G{b}": 1}, {f"G{c}": 1, f"G{d}": 1}, k))
    fill = {f"G{i}": float(x) for i, x in enumerate(rng.uniform(0.01, 0.3, max(6, n // 4)))}
    return experiment(steps, fill)


PROBLEMS: dict[str, Callable[[], Problem]] = {
    "rober": lambda: Problem("ROBER to 1e5 s", build_system(rober()), 1e5),
    "hires": lambda: Problem("HIRES to 321.8 s", build_system(hires()), 321.8122),
    "bromine": lambda: Problem("Bromine chain to 1e4 s", build_system(bromine()), 1e4),
    "20": lambda: Problem("20 gases, 25 steps", build_system(network(20, 25, 1)), 60.0),
    "100": lambda: Problem("100 gases, 250 steps", build_system(network(100, 250, 1)), 60.0),
}


def _source(system: System) -> str:
    """Right-hand side and Jacobian as a person would write them; whole orders only."""
    k = np.zeros(system.n_steps)
    for block in system.blocks:
        k[block.steps] = block.numbers[0]
    right, entries = [], []
    rows: dict[int, list[str]] = {i: [] for i in range(system.size)}
    parts: dict[tuple[int, int], list[str]] = {}
    for j in range(system.n_steps):
        powers = [gas for gas, order in system.orders.row(j) for _ in range(int(order))]
        right.append(f"    r{j} = " + "*".join([repr(float(k[j])), *(f"y[{g}]" for g in powers)]))
        changes = dict(system.net.row(j))
        for place, opened in enumerate(system.open_steps):
            if opened == j:
                changes[system.n_gases + place] = 1.0
        for row, number in changes.items():
            rows[row].append(f"{number:+g}*r{j}")
            for gas in set(powers):
                left = list(powers)
                left.remove(gas)
                factors = [
                    f"{number * powers.count(gas) * float(k[j])!r}",
                    *(f"y[{g}]" for g in left),
                ]
                parts.setdefault((row, gas), []).append("*".join(factors))
    right += [f"    out[{i}] = " + ("".join(terms) or "0.0") for i, terms in rows.items()]
    entries += [f"    J[{r}, {c}] = " + " + ".join(terms) for (r, c), terms in parts.items()]
    n, body, matrix = system.size, "\n".join(right), "\n".join(entries)
    return (
        f"def right(t, y):\n    out = np.empty({n})\n{body}\n    return out\n"
        f"def jacobian(t, y):\n    J = np.zeros(({n}, {n}))\n{matrix}\n    return J\n"
    )


@cache
def _functions(source: str, compiled: bool) -> tuple[Callable[..., Any], Callable[..., Any]]:
    space: dict[str, Any] = {"np": np}
    exec(source, space)  # noqa: S102  # written above from index arrays
    f, J = space["right"], space["jacobian"]
    if compiled:
        from numba import njit

        f, J = njit(f), njit(J)
    return f, J


def plain_functions(problem: Problem) -> Callable[..., Any]:
    """The right-hand side in plain Python."""
    return _functions(_source(problem.system), False)[0]


def compiled_functions(problem: Problem) -> tuple[Callable[..., Any], Callable[..., Any]]:
    """Right-hand side and Jacobian compiled by numba."""
    f, J = _functions(_source(problem.system), True)
    y = problem.system.initial_state
    f(0.0, y)
    J(0.0, y)
    return f, J
