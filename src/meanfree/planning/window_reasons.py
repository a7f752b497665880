"""What can make a run no use on a map, each as a margin: above 0 inside, a logarithm of a ratio.

What is smooth over the map is worked out on a coarse grid and interpolated.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError
from meanfree.experiment.equilibrium import equilibrium, why_none
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.gases.condensation import saturation
from meanfree.planning.mixture import Mixture
from meanfree.planning.request import PlanRequest
from meanfree.planning.sizing import GEOMETRIC, grid
from meanfree.rates.ceiling import activation_energy, ceiling, judge

COARSE = 14
"""Points each way at which what is smooth is worked out; between them it is interpolated."""

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


class Map:
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


def margins_of(
    map_: Map, request: PlanRequest, level: float, time: Floats, pressure: Floats
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
        resting = map_.spread(resting_conversion)
        if np.isnan(resting).any():
            unsaid["stopped by equilibrium"] = "an equilibrium of the map was not found"
        else:
            stopped = np.log(level / resting)
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
        over = np.log(pressure / rated.value)
        found["above the rated pressure"] = np.where(np.isfinite(over), over, -FAR)
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
            saturated = saturation(gas, T, share * p) if share > 0 else None
            if saturated is not None:
                found.append(share * p / saturated.value)
    if not found:
        labels = all(gas.is_label for gas in experiment.gases)
        return float("nan") if labels else 1e-12
    return max(found)
