"""Runs whose temperature moves: energy balances and programs, in both vessels."""

from __future__ import annotations

import numpy as np
import pytest
from random_experiments import random_experiment

from meanfree.equations.build import build_system
from meanfree.experiment.plan import Solver
from meanfree.integrate.stepping import equations_for, step_through
from meanfree.kernel.engine import Kernel, Task
from meanfree.kernel.parameters import Variation
from meanfree.kernel.status import Ending

# Experiments of `random_experiments` that scipy finishes in a few seconds at 1e-11: adiabatic,
# exchange (with dead space and wall) and programs, in a rigid vessel and in a piston.
INDICES = (1, 2, 9, 17)
END = 450.0


@pytest.mark.parametrize("index", INDICES)
def test_end_points(index: int) -> None:
    system = build_system(random_experiment(index))
    assert system.mode != "isothermal"
    kept = Kernel(system, compiled=False).run(
        Variation(system, 1), Task(np.array([END]), rtol=1e-7, most_steps=5000)
    )
    assert kept.marks[0, 0] == Ending.REACHED
    stepped = step_through(equations_for(system), Solver("Radau", 1e-11, 1e-20), END)
    exact = stepped.trajectory(END)[:, 0]
    error = np.abs(kept.ends[0, : system.size] - exact)
    # As for isothermal runs: some tens of the tolerance of one step.
    assert np.all(error <= 30e-7 * np.abs(exact) + 1e-15 * system.total_concentration)
    if system.mode == "program":
        last = system.segments[-1]
        assert kept.ends[0, system.size] == pytest.approx(last.temperature, rel=1e-14)
