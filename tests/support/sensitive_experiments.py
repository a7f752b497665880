"""Random experiments whose numbers can be reached by their addresses, for sensitivities."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from random_experiments import random_experiment

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.sourced import Sourced


def _in_metres(thing: Any) -> Any:
    """The same gas or law, its diameter with the unit that addresses need."""
    diameter = getattr(thing, "diameter", None)
    if diameter is None:
        return thing
    return replace(thing, diameter=Sourced(diameter.value, "m", "made up", "length"))


def sensitive_experiment(index: int, most: int = 8) -> tuple[Experiment, list[str]]:
    """Random experiment ``index`` and up to ``most`` of its addresses, drawn without bias.

    The first point of a program lies at time zero and cannot be moved both ways.
    """
    e = random_experiment(index)
    gases = tuple(_in_metres(gas) for gas in e.gases)
    steps = tuple(replace(step, law=_in_metres(step.law)) for step in e.steps)
    e = replace(e, gases=gases, steps=steps)
    found = [a for a in inputs(e) if a not in ("temperature.points.0.time", "fill.at")]
    if len(found) > most:
        rng = np.random.default_rng(index)
        found = [found[i] for i in sorted(rng.choice(len(found), most, replace=False))]
    return e, found
