"""The numbers that a fit may change: by address, in the file's unit, on a sensible scale.

What cannot be negative is fitted as its logarithm, so that a factor of two up counts as much as
one down. A and Ea of a step move together along a ridge; inside, k at a middle temperature stands
for A, which takes them apart.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from meanfree import units
from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs, with_inputs
from meanfree.measured.least_squares import Scales
from meanfree.measured.runs import MeasuredRun

TIME_OFFSET, SIGNAL_OFFSET = "time_offset", "signal_offset"
_RUN = "data."
_LINEAR = ("temperature", "fraction")


@dataclass(frozen=True)
class Prior:
    """What is known of a parameter beforehand: ``value`` with ``sd``, both in the file's unit."""

    value: float
    sd: float


@dataclass(frozen=True)
class Asked:
    """A parameter that a fit shall find: its address, and what is known of it (file's unit)."""

    address: str
    low: float | None = None
    high: float | None = None
    prior: Prior | None = None


@dataclass(frozen=True)
class Parameter:
    """A parameter of a fit.

    ``address`` as asked for, ``key`` without the run's name, ``runs`` the places of the runs it
    belongs to. ``start``, ``low`` and ``high`` are in ``unit`` and in the counting of the file
    (``per`` counted molecules an event); inside, it is ln of that where ``logarithmic``.
    """

    address: str
    key: str
    runs: tuple[int, ...]
    start: float
    unit: str
    dimension: str
    low: float
    high: float
    logarithmic: bool
    prior: Prior | None = None
    per: float = 1.0

    def inner(self, value: float) -> float:
        """The inner coordinate of a value in the file's unit."""
        if not self.logarithmic:
            return value
        return math.log(value) if value > 0 else -math.inf

    def outer(self, coordinate: float) -> float:
        """The value in the file's unit of an inner coordinate."""
        if not self.logarithmic:
            return coordinate
        return math.exp(min(coordinate, 700.0))

    @property
    def is_offset(self) -> bool:
        """True for the offsets of time and signal, which are no numbers of the experiment."""
        return self.key in (TIME_OFFSET, SIGNAL_OFFSET)


def parameters_of(runs: Sequence[MeasuredRun], asked: Sequence[Asked]) -> tuple[Parameter, ...]:
    """The parameters asked for.

    Raises InputError for an address that no run has, one that the conditions of a run set, or a
    start outside its bounds: all problems in one go.
    """
    problems: list[Problem] = []
    found: list[Parameter] = []
    known = [inputs(run.experiment) for run in runs]
    for place, one in enumerate(asked):
        if one.address in {other.address for other in asked[:place]}:
            problems.append(Problem(f"fit.parameters.{place}", one.address, "each address once"))
            continue
        parameter = _parameter(runs, known, one, f"fit.parameters.{place}")
        if isinstance(parameter, Problem):
            problems.append(parameter)
            continue
        found.append(parameter)
    problems += _covering(found, runs)
    if problems:
        raise InputError(problems)
    return tuple(found)


def _parameter(
    runs: Sequence[MeasuredRun],
    known: Sequence[Mapping[str, Input]],
    asked: Asked,
    place: str,
) -> Parameter | Problem:
    owner, key = owner_of(runs, asked.address)
    if isinstance(owner, Problem):
        return Problem(place, owner.found, owner.expected)
    if key in (TIME_OFFSET, SIGNAL_OFFSET):
        return _offset(runs, owner, key, asked, place)
    lacking = [i for i in owner if key not in known[i]]
    if lacking:
        from difflib import get_close_matches

        every = [*known[owner[0]], TIME_OFFSET, SIGNAL_OFFSET]
        near = get_close_matches(key, every, n=3, cutoff=0.4) or every
        return Problem(place, f'"{asked.address}", an unknown address', f"one of {', '.join(near)}")
    first = known[owner[0]][key]
    differing = [runs[i].name for i in owner if key in runs[i].conditions]
    if differing and len(owner) > 1:
        expected = f'the address of one run, such as "{_RUN}{differing[0]}.{key}"'
        return Problem(place, f'"{key}", which the conditions of {differing[0]} set', expected)
    return _joined(asked, key, owner, first, place)


def _joined(
    asked: Asked, key: str, owner: tuple[int, ...], first: Input, place: str
) -> Parameter | Problem:
    dimension = first.quantity.dimension or ("length" if key.endswith(".diameter") else "pure")
    low = first.low if asked.low is None else asked.low
    high = first.high if asked.high is None else asked.high
    logarithmic = first.value > 0 and first.low == 0 and dimension not in _LINEAR
    if not low <= first.value <= high:
        expected = f"a start from {low:g} to {high:g}, its bounds"
        return Problem(place, f"{key} starting at {first.value:g} {first.unit}".strip(), expected)
    return Parameter(
        asked.address,
        key,
        owner,
        first.value,
        first.unit,
        dimension,
        low,
        high,
        logarithmic,
        asked.prior,
        first.quantity.per,
    )


def owner_of(runs: Sequence[MeasuredRun], address: str) -> tuple[tuple[int, ...] | Problem, str]:
    """The runs an address belongs to, and the address without the name of a run."""
    if not address.startswith(_RUN):
        return tuple(range(len(runs))), address
    rest = address.removeprefix(_RUN)
    for place, run in enumerate(runs):
        for name in (run.name, str(place)):
            if rest.startswith(f"{name}."):
                return (place,), rest.removeprefix(f"{name}.")
    names = ", ".join(run.name for run in runs)
    return Problem("", f'"{address}", of a run that is not there', f"one of the runs {names}"), ""


def _offset(
    runs: Sequence[MeasuredRun], owner: tuple[int, ...], key: str, asked: Asked, place: str
) -> Parameter | Problem:
    readings = [runs[i].readings for i in owner]
    if any(r.signal.is_rate_constant for r in readings):
        return Problem(place, f'"{key}" of rate constants', "an offset of readings against time")
    time = key == TIME_OFFSET
    names = {r.time_unit if time else f"{r.unit} ({r.dimension})" for r in readings}
    if len(names) > 1:
        expected = f"an offset for each run, such as {_RUN}{runs[owner[0]].name}.{key}"
        return Problem(place, f'"{key}" of runs in different units', expected)
    unit = readings[0].time_unit if time else readings[0].unit
    dimension = "time" if time else readings[0].dimension
    low = -math.inf if asked.low is None else asked.low
    high = math.inf if asked.high is None else asked.high
    start = min(max(0.0, low), high)
    return Parameter(
        asked.address, key, owner, start, unit, dimension, low, high, False, asked.prior
    )


def _covering(found: Sequence[Parameter], runs: Sequence[MeasuredRun]) -> list[Problem]:
    """An address of all runs and the same of one run would contradict each other."""
    problems = []
    for one in found:
        for other in found:
            if one is not other and one.key == other.key and len(one.runs) > len(other.runs):
                found_text = f"{other.address} beside {one.address}"
                problems.append(Problem("fit.parameters", found_text, "one of the two"))
    return problems


def applied(
    run: MeasuredRun, place: int, parameters: Sequence[Parameter], values: Floats
) -> Experiment:
    """The experiment of a run with the parameters at ``values`` (file's unit)."""
    changed = changes(place, parameters, values)
    return with_inputs(run.experiment, changed) if changed else run.experiment


def changes(place: int, parameters: Sequence[Parameter], values: Floats) -> dict[str, float]:
    """What the parameters change of one run, by address (file's unit); offsets are not in it."""
    return {
        parameter.key: float(value)
        for parameter, value in zip(parameters, values, strict=True)
        if place in parameter.runs and not parameter.is_offset
    }


def offset_of(key: str, place: int, parameters: Sequence[Parameter], values: Floats) -> float:
    """The offset of a run in SI, 0 where none is fitted."""
    for parameter, value in zip(parameters, values, strict=True):
        if parameter.key == key and place in parameter.runs:
            zero = units.to_si(0.0, parameter.unit, parameter.dimension)
            return units.to_si(float(value), parameter.unit, parameter.dimension) - zero
    return 0.0


def unit_of(parameter: Parameter) -> float:
    """One of a parameter's unit in SI, as a difference."""
    zero, one = (units.to_si(v, parameter.unit, parameter.dimension) for v in (0.0, 1.0))
    return one - zero


def scales_of(parameters: Sequence[Parameter], temperature: float | None) -> Scales:
    """Start, bounds, sizes and basis of the inner coordinates.

    ``temperature`` [K] is the middle of the readings', at which k stands for A; None: no such.
    """
    start = np.array([p.inner(p.start) for p in parameters])
    size = np.array([1.0 if p.logarithmic else _size(p) for p in parameters])
    low = np.array([p.inner(p.low) if np.isfinite(p.low) else p.low for p in parameters])
    high = np.array([p.inner(p.high) if np.isfinite(p.high) else p.high for p in parameters])
    return Scales(start, low, high, size, _basis(parameters, size, low, high, temperature))


def _size(parameter: Parameter) -> float:
    if parameter.dimension == "molar energy":
        return units.from_si(5e3, parameter.unit, "molar energy")
    if parameter.start != 0:
        return abs(parameter.start)
    zero = units.to_si(0.0, parameter.unit, parameter.dimension)
    if parameter.dimension == "time":
        return abs(units.from_si(60.0 + zero, parameter.unit, "time"))
    return 1.0


def _basis(
    parameters: Sequence[Parameter],
    size: Floats,
    low: Floats,
    high: Floats,
    temperature: float | None,
) -> Floats | None:
    """ln A = ln k(T) + Ea/(R T): the columns of Ea carry ln A along, at constant k(T)."""
    if temperature is None:
        return None
    place = {p.address: i for i, p in enumerate(parameters)}
    basis = np.eye(len(parameters))
    mixed = False
    for address, i in place.items():
        head, _, last = address.rpartition(".")
        j = place.get(f"{head}.Ea")
        if last != "A" or j is None or not parameters[i].logarithmic:
            continue
        one = units.to_si(1.0, parameters[j].unit, "molar energy")
        basis[i, j] = one * size[j] / (R * temperature)
        mixed = True
    # Bounds hold for the parameters themselves: with them, each has to stand for itself.
    bounded = np.any(np.isfinite(low)) or np.any(np.isfinite(high))
    return basis if mixed and not bounded else None
