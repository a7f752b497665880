"""A sampling schedule: when to draw samples, what each should read, and how sharp k becomes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.planning.designs import (
    Candidates,
    Criterion,
    Places,
    improved,
    information,
    merit,
    optimal,
    spaced,
    standard_errors,
)
from meanfree.planning.drawing import with_draws
from meanfree.planning.factors import factor_addresses, factored
from meanfree.planning.following import Following, is_relative
from meanfree.planning.goal import Goal, carried_out
from meanfree.planning.limits.vessel import least_concentration
from meanfree.planning.readings import Kind
from meanfree.planning.request import PlanRequest, Sampling
from meanfree.progress import Progress, silent

Kinds = Literal["equal times", "equal conversion", "D", "A", "E"]
KINDS: tuple[Kinds, ...] = ("equal times", "equal conversion", "D", "A", "E")

CANDIDATES = 400
"""Times that designs choose from, evenly spaced."""

SD_SHARE = 0.01
"""Where no standard deviation is stated: this share of the largest signal."""


@dataclass(frozen=True)
class Plan:
    """One design: sample times [s], the signal and conversion there, and the relative (or, for a
    parameter of 0, absolute) standard errors that a fit to the readings would have."""

    kind: Kinds
    times: Floats
    signal: Floats
    conversion: Floats
    errors: Floats


@dataclass(frozen=True)
class Schedule:
    """Every design for the same samples.

    ``signal_kind`` and ``gas`` say what is read; ``sd`` its standard deviation in SI, ``assumed``
    where the case states none. ``signal`` is that of the undisturbed run at the times of
    ``candidates``. ``parameters`` are addresses and ``values`` what they are, in the unit of the
    file; errors are relative to them.
    Samples are drawn between ``begin`` (the end of the warm-up) and ``until`` [s];
    ``late`` [s] is when the undisturbed signal falls below its detection limit, None where it does
    not. Where samples take something out, ``plans`` are chosen with it, and ``ignoring`` holds the
    optimal designs as they would be without, with the errors that they would really give.
    """

    experiment: Experiment
    sampling: Sampling
    signal_kind: Kind
    gas: str
    sd: float
    assumed: bool
    begin: float
    until: float
    late: float | None
    parameters: tuple[str, ...]
    values: Floats
    relative: tuple[bool, ...]
    candidates: Candidates
    signal: Floats
    plans: Mapping[Kinds, Plan]
    ignoring: Mapping[Kinds, Plan]


def schedule(experiment: Experiment, request: PlanRequest, progress: Progress = silent) -> Schedule:
    """Sampling times for a run, by equal steps of time and of conversion and by three criteria.

    Raises
    ------
    InputError
        No gas is consumed, no parameter can be found, or so many samples do not fit.
    """
    experiment, sampling = factored(experiment), request.samples
    gas = experiment.watched
    if gas is None:
        raise InputError.at("steps", "no filled gas that is consumed", "a case that reacts")
    reading_kind, read_gas = _signal(sampling.signal, gas)
    until = _end(experiment, request, gas)
    parameters = sampling.parameters or default_parameters(experiment, gas)
    known = inputs(experiment)
    dead = 0.0 if sampling.dead_time is None else sampling.dead_time.value
    times = _times(until, dead, request)
    asked = (experiment, reading_kind, read_gas, parameters, known)
    progress(0, 0, "how the signal follows the parameters")
    signal, slopes = Following(*asked).at(times)
    sd, assumed = _sd(sampling, signal)
    least = _least(experiment, request, reading_kind, read_gas)
    seen, late = _seen(times, signal, least, read_gas)
    times, signal, candidates = (
        times[seen],
        signal[seen],
        Candidates(times[seen], slopes[seen] / sd),
    )
    conversion = _conversion(experiment, gas, times, until)
    places = _designs(candidates, conversion, sampling.count, dead)

    def undisturbed(kind: Kinds, chosen: Places) -> Plan:
        errors = standard_errors(candidates.slopes[chosen])
        return Plan(kind, times[chosen], signal[chosen], conversion[chosen], errors)

    ignoring: dict[Kinds, Plan] = {}
    if sampling.takes == 0:
        plans = {kind: undisturbed(kind, chosen) for kind, chosen in places.items()}
    else:
        drawn = Drawn(Following(*asked, takes=sampling.takes), candidates, sd, least)
        plans, ignoring = _with_draws(drawn, experiment, gas, places, until, dead, progress)
    return Schedule(
        experiment=experiment,
        sampling=sampling,
        signal_kind=reading_kind,
        gas=read_gas,
        sd=sd,
        assumed=assumed,
        begin=0.0 if request.warm_up is None else request.warm_up.value,
        until=until,
        late=late,
        parameters=tuple(parameters),
        values=np.array([known[address].value for address in parameters]),
        relative=tuple(is_relative(known[address]) for address in parameters),
        candidates=candidates,
        signal=signal,
        plans=plans,
        ignoring=ignoring,
    )


class Drawn:
    """Designs judged with what each sample takes out of the vessel; each design once."""

    def __init__(
        self, following: Following, candidates: Candidates, sd: float, least: float
    ) -> None:
        self.following, self.candidates, self.sd, self.least = following, candidates, sd, least
        self._known: dict[bytes, tuple[Floats, Floats]] = {}

    def read(self, places: Places) -> tuple[Floats, Floats]:
        """Signals, and slopes over the standard deviation: 0 for what is too little to be seen."""
        key = places.tobytes()
        if key not in self._known:
            signal, slopes = self.following.at(self.candidates.times[places])
            seen = signal >= self.least
            self._known[key] = signal, np.where(seen[:, None], slopes, 0.0) / self.sd
        return self._known[key]

    def best(self, starts: Sequence[Places], criterion: Criterion, apart: float) -> Places:
        """The best design found from several, at least ``apart`` [s] from sample to sample."""

        def worth(places: Places) -> float:
            return float(merit(information(self.read(places)[1])[None], criterion)[0])

        return improved(self.candidates.times, starts, worth, apart)


def _with_draws(
    drawn: Drawn,
    experiment: Experiment,
    gas: str,
    places: Mapping[Kinds, Places],
    until: float,
    dead: float,
    progress: Progress,
) -> tuple[dict[Kinds, Plan], dict[Kinds, Plan]]:
    """Plans whose times are chosen with what samples take, and those chosen without, both judged
    with it."""
    times, starts = drawn.candidates.times, list(places.values())
    alike = drawn.candidates.slopes.shape[1] == 1

    def judged(kind: Kinds, chosen: Places) -> Plan:
        signal, slopes = drawn.read(chosen)
        sampled = with_draws(experiment, times[chosen], drawn.following.takes)
        conversion = _conversion(sampled, gas, times[chosen], until)
        return Plan(kind, times[chosen], signal, conversion, standard_errors(slopes))

    plans: dict[Kinds, Plan] = {}
    for number, (kind, chosen) in enumerate(places.items()):
        progress(number, len(places), "times with what samples take out")
        if kind == "equal times" or kind == "equal conversion":
            plans[kind] = judged(kind, chosen)
        elif alike and "D" in plans:  # one parameter: what is best for one is best for all
            plans[kind] = replace(plans["D"], kind=kind)
        else:
            plans[kind] = judged(kind, drawn.best(starts, kind, dead))
    chosen_by = [kind for kind in places if kind not in ("equal times", "equal conversion")]
    return plans, {kind: judged(kind, places[kind]) for kind in chosen_by}


def _conversion(experiment: Experiment, gas: str, times: Floats, until: float) -> Floats:
    run = carried_out(experiment, Goal("conversion", gas, 0.5), until)
    return run.conversion(gas, times)


def _signal(text: str, watched: str) -> tuple[Kind, str]:
    if not text:
        return "concentration", watched
    if text == "total pressure":
        return "pressure", ""
    kind, _, gas = text.partition(" of ")
    return ("concentration" if kind == "concentration" else "partial pressure"), gas


def _end(experiment: Experiment, request: PlanRequest, gas: str) -> float:
    """End of the working time [s]: as stated, else that of the run, within the patience."""
    for stated in (request.samples.until, experiment.plan.until):
        if stated is not None:
            return stated.value
    end = carried_out(experiment, Goal("conversion", gas, 0.5), None).end
    return end if request.patience is None else min(end, request.patience.value)


def _times(until: float, dead: float, request: PlanRequest) -> Floats:
    """Times that designs choose from [s], none before the vessel is warm.

    The grid holds multiples of the dead time, so that samples can be that close.
    """
    times = np.linspace(0, until, CANDIDATES + 1)[1:]
    if until / CANDIDATES <= dead < until:
        per = round(dead / (until / CANDIDATES))
        times = np.arange(dead / per, until * (1 + 1e-12), dead / per)
    warm = 0.0 if request.warm_up is None else request.warm_up.value
    if warm > times[-1]:
        found = f"{warm:g} s, longer than the working time of {until:g} s"
        raise InputError.at("plan.warm_up", found, "a shorter warm-up, or plan.samples.until later")
    return times[times >= warm]


def default_parameters(experiment: Experiment, gas: str) -> tuple[str, ...]:
    """The number that scales k of the first step that uses up the watched gas."""
    for step in experiment.steps:
        if step.net.get(gas, 0.0) < 0:
            addresses = factor_addresses(experiment, step)
            if len(addresses) == 1:
                return addresses
    raise InputError.at(
        "plan.samples.parameters", "nothing, and no k that one number scales", "addresses to find"
    )


def _sd(sampling: Sampling, signal: Floats) -> tuple[float, bool]:
    if sampling.sd is not None:
        return sampling.sd.value, False
    return SD_SHARE * float(np.max(np.abs(signal))), True


def _least(experiment: Experiment, request: PlanRequest, kind: Kind, gas: str) -> float:
    """The least signal that is seen [SI]; no limit where none is stated."""
    portion = request.detection.get(gas)
    if portion is None:
        return -np.inf
    limit = least_concentration(portion, experiment)
    return limit * R * experiment.temperature.initial if kind == "partial pressure" else limit


def _seen(
    times: Floats, signal: Floats, least: float, gas: str
) -> tuple[NDArray[np.bool_], float | None]:
    """Where the gas that is read is above its detection limit, and when it is last [s]."""
    seen = signal >= least
    if not seen.any():
        found = f"{gas} below its detection limit throughout"
        raise InputError.at("plan.detection", found, "a gas that can be seen")
    return seen, float(times[seen][-1]) if not seen[-1] else None


def _designs(
    candidates: Candidates, conversion: Floats, count: int, dead: float
) -> dict[Kinds, Places]:
    """The places of every design."""
    times = candidates.times
    try:
        equal = _nearest(times, np.linspace(0, times[-1], count + 1)[1:])
        steps = np.linspace(0, float(conversion[-1]), count + 1)[1:]
        by_conversion = np.searchsorted(np.maximum.accumulate(conversion), steps * (1 - 1e-12))
        by_conversion = np.minimum(by_conversion, len(times) - 1).astype(np.intp)
        found: dict[Kinds, Places] = {
            "equal times": spaced(times, equal, dead),
            "equal conversion": spaced(times, by_conversion, dead),
        }
        criteria: tuple[Criterion, ...] = ("D", "A", "E")
        for criterion in criteria:
            found[criterion] = optimal(candidates, count, criterion, dead)
    except ValueError:
        raise InputError.at(
            "plan.samples",
            f"{count} samples {dead:g} s apart in {times[-1]:g} s",
            "fewer samples, a shorter dead time, or a longer working time",
        ) from None
    return found


def _nearest(times: Floats, wanted: Floats) -> Places:
    return np.asarray(np.abs(times[:, None] - wanted).argmin(axis=0), np.intp)
