"""How answers follow inputs: d ln(answer)/d ln(input) for every step, fill and temperature."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.experiment.plan import Solver
from meanfree.planning.factors import factor_addresses, factored
from meanfree.planning.readings import Reading, read_many
from meanfree.progress import Progress, silent

STEP = 0.01
"""Change of ln(input), at most: the error of the five-point rule is of its fourth power."""

HOT = 20.0
"""Temperatures are turned by so much less."""

RTOL = 1e-10


@dataclass(frozen=True)
class Knob:
    """What is turned: addresses that change together by one factor, and what that is in words.

    ``kind`` is "k" of a step, "fill", "temperature" or "vessel". A temperature on a scale with
    another zero is turned on the kelvin scale.
    """

    name: str
    kind: str
    addresses: tuple[str, ...]


@dataclass(frozen=True)
class Sensitivities:
    """``values[r][knob, column]`` = d ln(reading r)/d ln(knob) [1]; NaN where it is not reached."""

    knobs: tuple[Knob, ...]
    readings: tuple[Reading, ...]
    values: tuple[Floats, ...]
    base: tuple[Floats, ...]


def knobs_of(experiment: Experiment) -> tuple[Knob, ...]:
    """k of every step that has a number to scale it, every fill, the temperature, the volume.

    A collision step is expected to have its steric factor written out (`factored`).
    """
    known = inputs(experiment)
    found = []
    for step in experiment.steps:
        addresses = factor_addresses(experiment, step)
        if addresses:
            found.append(Knob(step.name, "k", addresses))
    for address, at in known.items():
        if at.value <= 0:
            continue
        if address.startswith("fill.gases.") or address == "fill.total":
            found.append(Knob(address, "fill", (address,)))
        elif address in ("temperature.value", "temperature.surroundings"):
            found.append(Knob(address, "temperature", (address,)))
        elif address in ("vessel.volume", "vessel.pressure"):
            found.append(Knob(address, "vessel", (address,)))
    return tuple(found)


def sensitivities(
    experiment: Experiment,
    readings: Sequence[Reading],
    until: float | None = None,
    progress: Progress = silent,
) -> Sensitivities:
    """Logarithmic sensitivities by the five-point rule.

    ``until`` [s] must be late enough for every reading. The error of the rule is h^4/30 of
    the fifth derivative, 1e-9 or so for answers that follow powers; that of the runs,
    1e-10 over h, is 1e-8. Temperatures, which rates follow by tens, are turned by less.
    """
    experiment = factored(experiment)
    knobs = knobs_of(experiment)
    known = inputs(experiment)
    shifts = np.array([-2.0, -1.0, 1.0, 2.0]) * STEP
    rows = 4 * len(knobs) + 1
    varied = list(dict.fromkeys(a for knob in knobs for a in knob.addresses))
    conditions = {address: np.full(rows, known[address].value) for address in varied}
    for place, knob in enumerate(knobs):
        for address in knob.addresses:
            turned = shifts / HOT if knob.kind == "temperature" else shifts
            zero = known[address].low if knob.kind == "temperature" else 0.0
            where = slice(4 * place, 4 * place + 4)
            span = known[address].value - zero
            conditions[address][where] = zero + span * np.exp(turned)
    read = read_many(
        experiment,
        conditions,
        readings,
        until=until,
        solver=Solver(experiment.plan.solver.method, RTOL, 1e-22),
        progress=progress,
        note="sensitivities",
    )
    values = []
    for answer in read:
        with np.errstate(invalid="ignore", divide="ignore"):
            logs = np.log(answer[:-1].reshape(len(knobs), 4, -1))
        a, b, c, d = (logs[:, i] for i in range(4))
        steps = np.array([STEP / HOT if k.kind == "temperature" else STEP for k in knobs])
        values.append((a - 8 * b + 8 * c - d) / (12 * steps[:, None]))
    return Sensitivities(
        knobs, tuple(readings), tuple(values), tuple(answer[-1] for answer in read)
    )
