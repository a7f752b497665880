"""What the table ``[plan]`` of a case asks for: patience, detection, tolerances, samples.

Inert records; whatever is planned is computed from an Experiment and one of these.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from meanfree.experiment.fill import Portion
from meanfree.sourced import Sourced

Spread = Literal["factor", "absolute"]


@dataclass(frozen=True)
class Tolerance:
    """How well one number is known: one standard deviation.

    ``factor``: the logarithm of the number is normal with standard deviation ``size`` [1].
    ``absolute``: the number itself is normal with standard deviation ``size``, in the unit of
    the file. ``text`` is what the reader wrote.
    """

    address: str
    spread: Spread
    size: float
    text: str = ""


@dataclass(frozen=True)
class Sampling:
    """How samples are drawn and measured.

    ``count`` samples, at least ``dead_time`` [s] apart, of ``signal`` ("total pressure",
    "concentration of X" or "partial pressure of X") with standard deviation ``sd`` in the SI
    unit of the signal. Each takes the fraction ``takes`` of the contents with it. ``parameters``
    are the addresses that the measurement is to find. ``until`` [s] is the end of the
    working time, ``clock`` the time of day at which the run starts [s after midnight].
    """

    count: int = 8
    signal: str = ""
    sd: Sourced | None = None
    dead_time: Sourced | None = None
    takes: float = 0.0
    parameters: tuple[str, ...] = ()
    until: Sourced | None = None
    clock: float | None = None


@dataclass(frozen=True)
class PlanRequest:
    """Everything that ``[plan]`` may say; empty where it says nothing.

    ``warm_up`` [s] the vessel takes to come to temperature; ``patience`` [s] is the longest run
    one would wait for; ``detection`` the least of a gas that the instrument sees;
    ``narrowest`` [m] the width of the narrowest passage; ``conductance`` [W/K] of the heat
    from gas to surroundings; ``tolerances`` of numbers by address, with ``correlations`` of
    their deviations (of their logarithms where the spread is a factor).
    """

    warm_up: Sourced | None = None
    patience: Sourced | None = None
    detection: Mapping[str, Portion] = field(default_factory=dict)
    narrowest: Sourced | None = None
    conductance: Sourced | None = None
    tolerances: tuple[Tolerance, ...] = ()
    correlations: tuple[tuple[str, str, float], ...] = ()
    samples: Sampling = Sampling()
