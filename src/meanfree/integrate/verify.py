"""A run repeated by another method at a tenth of the tolerance, and the difference stated."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from meanfree.experiment.plan import Method
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.sourced import Sourced

SECOND: dict[str, Method] = {"Radau": "BDF", "BDF": "Radau", "LSODA": "Radau"}
"""The method that checks each method. LSODA shares its family with BDF, so Radau checks both."""


@dataclass(frozen=True)
class Verification:
    """The largest difference between two integrations of one experiment.

    ``difference`` is over the most that was ever there of ``gas``, found at ``time`` [s].
    """

    method: str
    rtol: float
    difference: float
    gas: str
    time: float


def verify(run: Run, n_times: int = 400) -> Verification:
    """Integrate again with a second method and a tenth of the tolerance, and compare.

    Raises
    ------
    ComputationError
        The second integration failed.
    """
    method = SECOND[run.method]
    solver = replace(
        run.experiment.plan.solver,
        method=method,
        rtol=run.rtol / 10,
        atol=run.experiment.plan.solver.atol / 10,
    )
    until = Sourced(run.end, "s", "the first integration", "time")
    again = integrate(
        replace(run.experiment, plan=replace(run.experiment.plan, until=until)), solver
    )
    own = run.trajectory.times
    t = np.unique(np.concatenate([own, np.linspace(0, run.end, n_times)]))
    first, second = run.amounts(t), again.amounts(t)
    most = np.maximum(np.max(np.abs(first), axis=1), np.max(np.abs(second), axis=1))
    difference = np.abs(first - second) / np.where(most > 0, most, 1.0)[:, None]
    gas, time = np.unravel_index(int(np.argmax(difference)), difference.shape)
    return Verification(
        method,
        solver.rtol,
        float(difference[gas, time]),
        run.system.gases[int(gas)],
        float(t[int(time)]),
    )
