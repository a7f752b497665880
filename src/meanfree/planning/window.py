"""A map over two numbers: the time to a goal, and where a run would be no use, and why."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.equilibrium import equilibrium, why_none
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs, with_inputs
from meanfree.gases.condensation import vapour_pressure
from meanfree.integrate.single import integrate
from meanfree.planning.mixture import Mixture
from meanfree.planning.own_time import own_time
from meanfree.planning.readings import Reading, read_many
from meanfree.planning.request import PlanRequest
from meanfree.planning.sizing import GEOMETRIC, ROUGH, grid
from meanfree.progress import Progress, silent
from meanfree.rates.ceiling import activation_energy, ceiling, judge

Masks = dict[str, NDArray[np.bool_]]

POINTS = 100
COARSE = 14
"""Points each way at which what is smooth is worked out; between them it is interpolated."""

PATIENT = 10.0
"""Runs go on to this many times the patience, so that contours beyond it can be drawn."""

LONG = 1e3
"""The same without a patience, over the reaction's own time as the case stands."""

REGIONS = (
    "shorter than mixing",
    "shorter than the warm-up",
    "longer than patience",
    "stopped by equilibrium",
    "above the rated pressure",
    "above the collision limit",
    "condensing",
)
"""What can make a run no use, in the order in which they are drawn."""


@dataclass(frozen=True)
class Axis:
    """One side of the map: an address and its values in the unit of the file."""

    address: str
    values: Floats
    unit: str

    @property
    def is_geometric(self) -> bool:
        """True where the values are spaced geometrically."""
        return bool(self.values[0] > 0 and self.values[-1] / self.values[0] > GEOMETRIC)

    @property
    def positions(self) -> Floats:
        """The values as they are spaced evenly."""
        return np.log(self.values) if self.is_geometric else self.values


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
    X, Y = np.meshgrid(across.values, up.values)
    known = inputs(experiment)
    base = (known[across.address].value, known[up.address].value)
    conditions = {
        across.address: np.append(X.ravel(), base[0]),
        up.address: np.append(Y.ravel(), base[1]),
    }
    # Every corner must be a possible experiment, said before any is run.
    for x in (across.values[0], across.values[-1]):
        for y in (up.values[0], up.values[-1]):
            with_inputs(experiment, {across.address: float(x), up.address: float(y)})
    readings = [Reading("reaction time", gas, level), Reading("highest pressure")]
    read = read_many(
        experiment,
        conditions,
        readings,
        until=until,
        solver=ROUGH,
        progress=progress,
        note="the map",
    )
    time, pressure = (answer[:-1, 0].reshape(X.shape) for answer in read)
    map_ = _Map(experiment, across, up)
    margins, unsaid = _margins(map_, request, level, time, pressure)
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


def _until(experiment: Experiment, request: PlanRequest) -> float:
    if request.patience is not None:
        return PATIENT * request.patience.value
    own = own_time(integrate(experiment))
    if own is None:
        raise InputError.at("steps", "a case in which nothing moves", "a case that reacts")
    return LONG * own.seconds


def axis(known: Input, low: float, high: float, count: int = POINTS) -> Axis:
    """An axis over an address. Raises `InputError` where its range is empty."""
    if not low < high:
        raise InputError.at("--across-range", f"{low:g} {high:g}", "a lower and a higher value")
    return Axis(known.address, grid(low, high, count), known.unit)


class _Map:
    """What is smooth over the map: worked out on a coarse grid, interpolated to all points."""

    def __init__(self, experiment: Experiment, across: Axis, up: Axis) -> None:
        self.experiment, self.across, self.up = experiment, across, up
        self.x = grid(float(across.values[0]), float(across.values[-1]), COARSE)
        self.y = grid(float(up.values[0]), float(up.values[-1]), COARSE)
        self._experiments: list[list[Experiment]] | None = None

    @property
    def experiments(self) -> list[list[Experiment]]:
        """The experiment at every coarse point, row by row."""
        if self._experiments is None:
            names = self.across.address, self.up.address
            self._experiments = [
                [
                    with_inputs(self.experiment, {names[0]: float(x), names[1]: float(y)})
                    for x in self.x
                ]
                for y in self.y
            ]
        return self._experiments

    def spread(self, quantity: Callable[[Experiment], float]) -> Floats:
        """A positive quantity at all points, by interpolation of its logarithm; NaN: not known."""
        from scipy.interpolate import RectBivariateSpline

        coarse = np.array([[quantity(e) for e in row] for row in self.experiments])
        if not np.isfinite(coarse).all():
            return np.full((len(self.up.values), len(self.across.values)), np.nan)
        logs = np.log(np.maximum(coarse, 1e-300))
        wide = [np.log(v) if a.is_geometric else v for a, v in self._axes()]
        spline = RectBivariateSpline(wide[0], wide[1], logs, kx=1, ky=1)
        return np.asarray(np.exp(spline(self.up.positions, self.across.positions)))

    def _axes(self) -> Iterator[tuple[Axis, Floats]]:
        yield self.up, self.y
        yield self.across, self.x


FAR = 1.0
"""Margin of a time that is not reached: beyond any bound, whatever the bound."""


def _margins(
    map_: _Map, request: PlanRequest, level: float, time: Floats, pressure: Floats
) -> tuple[dict[str, Floats], dict[str, str]]:
    """How far each reason reaches, of those that hold anywhere; what could not be said and why."""
    experiment = map_.experiment
    found: dict[str, Floats] = {}
    unsaid: dict[str, str] = {}

    def shorter(name: str, bound: Floats | float) -> None:
        margin = np.log(bound / time)
        found[name] = np.where(np.isfinite(margin), margin, -FAR)

    def larger(name: str, ratio: Floats, why_not: str) -> None:
        if np.isnan(ratio).all():
            unsaid[name] = why_not
        else:
            found[name] = np.log(ratio)

    mixing = map_.spread(mixing_time)
    if np.isnan(mixing).all():
        unsaid["shorter than mixing"] = "a mass or a diameter is not known"
    else:
        shorter("shorter than mixing", mixing)
    if request.warm_up is None:
        unsaid["shorter than the warm-up"] = "no warm_up under [plan]"
    else:
        shorter("shorter than the warm-up", request.warm_up.value)
    stopped = np.full(time.shape, -FAR)
    reason = why_none(experiment)
    if reason:
        unsaid["stopped by equilibrium"] = reason
    else:
        stopped = np.log(level / map_.spread(resting_conversion))
        found["stopped by equilibrium"] = stopped
    if request.patience is None:
        unsaid["longer than patience"] = "no patience under [plan]"
    else:
        late = np.log(time / request.patience.value)
        late = np.where(np.isfinite(late), late, FAR)
        # What equilibrium stops is not a matter of patience.
        found["longer than patience"] = np.minimum(late, -stopped)
    rated = experiment.vessel.rated_pressure
    if rated is None:
        unsaid["above the rated pressure"] = "no rated_pressure under [vessel]"
    else:
        found["above the rated pressure"] = np.log(pressure / rated.value)
    no_pair = "no encounter of two gases of known size"
    larger("above the collision limit", map_.spread(over_the_limit) / (1 + 1e-9), no_pair)
    no_vapour = "no vapour pressure of what is filled is known there"
    larger("condensing", map_.spread(over_vapour_pressure), no_vapour)
    kept = {name: found[name] for name in REGIONS if name in found and (found[name] > 0).any()}
    return kept, unsaid


def mixing_time(experiment: Experiment) -> float:
    """Lambda^2/D of the filled gas that diffuses slowest [s]; NaN where it is not known."""
    mixture = Mixture(experiment)
    if not mixture.known:
        return float("nan")
    filled = {gas.name for gas in mixture.filled}
    slow = min(m.diffusion for m in mixture.molecules if m.gas in filled)
    return mixture.diffusion_length_squared / slow


def resting_conversion(experiment: Experiment) -> float:
    """Conversion of the watched gas at equilibrium [1]; NaN where it is not found."""
    gas = experiment.watched
    try:
        resting = equilibrium(experiment)
    except ComputationError:
        return float("nan")
    if resting is None or gas is None:
        return float("nan")
    return max(1.0 - resting.moles[gas] / experiment.moles[gas], 1e-12)


def over_the_limit(experiment: Experiment) -> float:
    """The largest of k/Z and P over the encounters of two gases [1]; NaN where there is none."""
    T, p = experiment.temperature.initial, experiment.initial_pressure
    found = []
    for step in experiment.steps:
        partners = tuple(experiment.gas_named[name] for name in step.partners)
        limit = ceiling(partners, T) if len(partners) == 2 else None
        if limit is None or step.bath is not None:
            continue
        context = experiment.context(step)

        def k(at: float, step: object = step, context: object = context) -> float:
            return float(step.law.rate_constant(context, at, p))  # type: ignore[attr-defined]

        value = k(T)
        if value <= 0:
            continue
        energy = None if step.law.word == "fixed" else activation_energy(k, T)
        judged = judge(value, energy, limit)
        found.append(max(value / limit.Z, judged.steric or 0.0))
    return max(found) if found else float("nan")


def over_vapour_pressure(experiment: Experiment) -> float:
    """The largest partial over vapour pressure of what is filled [1], at filling, at the start
    and in the dead space; NaN where nothing is known, tiny where nothing could condense."""
    initial = experiment.temperature.initial
    fill_T = experiment.fill.temperature(initial)
    pairs = [
        (fill_T, experiment.fill.pressure(experiment.vessel, initial)),
        (initial, experiment.initial_pressure),
    ]
    dead = experiment.vessel.dead_space
    if dead is not None:
        pairs.append((dead.temperature.value, experiment.initial_pressure))
    found = []
    for gas in experiment.gases:
        share = experiment.mole_fractions.get(gas.name, 0.0)
        for T, p in pairs:
            saturated = vapour_pressure(gas, T) if share > 0 else None
            if saturated is not None:
                found.append(share * p / saturated.value)
    if not found:
        labels = all(gas.is_label for gas in experiment.gases)
        return float("nan") if labels else 1e-12
    return max(found)


def _middle(usable: NDArray[np.bool_]) -> tuple[int, int] | None:
    """The usable point farthest from what is not and from the edges, in steps of the grid."""
    from scipy.ndimage import distance_transform_edt

    if not usable.any():
        return None
    framed = np.pad(usable, 1)
    distance = distance_transform_edt(framed)[1:-1, 1:-1]
    row, column = np.unravel_index(int(np.argmax(distance)), usable.shape)
    return int(row), int(column)
