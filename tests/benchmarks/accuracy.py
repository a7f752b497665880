"""Print what each solver of a single run reaches, as a table for the README.

Run it from the project: ``python tests/benchmarks/accuracy.py``. The errors are the largest
relative difference from published or closed-form values; the work is the solver's own count.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1] / "support"))


def problems():
    """(name, experiment, error of a run) of each problem."""
    from laboratory import experiment, step
    from published_problems import HIRES_END, ROBER_END, hires, rober

    def end_error(reference):
        n = len(reference)
        return lambda run: np.max(np.abs(run.state(run.end)[:n, 0] / reference - 1))

    dimer = experiment([step("2 A -> B", 0.25)], {"A": 2.0}, holds="pressure")

    def time_error(run):
        X = np.array([0.1, 0.3, 0.5, 0.7, 0.9])
        exact = 0.5 * X / (1 - X) - 0.5 * np.log(1 - X)
        return max(abs(run.reaction_time("A", x) / t - 1) for x, t in zip(X, exact, strict=True))

    yield "ROBER to 1e11 s", rober(), end_error(ROBER_END)
    yield "HIRES", hires(), end_error(HIRES_END)
    yield "times to 10 to 90 %, second order in a piston", dimer, time_error


def main() -> None:
    """Print the table."""
    from meanfree.experiment.plan import Solver
    from meanfree.integrate.single import integrate

    print("| problem | method | rtol | error | steps | evaluations | seconds |")
    print("|---|---|---|---|---|---|---|")
    for name, case, error in problems():
        for method in ("Radau", "BDF", "LSODA"):
            for rtol in (1e-6, 1e-8, 1e-10):
                solver = Solver(method, rtol=rtol)  # type: ignore[arg-type]
                start = time.perf_counter()
                run = integrate(case, solver)
                spent = time.perf_counter() - start
                work = run.counters
                print(
                    f"| {name} | {method} | {rtol:g} | {error(run):.0e} | {work.n_steps} "
                    f"| {work.nfev} | {spent:.2f} |",
                    flush=True,
                )


if __name__ == "__main__":
    main()
