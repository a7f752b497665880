"""Print how time and memory grow with the mechanism, from 10 to 3,000 gases.

Run it from the project: ``python tests/benchmarks/large_mechanisms.py``.
"""

from __future__ import annotations

import resource
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).parents[1] / "support"))


def timed(work: Callable[[], Any], repeats: int) -> float:
    """Least time of one call [s]."""
    best = float("inf")
    for _ in range(repeats):
        start = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - start)
    return best


def main() -> None:
    """Print the table and the slopes between its rows."""
    import numpy as np
    from published_problems import ladder

    from meanfree.equations.arrays import ArrayEquations
    from meanfree.equations.build import build_system
    from meanfree.experiment.plan import Solver
    from meanfree.integrate.single import integrate

    print("| gases | steps | assembly ms | dy/dt us | Jacobian us | BDF s | solver steps | MB |")
    print("|---|---|---|---|---|---|---|---|")
    rows = []
    for n in (10, 100, 1000, 3000):
        case = ladder(n)
        assembly = timed(lambda case=case: build_system(case), 3)
        system = build_system(case)
        equations, y, segment = ArrayEquations(system), system.initial_state, system.segments[0]
        arguments = (0.0, y, segment)
        evaluation = timed(lambda e=equations, a=arguments: e.derivative(*a), 50)
        jacobian = timed(lambda e=equations, a=arguments: e.jacobian(*a), 20)
        start = time.perf_counter()
        run = integrate(case, Solver("BDF", rtol=1e-6, atol=1e-14))
        solve = time.perf_counter() - start
        memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
        rows.append((n, assembly, evaluation, jacobian, solve))
        print(
            f"| {n} | {len(case.steps)} | {assembly * 1e3:.1f} | {evaluation * 1e6:.0f} "
            f"| {jacobian * 1e6:.0f} | {solve:.2f} | {run.counters.n_steps} | {memory:.0f} |",
            flush=True,
        )
    first, last = np.log(rows[-2]), np.log(rows[-1])
    slopes = (last - first)[1:] / (last - first)[0]
    print("slopes of time against gases, 1,000 to 3,000:", end=" ")
    print("assembly {:.2f}, dy/dt {:.2f}, Jacobian {:.2f}, solution {:.2f}".format(*slopes))


if __name__ == "__main__":
    main()
