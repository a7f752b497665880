"""How long a map over two numbers takes, 100 points each way, once everything is compiled.

    python tests/benchmarks/windows.py [CASE ...]

The first map compiles; the table gives the least of the next five.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

from meanfree.case import load_case
from meanfree.experiment.inputs import inputs
from meanfree.planning.window import axis, window

POINTS = 100
REPEATS = 5
CASES = Path(__file__).resolve().parents[2] / "cases"
SHIPPED = ("nocl-bulb", "dimer-piston", "hydrogen-bromine", "azomethane-samples")


def measured(path: Path) -> tuple[float, float]:
    """First map and the quickest of the later ones [s], temperature across, the fill upwards."""
    case = load_case(path)
    known = inputs(case.experiment)
    watched = next(name for name in known if name.startswith("fill.gases."))
    T, filled = known["temperature.value"], known[watched]
    across = axis(T, 0.9 * T.value, 1.1 * T.value, POINTS)
    up = axis(filled, filled.value / 3, filled.value * 3, POINTS)

    def once() -> float:
        began = time.perf_counter()
        window(case.experiment, case.planning, 0.5, across, up)
        return time.perf_counter() - began

    first = once()
    return first, min(once() for _ in range(REPEATS))


def main() -> None:
    """Print the table."""
    paths = [Path(name) for name in sys.argv[1:]] or [CASES / f"{name}.toml" for name in SHIPPED]
    print(f"{'case':24} {'first map':>10} {'compiled':>10}   ({POINTS} x {POINTS} points)")
    for path in paths:
        first, later = measured(path)
        print(f"{path.stem:24} {first:8.2f} s {later:8.2f} s", flush=True)


if __name__ == "__main__":
    main()
