"""How a run is carried out: how long, watching what, reported when, and by which solver."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from meanfree.sourced import Sourced

Method = Literal["Radau", "BDF", "LSODA"]


@dataclass(frozen=True)
class Solver:
    """The integrator and its tolerances. ``atol`` is a fraction of the initial concentration."""

    method: Method = "Radau"
    rtol: float = 1e-8
    atol: float = 1e-20


@dataclass(frozen=True)
class RunPlan:
    """``until`` [s], None where the run itself finds when it is done ("auto").

    ``watch`` is the gas whose conversion counts; None: the filled reactant that runs out first.
    ``report_at`` [s] asks for extra rows.
    """

    until: Sourced | None = None
    watch: str | None = None
    report_at: tuple[Sourced, ...] = ()
    solver: Solver = Solver()
