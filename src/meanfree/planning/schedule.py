"""A sampling schedule: when to draw samples, what each should read, and how sharp k becomes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from meanfree import units
from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs, with_inputs
from meanfree.experiment.plan import Solver
from meanfree.planning.designs import (
    Candidates,
    Criterion,
    Places,
    optimal,
    spaced,
    standard_errors,
)
from meanfree.planning.drawing import drawn_signals
from meanfree.planning.factors import factor_addresses, factored
from meanfree.planning.goal import Goal, carried_out
from meanfree.planning.limits.vessel import least_concentration
from meanfree.planning.readings import Kind, Reading, read_many
from meanfree.planning.request import PlanRequest, Sampling
from meanfree.progress import Progress, silent

Kinds = Literal["equal times", "equal conversion", "D", "A", "E"]
KINDS: tuple[Kinds, ...] = ("equal times", "equal conversion", "D", "A", "E")

CANDIDATES = 400
"""Times that designs choose from, evenly spaced."""

STEP = 0.01
SHARP = Solver(rtol=1e-10, atol=1e-22)

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
    ``late`` [s] is when the signal falls below its detection limit, None where it does not.
    """

    experiment: Experiment
    sampling: Sampling
    signal_kind: Kind
    gas: str
    sd: float
    assumed: bool
    until: float
    late: float | None
    parameters: tuple[str, ...]
    values: Floats
    relative: tuple[bool, ...]
    candidates: Candidates
    signal: Floats
    plans: Mapping[Kinds, Plan]
    takes_counted: bool


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
    # A grid that holds multiples of the dead time, so that samples can be that close.
    times = np.linspace(0, until, CANDIDATES + 1)[1:]
    if until / CANDIDATES <= dead < until:
        per = round(dead / (until / CANDIDATES))
        times = np.arange(dead / per, until * (1 + 1e-12), dead / per)
    reading = Reading(reading_kind, read_gas, times=tuple(times))
    signal, slopes = _slopes(experiment, reading, parameters, known, until, progress)
    sd, assumed = _sd(sampling, signal)
    times, signal, slopes, late = _seen(experiment, request, reading, times, signal, slopes)
    candidates = Candidates(times, slopes / sd)
    run = carried_out(experiment, Goal("conversion", gas, 0.5), until, SHARP)
    conversion = run.conversion(gas, times)
    places = _designs(candidates, conversion, sampling.count, dead)
    counted = sampling.takes > 0 and experiment.constant_temperature is not None
    plans: dict[Kinds, Plan] = {}
    for number, (kind, chosen) in enumerate(places.items()):
        progress(number, len(places), "samples drawn")
        found, errors = signal[chosen], standard_errors(candidates.slopes[chosen])
        if counted:
            found, errors = _with_draws(
                experiment, reading, times[chosen], sampling.takes, parameters, known, sd
            )
        plans[kind] = Plan(kind, times[chosen], found, conversion[chosen], errors)
    return Schedule(
        experiment=experiment,
        sampling=sampling,
        signal_kind=reading_kind,
        gas=read_gas,
        sd=sd,
        assumed=assumed,
        until=until,
        late=late,
        parameters=tuple(parameters),
        values=np.array([known[address].value for address in parameters]),
        relative=tuple(_is_relative(known[address]) for address in parameters),
        candidates=candidates,
        signal=signal,
        plans=plans,
        takes_counted=counted,
    )


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


def _is_relative(known: Input) -> bool:
    return known.value != 0


def _scale(experiment: Experiment, known: Input) -> float:
    """By what a parameter is shifted, over `STEP`: so much that rates change by about as much.

    RT for an energy, a twentieth for a temperature, else the number itself.
    """
    dimension = known.quantity.dimension
    if dimension == "molar energy":
        return units.from_si(R * experiment.temperature.initial, known.unit, dimension)
    if dimension == "temperature":
        return (known.value - known.low) / 20.0
    return known.value if _is_relative(known) else 1.0


def _relatively(
    experiment: Experiment, parameters: tuple[str, ...], known: Mapping[str, Input]
) -> Floats:
    """From derivatives by shifts to those by the relative parameter [shape (n_parameters,)]."""
    found = []
    for address in parameters:
        at = known[address]
        found.append((at.value if _is_relative(at) else 1.0) / _scale(experiment, at))
    return np.array(found)


def _slopes(
    experiment: Experiment,
    reading: Reading,
    parameters: tuple[str, ...],
    known: Mapping[str, Input],
    until: float,
    progress: Progress,
) -> tuple[Floats, Floats]:
    """Signal [shape (m,)] and its derivative by each relative parameter [shape (m, p)]."""
    shifts = np.array([-2.0, -1.0, 1.0, 2.0]) * STEP
    rows = 4 * len(parameters) + 1
    conditions = {address: np.full(rows, known[address].value) for address in parameters}
    for place, address in enumerate(parameters):
        scale = _scale(experiment, known[address])
        conditions[address][4 * place : 4 * place + 4] += scale * shifts
    (read,) = read_many(
        experiment,
        conditions,
        [reading],
        until=until,
        solver=SHARP,
        progress=progress,
        note="how the signal follows the parameters",
    )
    slopes = _derivative(read[:-1].reshape(len(parameters), 4, -1))
    return read[-1], slopes * _relatively(experiment, parameters, known)


def _derivative(read: Floats) -> Floats:
    """Five-point derivative of readings at shifted parameters, shape (m, p)."""
    a, b, c, d = (read[:, i] for i in range(4))
    slopes = (a - 8 * b + 8 * c - d) / (12 * STEP)
    if not np.isfinite(slopes).all():
        raise InputError.at(
            "plan.samples.parameters", "a parameter near its bound", "one that can change by 2 %"
        )
    return slopes.T


def _sd(sampling: Sampling, signal: Floats) -> tuple[float, bool]:
    if sampling.sd is not None:
        return sampling.sd.value, False
    return SD_SHARE * float(np.max(np.abs(signal))), True


def _seen(
    experiment: Experiment,
    request: PlanRequest,
    reading: Reading,
    times: Floats,
    signal: Floats,
    slopes: Floats,
) -> tuple[Floats, Floats, Floats, float | None]:
    """Candidates at which the gas that is read is above its detection limit."""
    portion = request.detection.get(reading.gas)
    if portion is None:
        return times, signal, slopes, None
    limit = least_concentration(portion, experiment)
    if reading.kind == "partial pressure":
        limit *= R * experiment.temperature.initial
    seen = signal >= limit
    if not seen.any():
        found = f"{reading.gas} below its detection limit throughout"
        raise InputError.at("plan.detection", found, "a gas that can be seen")
    late = float(times[seen][-1]) if not seen[-1] else None
    return times[seen], signal[seen], slopes[seen], late


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


def _with_draws(
    experiment: Experiment,
    reading: Reading,
    times: Floats,
    takes: float,
    parameters: tuple[str, ...],
    known: Mapping[str, Input],
    sd: float,
) -> tuple[Floats, Floats]:
    """Signals with what the samples before took out, and the standard errors with that."""
    at = replace(reading, times=tuple(times))
    shifts = np.array([-2.0, -1.0, 1.0, 2.0]) * STEP
    rows = []
    for address in parameters:
        scale = _scale(experiment, known[address])
        for shift in shifts:
            changed = with_inputs(experiment, {address: known[address].value + scale * shift})
            rows.append(drawn_signals(changed, at, takes, SHARP))
    slopes = _derivative(np.array(rows).reshape(len(parameters), 4, -1))
    slopes = slopes * _relatively(experiment, parameters, known)
    return drawn_signals(experiment, at, takes, SHARP), standard_errors(slopes / sd)
