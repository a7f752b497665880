"""A map over two numbers: the time to a goal, and where a run would be no use, and why."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs, with_inputs
from meanfree.integrate.single import integrate
from meanfree.planning.own_time import own_time
from meanfree.planning.readings import Reading, can_be_read_together, read_many
from meanfree.planning.request import PlanRequest
from meanfree.planning.sizing import ROUGH, grid
from meanfree.planning.window_reasons import Axis, Map, margins_of
from meanfree.progress import Progress, silent

Masks = dict[str, NDArray[np.bool_]]

POINTS, FEWEST = 100, 8
PATIENT = 10.0
"""Runs go on to this many times the patience, so that contours beyond it can be drawn."""

LONG = 1e3
"""The same without a patience, over the reaction's own time as the case stands."""


@dataclass(frozen=True)
class Window:
    """The map. Arrays have the shape (n_up, n_across).

    ``time`` [s] to the goal, NaN where it is not reached by ``until`` [s]; ``pressure`` [Pa] the
    highest. ``margins`` are how far each reason reaches that makes a run no use: above 0 inside, a
    logarithm of a ratio, of the reasons that occur; ``unsaid`` are those of which nothing could be
    said, and why. ``base`` is the case's own place, ``base_time`` [s] its own time. ``middle`` is
    the (row, column) of the usable point farthest from all that is not, None where nothing is
    usable.
    """

    across: Axis
    up: Axis
    gas: str
    level: float
    time: Floats
    pressure: Floats
    margins: Mapping[str, Floats]
    unsaid: Mapping[str, str]
    until: float
    base: tuple[float, float]
    base_time: float
    middle: tuple[int, int] | None

    @property
    def regions(self) -> Masks:
        """Where each reason holds."""
        return {name: margin > 0 for name, margin in self.margins.items()}

    @property
    def unreached(self) -> NDArray[np.bool_]:
        """Where the goal is not reached by ``until`` and no other reason holds."""
        taken = np.zeros(self.time.shape, bool)
        for mask in self.regions.values():
            taken = taken | mask
        return np.isnan(self.time) & ~taken

    @property
    def usable(self) -> NDArray[np.bool_]:
        """Where nothing stands against a run."""
        masks = list(self.regions.values())
        taken = np.isnan(self.time)
        for mask in masks:
            taken = taken | mask
        return ~taken


def window(
    experiment: Experiment,
    request: PlanRequest,
    level: float,
    across: Axis,
    up: Axis,
    progress: Progress = silent,
) -> Window:
    """The time to a conversion ``level`` of the watched gas over two numbers, and what forbids it.

    Raises
    ------
    InputError
        No gas is consumed, or a value of an axis is impossible.
    """
    gas = experiment.watched
    if gas is None:
        raise InputError.at("steps", "no filled gas that is consumed", "a case that reacts")
    until = _until(experiment, request)
    # Every corner must be a possible experiment, said before any is run.
    for x in (across.values[0], across.values[-1]):
        for y in (up.values[0], up.values[-1]):
            with_inputs(experiment, {across.address: float(x), up.address: float(y)})
    readings = [Reading("reaction time", gas, level), Reading("highest pressure")]
    across, up, singly = _affordable(experiment, readings, across, up, until)
    X, Y = np.meshgrid(across.values, up.values)
    known = inputs(experiment)
    base = (known[across.address].value, known[up.address].value)
    conditions = {
        across.address: np.append(X.ravel(), base[0]),
        up.address: np.append(Y.ravel(), base[1]),
    }
    read = read_many(
        experiment,
        conditions,
        readings,
        until=until,
        solver=ROUGH,
        progress=progress,
        note="the map",
        singly=singly,
    )
    time, pressure = (answer[:-1, 0].reshape(X.shape) for answer in read)
    margins, unsaid = margins_of(Map(experiment, across, up), request, level, time, pressure)
    found = Window(
        across=across,
        up=up,
        gas=gas,
        level=level,
        time=time,
        pressure=pressure,
        margins=margins,
        unsaid=unsaid,
        until=until,
        base=base,
        base_time=float(read[0][-1, 0]),
        middle=None,
    )
    return replace(found, middle=_middle(found.usable))


SINGLY = 20
"""Points each way where every run has to be made by itself, at some tenths of a second."""


def _affordable(
    experiment: Experiment, readings: list[Reading], across: Axis, up: Axis, until: float
) -> tuple[Axis, Axis, bool]:
    """The axes, with fewer values where conditions cannot be carried out together, and whether
    they are carried out singly then.
    """
    ends = {a.address: a.values[[0, -1]] for a in (across, up)}
    if can_be_read_together(experiment, ends, readings, until, ROUGH):
        return across, up, False
    fewer = [
        Axis(a.address, grid(float(a.values[0]), float(a.values[-1]), SINGLY), a.unit)
        if len(a.values) > SINGLY
        else a
        for a in (across, up)
    ]
    return fewer[0], fewer[1], True


def _until(experiment: Experiment, request: PlanRequest) -> float:
    if request.patience is not None:
        return PATIENT * request.patience.value
    half = _half_life(experiment)
    if half is not None:
        return LONG * half
    own = own_time(integrate(experiment))
    if own is None:
        raise InputError.at("steps", "a case in which nothing moves", "a case that reacts")
    return LONG * own.seconds


def _half_life(experiment: Experiment) -> float | None:
    """The first half-life of the watched gas [s] as the case stands, by the quick integrator."""
    gas = experiment.watched
    if gas is None or "temperature.value" not in inputs(experiment):
        return None
    here = {"temperature.value": np.array([inputs(experiment)["temperature.value"].value])}
    (found,) = read_many(experiment, here, [Reading("half-life", gas)], solver=ROUGH)
    return float(found[0, 0]) if np.isfinite(found[0, 0]) else None


def axis(known: Input, low: float, high: float, count: int = POINTS) -> Axis:
    """An axis over an address. Raises `InputError` where its range is empty."""
    if not low < high:
        raise InputError.at("--across-range", f"{low:g} {high:g}", "a lower and a higher value")
    return Axis(known.address, grid(low, high, count), known.unit)


def _middle(usable: NDArray[np.bool_]) -> tuple[int, int] | None:
    """The usable point farthest from what is not and from the edges, in steps of the grid."""
    from scipy.ndimage import distance_transform_edt

    if not usable.any():
        return None
    framed = np.pad(usable, 1)
    distance = distance_transform_edt(framed)[1:-1, 1:-1]
    row, column = np.unravel_index(int(np.argmax(distance)), usable.shape)
    return int(row), int(column)
