"""A measured run: the experiment as it was done, and what was read of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from meanfree.experiment.experiment import Experiment
from meanfree.measured.readings import Readings


@dataclass(frozen=True)
class MeasuredRun:
    """One run.

    ``experiment`` has the conditions of this run; ``conditions`` are the addresses and texts that
    differ from the case.
    """

    name: str
    experiment: Experiment
    readings: Readings
    conditions: Mapping[str, str] = field(default_factory=dict)
