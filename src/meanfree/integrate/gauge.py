"""What a pressure gauge on the vessel sees of a run: how fast at the start, and when at all."""

from __future__ import annotations

from meanfree.constants import R
from meanfree.equations.arrays import ArrayEquations
from meanfree.integrate.events import first_crossing
from meanfree.integrate.run import Run


def initial_slope(run: Run) -> float | None:
    """dp/dt at time zero [Pa/s], reaction and change of temperature together; None for a piston.

    From p = R T sum(x)/(1 + dead T): R/w (T sum(x') + T' sum(x)/w), w = 1 + dead T.
    """
    system = run.system
    if system.volume_varies:
        return None
    equations = ArrayEquations(system)
    segment = run.trajectory.stretches[0].segment
    y = run.state(0.0)[:, 0]
    state = equations.unpack(0.0, y, segment)
    # From the steps and not from the gases: a step that keeps the number of molecules gives 0.
    rates = equations.net_rates(equations.rates(0.0, y, segment))
    formed = float(rates @ equations.change)
    dT = segment.slope
    if system.temperature_varies:
        dT = float(equations.derivative(0.0, y, segment)[system.temperature_index])
    return R / state.w * (state.T * formed + dT * float(state.x.sum()) / state.w)


def first_shown(run: Run, resolution: float) -> float | None:
    """The first time [s] at which p has changed by a gauge's resolution [Pa]; None: never."""
    start = float(run.pressure(0.0)[0])
    found = [
        time
        for level in (start - resolution, start + resolution)
        if (time := first_crossing(run.trajectory, run.pressure, level)) is not None
    ]
    return min(found, default=None)
