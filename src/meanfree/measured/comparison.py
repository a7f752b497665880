"""The same vessel three times: the kinetics as supplied or fitted, collision theory with the same
energy term and P = 1, and every collision reacting.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from meanfree.collisions import line_of_centres
from meanfree.constants import R
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.measured.arrhenius_lines import DIAMETER_FACTOR
from meanfree.measured.fits import Fit, quantile
from meanfree.measured.misfit import rate_constant_at
from meanfree.measured.parameters import applied
from meanfree.measured.straight_lines import Interval
from meanfree.rates.ceiling import Ceiling, Judgement, activation_energy, ceiling, judge
from meanfree.rates.collision import Collision
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced

SUPPLIED: Final[str] = "as supplied"
FITTED: Final[str] = "as fitted"
THEORY: Final[str] = "collision theory, P = 1"
CEILING: Final[str] = "every collision reacts"


@dataclass(frozen=True)
class StepAgainstCollisions:
    """One step at the run's temperature.

    ``k`` per event [m^3/mol/s] with the 95 % interval of a fit where there is one; ``steric`` the
    same for P, with the diameters' uncertainty, None without an activation energy.
    ``in_theory`` is Z exp(-E0/RT).
    """

    step: str
    temperature: float
    k: float
    k_interval: tuple[float, float] | None
    limit: Ceiling
    judgement: Judgement
    in_theory: float | None
    steric: Interval | None
    diameter_factor: float


@dataclass(frozen=True)
class Scenario:
    """One of the three: its name, its run, and the half-lives of the watched gas [s].

    ``half_way`` [s] is when it has gone half of the way to where it settles, where that is short of
    half of it; None where a half-life is reached or nothing settles.
    """

    name: str
    run: Run
    half_lives: tuple[float | None, ...]
    half_way: float | None

    @property
    def time(self) -> float | None:
        """The first half-life, or the time to half of the way [s]."""
        first = self.half_lives[0] if self.half_lives else None
        return first if first is not None else self.half_way


@dataclass(frozen=True)
class Comparison:
    """The three runs of one vessel. ``left_out`` says which steps keep their own law, and why."""

    experiment: Experiment
    watched: str
    steps: tuple[StepAgainstCollisions, ...]
    scenarios: tuple[Scenario, ...]
    left_out: tuple[str, ...]
    fit: Fit | None


def compare(
    experiment: Experiment,
    fit: Fit | None = None,
    place: int = 0,
    diameter_factor: float = DIAMETER_FACTOR,
) -> Comparison:
    """Set an experiment beside collision theory.

    ``fit`` gives the kinetics of its run ``place`` in place of those of the case.

    Raises
    ------
    InputError
        No step is an encounter of two gases of known mass and diameter, or nothing is used up.
    ComputationError
        A run failed.
    """
    own = experiment
    if fit is not None:
        run = fit.request.runs[place]
        own = applied(run, place, fit.parameters, fit.values)
    watched = own.watched
    if watched is None:
        raise InputError.at("steps", "no step that uses up a filled gas", "a reaction of the fill")
    T = own.temperature.initial
    limits = {step.name: _limit(own, step, T) for step in own.steps}
    known = {name: limit for name, limit in limits.items() if limit is not None}
    if not known:
        raise InputError.at(
            "steps",
            "no encounter of two gases whose masses and diameters are known",
            "at least one step of two molecules, each with formula and diameter",
        )
    steps = tuple(
        _judged(own, step, known[step.name], T, fit, place, diameter_factor)
        for step in own.steps
        if step.name in known
    )
    scenarios = [_scenario(FITTED if fit is not None else SUPPLIED, own, watched)]
    theory = {one.step: one.judgement.threshold for one in steps}
    if any(threshold is not None for threshold in theory.values()):
        scenarios.append(_scenario(THEORY, _by_collisions(own, theory), watched))
    scenarios.append(_scenario(CEILING, _by_collisions(own, dict.fromkeys(known, 0.0)), watched))
    return Comparison(own, watched, steps, tuple(scenarios), tuple(_left_out(own, steps)), fit)


def against_collisions(
    fit: Fit, place: int, diameter_factor: float = DIAMETER_FACTOR
) -> tuple[StepAgainstCollisions, ...]:
    """The encounters of a fitted run against their collision limits; empty where there is none."""
    run = fit.request.runs[place]
    own = applied(run, place, fit.parameters, fit.values)
    T = own.temperature.initial
    limits = [(step, _limit(own, step, T)) for step in own.steps]
    return tuple(
        _judged(own, step, limit, T, fit, place, diameter_factor)
        for step, limit in limits
        if limit is not None
    )


def _limit(experiment: Experiment, step: Step, T: float) -> Ceiling | None:
    if step.bath is not None or step.order != 2:
        return None
    partners = tuple(experiment.gas_named[name] for name in step.partners)
    return ceiling(partners, T, _diameter(experiment, step))


def _diameter(experiment: Experiment, step: Step) -> float | None:
    """Diameter of the pair [m] where the step has its own."""
    if isinstance(step.law, Collision):
        return step.law.pair_diameter(experiment.context(step))
    return None


def _k_of(experiment: Experiment, step: Step) -> Callable[[float], float]:
    def k(T: float) -> float:
        return float(rate_constant_at(experiment, step.name, np.array([T]))[0])

    return k


def _judged(
    experiment: Experiment,
    step: Step,
    limit: Ceiling,
    T: float,
    fit: Fit | None,
    place: int,
    diameter_factor: float,
) -> StepAgainstCollisions:
    k_of = _k_of(experiment, step)
    k = k_of(T)
    Ea = None if isinstance(step.law, Fixed) or k <= 0 else activation_energy(k_of, T)
    judgement = judge(k, Ea, limit)
    deviation = None if fit is None else _ln_k_deviation(fit, place, step, T)
    t = quantile(None) if fit is None else fit.quantile
    steric = in_theory = None
    if judgement.steric is not None and judgement.threshold is not None:
        in_theory = limit.Z * math.exp(-judgement.threshold / (R * T))
        of_P = None if fit is None else _ln_k_deviation(fit, place, step, T, over_theory=True)
        of_diameter = 2 * math.log(diameter_factor)
        half = math.hypot(t * (of_P or 0.0), quantile(None) * of_diameter)
        P = judgement.steric
        error = P * math.hypot(of_P or 0.0, of_diameter)
        steric = Interval(P, error, P * math.exp(-half), P * math.exp(half))
    interval = None
    if deviation is not None:
        interval = (k * math.exp(-t * deviation), k * math.exp(t * deviation))
    return StepAgainstCollisions(
        step.name, T, k, interval, limit, judgement, in_theory, steric, diameter_factor
    )


def _ln_k_deviation(
    fit: Fit, place: int, step: Step, T: float, *, over_theory: bool = False
) -> float:
    """Standard error of ln k at T, or of ln P, carried over from the fitted parameters."""
    run, inner = fit.request.runs[place], fit.inner

    def value(u: np.ndarray) -> float:
        changed = applied(run, place, fit.parameters, fit.misfit.natural(u))
        own = next(one for one in changed.steps if one.name == step.name)
        k_of = _k_of(changed, own)
        k = k_of(T)
        if not over_theory:
            return math.log(k)
        Ea = activation_energy(k_of, T)
        threshold = line_of_centres.threshold_from_activation_energy(Ea, T)
        return math.log(k) + float(np.asarray(threshold.energy)) / (R * T)

    gradient = np.zeros(len(inner))
    for i, parameter in enumerate(fit.parameters):
        h = 1e-5 if parameter.logarithmic else 1e-5 * max(abs(float(inner[i])), 1e-6)
        up, down = inner.copy(), inner.copy()
        up[i] += h
        down[i] -= h
        gradient[i] = (value(up) - value(down)) / (2 * h)
    used = gradient != 0
    cov = fit.covariance[np.ix_(used, used)]
    return math.sqrt(max(float(gradient[used] @ cov @ gradient[used]), 0.0))


def _by_collisions(experiment: Experiment, thresholds: dict[str, float | None]) -> Experiment:
    """The experiment with encounters that react whenever they have the threshold energy [J/mol]."""
    steps = []
    for step in experiment.steps:
        threshold = thresholds.get(step.name)
        if threshold is None:
            steps.append(step)
            continue
        own = _diameter(experiment, step)
        law = Collision(
            threshold=Sourced(threshold, "J/mol", "the energy term of the step", "molar energy"),
            steric=Sourced(1.0, "", "collision theory"),
            diameter=None if own is None else Sourced(own, "m", "", "length"),
        )
        steps.append(replace(step, law=law))
    return replace(experiment, steps=tuple(steps))


def _scenario(name: str, experiment: Experiment, watched: str) -> Scenario:
    until = None if name != SUPPLIED and name != FITTED else experiment.plan.until
    plan = replace(experiment.plan, until=until, watch=watched)
    try:
        run = integrate(replace(experiment, plan=plan))
    except ComputationError as error:
        raise ComputationError(f"{name}: {error}") from None
    half_lives = tuple(half.duration for half in run.half_lives(watched)[:3])
    half_way = None
    if half_lives[0] is None and run.settled_state is not None:
        place = run.index(watched)
        settled = 1 - float(run.settled_state[place]) / float(run.system.initial_x[place])
        half_way = run.reaction_time(watched, 0.5 * settled) if settled > 0 else None
    return Scenario(name, run, half_lives, half_way)


def _left_out(experiment: Experiment, steps: tuple[StepAgainstCollisions, ...]) -> list[str]:
    said = []
    judged = {one.step: one for one in steps}
    for step in experiment.steps:
        if step.name not in judged:
            said.append(
                f"{step.name} keeps its own law: no encounter of two gases of known size and mass."
            )
        elif judged[step.name].judgement.threshold is None:
            said.append(
                f"{step.name} states no activation energy, so that collision theory has no energy "
                "term for it."
            )
    return said
