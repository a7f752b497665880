"""Work against achieved error: the kernel and what people otherwise use, in one process, one core.

Run it:  python tests/benchmarks/compare_integrators.py [--write FILE] [--quick]

Every integrator is asked for a range of tolerances; its time at an achieved error of 1e-6 (largest
relative error of any gas at the end, gases below 1e-12 of the total aside) is read off by
interpolation of the logarithms. Times are the least of several, CPU time of this thread.
"""

from __future__ import annotations

import argparse
import os
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
    os.environ.setdefault(name, "1")
sys.path.insert(0, str(Path(__file__).parents[1] / "support"))

import numpy as np  # noqa: E402
from benchmark_problems import (  # noqa: E402
    PROBLEMS,
    Problem,
    compiled_functions,
    plain_functions,
)

from meanfree.kernel.engine import Kernel, Task  # noqa: E402
from meanfree.kernel.parameters import Variation  # noqa: E402
from meanfree.kernel.watching import Functional  # noqa: E402

TOLERANCES = (1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9)
GOAL = 1e-6
CONDITIONS = 8000


@dataclass(frozen=True)
class Point:
    """One run: tolerance asked, error achieved, seconds a run."""

    rtol: float
    error: float
    seconds: float


def least(work: Callable[[], Any], repeats: int) -> tuple[float, Any]:
    """Least CPU time of several, and the last result."""
    best, result = np.inf, None
    for _ in range(repeats):
        start = time.thread_time()
        result = work()
        best = min(best, time.thread_time() - start)
    return best, result


def error_of(problem: Problem, y: np.ndarray, exact: np.ndarray) -> float:
    """Largest relative error of any gas that is there."""
    total = problem.system.total_concentration
    n = problem.system.n_gases
    there = np.abs(exact[:n]) > 1e-12 * total
    return float(np.max(np.abs(y[:n] - exact[:n])[there] / np.abs(exact[:n])[there]))


def kernel_points(problem: Problem, exact: np.ndarray, watched: bool) -> list[Point]:
    """The kernel on many conditions, the last of which is the nominal one."""
    system = problem.system
    count = max(64, min(CONDITIONS, CONDITIONS * 20 // (system.n_gases * 4)))
    conditions = problem.spread(count)
    start = float(system.initial_x[0])
    functionals = (Functional(((0, 1.0),), levels=start * np.array([[0.5, 0.25, 0.1]])),)
    kernel, points = Kernel(system, compiled=True), []
    for rtol in TOLERANCES:
        task = Task(
            np.array([problem.end]),
            rtol=rtol,
            atol=1e-14,
            functionals=functionals if watched else (),
        )
        kernel.run(conditions.part(0, 64), task)
        seconds, found = least(lambda task=task: kernel.run(conditions, task), 3)
        points.append(Point(rtol, error_of(problem, found.ends[-1], exact), seconds / count))
    return points


def scipy_points(problem: Problem, exact: np.ndarray, method: str, compiled: bool) -> list[Point]:
    """`solve_ivp`, with a plain Python right-hand side or with compiled functions."""
    from scipy.integrate import solve_ivp

    f, J = compiled_functions(problem) if compiled else (plain_functions(problem), None)
    y0, atol, points = problem.system.initial_state, problem.atol, []
    for rtol in TOLERANCES[: 6 if compiled else 4]:

        def work(rtol: float = rtol) -> Any:
            options = {"jac": J} if J is not None else {}
            return solve_ivp(
                f, (0, problem.end), y0, method=method, rtol=rtol, atol=atol, **options
            ).y[:, -1]

        seconds, y = least(work, 2)
        points.append(Point(rtol, error_of(problem, y, exact), seconds))
    return points


def odeint_points(problem: Problem, exact: np.ndarray) -> list[Point]:
    """`odeint` with compiled functions."""
    from scipy.integrate import odeint

    f, J = compiled_functions(problem)
    points = []
    for rtol in TOLERANCES:

        def work(rtol: float = rtol) -> Any:
            return odeint(
                f, problem.system.initial_state, [0, problem.end], tfirst=True, Dfun=J, rtol=rtol,
                atol=problem.atol, mxstep=100_000,
            )[-1]  # fmt: skip

        seconds, y = least(work, 3)
        points.append(Point(rtol, error_of(problem, y, exact), seconds))
    return points


def cvode_points(problem: Problem, exact: np.ndarray) -> list[Point]:
    """SUNDIALS CVODE through scikit-sundae, with compiled functions behind Python callbacks."""
    from sksundae.cvode import CVODE

    f, J = compiled_functions(problem)

    def right(t: float, y: np.ndarray, out: np.ndarray) -> None:
        out[:] = f(t, y)

    def jacobian(t: float, y: np.ndarray, dy: np.ndarray, out: np.ndarray) -> None:
        out[:, :] = J(t, y)

    points = []
    for rtol in TOLERANCES:

        def work(rtol: float = rtol) -> Any:
            solver = CVODE(
                right, rtol=rtol, atol=problem.atol, method="BDF", linsolver="dense",
                jacfn=jacobian, max_num_steps=100_000,
            )  # fmt: skip
            span = np.array([0.0, problem.end])
            return solver.solve(span, problem.system.initial_state.copy()).y[-1]

        seconds, y = least(work, 3)
        points.append(Point(rtol, error_of(problem, y, exact), seconds))
    return points


def at_goal(points: list[Point]) -> float | None:
    """Seconds at the goal's error: between the points on either side, or at the first below it."""
    for before, after in pairwise(points):
        if before.error > GOAL >= after.error:
            share = np.log(before.error / GOAL) / np.log(before.error / after.error)
            return float(before.seconds * (after.seconds / before.seconds) ** share)
    reached = [point.seconds for point in points if point.error <= GOAL]
    return min(reached) if reached else None


def competitors(problem: Problem) -> dict[str, Callable[[np.ndarray], list[Point]]]:
    """What a problem is given to, by name; large ones not to plain Python."""
    found: dict[str, Callable[[np.ndarray], list[Point]]] = {
        "kernel": lambda exact: kernel_points(problem, exact, False),
        "kernel, three conversion times": lambda exact: kernel_points(problem, exact, True),
        "odeint, numba": lambda exact: odeint_points(problem, exact),
        "CVODE (scikit-sundae), numba": lambda exact: cvode_points(problem, exact),
    }
    methods = ("BDF", "Radau", "LSODA") if problem.system.n_gases <= 20 else ("LSODA",)
    for method in methods:
        found[f"solve_ivp {method}, numba"] = lambda exact, m=method: scipy_points(
            problem, exact, m, True
        )
        if problem.system.n_gases <= 20:
            found[f"solve_ivp {method}, Python"] = lambda exact, m=method: scipy_points(
                problem, exact, m, False
            )
    return found


def rows_of(problem: Problem) -> list[str]:
    """A table of Markdown for one problem."""
    exact = problem.exact()
    title = f"### {problem.title}"
    lines = [
        title,
        "",
        "| integrator | ms a run at error 1e-6 | times the kernel | error at rtol 1e-6 |",
    ]
    lines.append("|---|---|---|---|")
    base: float | None = None
    for name, carry_out in competitors(problem).items():
        try:
            points = carry_out(exact)
        except ImportError:
            lines.append(f"| {name} | not installed | | |")
            continue
        seconds = at_goal(points)
        base = seconds if name == "kernel" else base
        middle = next((p.error for p in points if p.rtol == 1e-6), np.nan)
        ratio = "" if seconds is None or base is None else f"{seconds / base:.0f}"
        shown = "not reached" if seconds is None else f"{seconds * 1e3:.4g}"
        lines.append(f"| {name} | {shown} | {ratio} | {middle:.1e} |")
        print(lines[-1], flush=True)
    start = time.perf_counter()
    kernel = Kernel(problem.system, compiled=False)
    built = time.perf_counter() - start
    start = time.thread_time()
    kernel.run(Variation(problem.system, 1), Task(np.array([problem.end]), rtol=1e-6))
    one = time.thread_time() - start
    lines += [
        "",
        f"Plan: {built * 1e3:.0f} ms; one run alone, interpreted: {one * 1e3:.1f} ms.",
        "",
    ]
    return lines


def main() -> None:
    """Print the tables, and write them where asked."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--write", type=Path, help="a file for the tables")
    parser.add_argument("--quick", action="store_true", help="ROBER alone")
    arguments = parser.parse_args()
    text: list[str] = []
    for name, problem in PROBLEMS.items():
        if arguments.quick and name != "rober":
            continue
        print(f"\n{problem().title}", flush=True)
        text += rows_of(problem())
    if arguments.write:
        arguments.write.write_text("\n".join(text) + "\n")


if __name__ == "__main__":
    main()
