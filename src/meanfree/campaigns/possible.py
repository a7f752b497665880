"""Which conditions no experiment can have, found without building one for each."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from meanfree.campaigns.designs import Floats
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs, with_inputs


def impossible_values(experiment: Experiment, conditions: Mapping[str, Floats]) -> dict[int, str]:
    """Row to reason, for every row with a value out of its bounds or not finite."""
    known = inputs(experiment)
    suspect: set[int] = set()
    for address, column in conditions.items():
        low, high = known[address].low, known[address].high
        # Whether the bound itself is possible is the experiment's to say.
        inside = np.isfinite(column) & (column > low) & (column <= high)
        suspect.update(int(row) for row in np.flatnonzero(~inside))
    found: dict[int, str] = {}
    for row in sorted(suspect):
        try:
            with_inputs(experiment, {a: float(column[row]) for a, column in conditions.items()})
        except InputError as error:
            found[row] = reason_of(error)
    return found


def reason_of(error: InputError) -> str:
    """Why there is no such experiment, without the value, which stands beside it."""
    return "; ".join(f"{p.key} is not {p.expected}" for p in error.problems)
