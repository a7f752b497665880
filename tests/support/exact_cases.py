"""Random small mechanisms for the integrator without rounding, and its answers as a file.

``python tests/support/exact_cases.py`` works the answers out anew and writes
tests/data/exact_runs.json (about two seconds of a core each); slow tests do so for some of them.
"""

from __future__ import annotations

import json
import sys
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np
from exact_reference import ExactMechanism, ExactStep, solve

FILE = Path(__file__).parents[1] / "data" / "exact_runs.json"
COUNT, FRACTIONS, KEPT = 40, ("0.9", "0.5", "0.1"), 25
"""Mechanisms; fractions of the fill whose times are kept; digits written."""


def random_mechanism(seed: int) -> ExactMechanism:
    """Mechanism ``seed``: 3 or 4 gases of sizes 1 and 2, 3 to 6 one-way steps that conserve atoms.

    Rate constants lie over thirty decades, 1e-15 to 1e15, and one near each end is always there.
    Every other step is followed by its reverse; vessels alternate.
    """
    rng = np.random.default_rng([21, seed])
    sizes = (1, 2, 1, 2)[: int(rng.integers(3, 5))]
    steps: list[ExactStep] = []
    exponents = [rng.uniform(12, 15), rng.uniform(-15, -12), *rng.uniform(-15, 15, 4)]
    rng.shuffle(exponents)
    for place in range(int(rng.integers(2, 4))):
        left, right = _balanced(rng, sizes)
        steps.append(ExactStep(left, right, f"{10 ** exponents[2 * place]:.6e}"))
        if rng.random() < 0.6:
            steps.append(ExactStep(right, left, f"{10 ** exponents[2 * place + 1]:.6e}"))
    fill = [f"{10 ** rng.uniform(-4, 1):.4e}" if rng.random() < 0.7 else "0" for _ in sizes]
    fill[int(rng.integers(len(sizes)))] = "1"
    end = f"{10 ** rng.uniform(-6, 6):.3e}"
    return ExactMechanism(("volume", "pressure")[seed % 2], tuple(steps), tuple(fill), end)


def _balanced(
    rng: np.random.Generator, sizes: tuple[int, ...]
) -> tuple[dict[int, int], dict[int, int]]:
    """One or two gases to one or two others, as many atoms on both sides."""
    while True:
        lefts, rights = int(rng.integers(1, 3)), int(rng.integers(1, 3))
        left = [int(i) for i in rng.integers(0, len(sizes), lefts)]
        right = [int(i) for i in rng.integers(0, len(sizes), rights)]
        same = sum(sizes[i] for i in left) == sum(sizes[i] for i in right)
        if same and sorted(left) != sorted(right):
            return {i: left.count(i) for i in left}, {i: right.count(i) for i in right}


def _short(value: Any) -> str:
    return f"{value:.{KEPT}e}"


def answer(seed: int) -> dict[str, Any]:
    """Mechanism and answers as the file holds them."""
    mechanism = random_mechanism(seed)
    x, ratio, events = solve(mechanism, FRACTIONS)
    return {
        "seed": seed,
        "x": [_short(value) for value in x],
        "ratio": _short(ratio),
        "events": [[e.gas, e.fraction, _short(e.time), _short(e.pace)] for e in events],
    }


def answers() -> list[dict[str, Any]]:
    """What the file holds."""
    found: list[dict[str, Any]] = json.loads(FILE.read_text(encoding="utf-8"))
    return found


def number(text: str) -> float:
    """The double nearest to a written number."""
    return float(Decimal(text))


if __name__ == "__main__":
    lines = []
    for seed in range(COUNT):
        lines.append(json.dumps(answer(seed)))
        print(seed, lines[-1], file=sys.stderr, flush=True)
    FILE.write_text("[\n" + ",\n".join(lines) + "\n]\n", encoding="utf-8")
