"""Gas that is drawn from the vessel at stated times, for analysis elsewhere."""

from __future__ import annotations

from dataclasses import dataclass

from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Sample:
    """One sample, drawn at once at ``at`` [s].

    Either ``fraction`` [1] of all the gas, or ``volume`` [m^3] at the conditions of the vessel.
    The pressure of a rigid vessel drops by it, the volume of a piston.
    """

    at: Sourced
    fraction: Sourced | None = None
    volume: Sourced | None = None
