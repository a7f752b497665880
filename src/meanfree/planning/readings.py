"""What is read off a run, declared, so that one run or many thousands can answer it.

This is the one place through which planning carries out many runs.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Literal

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.experiment.plan import Solver
from meanfree.integrate.events import first_crossing
from meanfree.integrate.observables import (
    At,
    HalfLife,
    HighestPressure,
    Observable,
    ReactionTime,
)
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.planning.goal import Goal
from meanfree.progress import Progress, silent
from meanfree.sourced import Sourced

Kind = Literal[
    "reaction time",
    "half-life",
    "yield time",
    "conversion",
    "yield",
    "concentration",
    "partial pressure",
    "amount",
    "pressure",
    "temperature",
    "highest pressure",
]


@dataclass(frozen=True)
class Reading:
    """One thing to read off a run.

    "reaction time" of ``gas`` to ``level``, "half-life" and "yield time" [s]; "conversion" [1],
    "yield" [mol/mol] for each mole filled of ``basis``, "concentration" [mol/m^3], "partial
    pressure" [Pa] and "amount" [mol] of ``gas``, "pressure" [Pa] and "temperature" [K] at ``times``
    [s]; "highest pressure" [Pa]. ``columns`` numbers are read.
    """

    kind: Kind
    gas: str = ""
    level: float = 0.0
    basis: str = ""
    times: tuple[float, ...] = field(default=())

    @property
    def columns(self) -> int:
        """How many numbers it gives."""
        return max(1, len(self.times))


def read_off(run: Run, reading: Reading) -> Floats:
    """The numbers of a reading [SI, shape (columns,)]; NaN where a time is not reached."""
    if reading.kind in ("reaction time", "half-life"):
        level = 0.5 if reading.kind == "half-life" else reading.level
        time = run.reaction_time(reading.gas, level)
        return np.array([np.nan if time is None else time])
    if reading.kind == "highest pressure":
        return np.array([float(run.pressure(run.trajectory.times).max())])
    if reading.kind == "yield time":
        goal = Goal("yield", reading.gas, reading.level, reading.basis)
        found = first_crossing(run.trajectory, lambda t: goal.value(run, t), goal.level)
        return np.array([np.nan if found is None else found])
    t = np.minimum(np.array(reading.times), run.end)
    if reading.kind == "conversion":
        return run.conversion(reading.gas, t)
    if reading.kind == "yield":
        return Goal("yield", reading.gas, reading.level, reading.basis).value(run, t)
    if reading.kind == "pressure":
        return run.pressure(t)
    if reading.kind == "temperature":
        return run.temperature(t)
    by_gas = {
        "concentration": run.concentrations,
        "partial pressure": run.partial_pressures,
        "amount": run.amounts,
    }
    return np.asarray(by_gas[reading.kind](t)[run.index(reading.gas)])


def read_many(
    experiment: Experiment,
    conditions: Mapping[str, Floats],
    readings: Sequence[Reading],
    *,
    until: float | None = None,
    solver: Solver | None = None,
    progress: Progress = silent,
    note: str = "",
    singly: bool = False,
) -> list[Floats]:
    """Readings of many conditions.

    ``conditions`` maps addresses to values in the unit of the file, each of shape (n,). ``until``
    [s] ends every run; None leaves it to the experiment. Returns one array a reading, of shape
    (n, columns); a condition that is impossible or fails gives NaN.

    What the kernel can be asked for is asked of all conditions at once; the rest, and with
    ``singly`` everything, is read off single runs.
    """
    experiment = _ended(experiment, until)
    found: dict[int, Floats] = {}
    together = {
        i: r for i, r in enumerate(readings) if not singly and observables(r, experiment, until)
    }
    if together:
        try:
            answers = _together(experiment, conditions, list(together.values()), until, solver)
            found = dict(zip(together, answers, strict=True))
        except InputError:  # some condition is impossible: one by one, then
            found = {}
    alone = {i: r for i, r in enumerate(readings) if i not in found}
    if alone:
        rest = _one_by_one(experiment, conditions, list(alone.values()), solver, progress, note)
        found |= dict(zip(alone, rest, strict=True))
    return [found[i] for i in range(len(readings))]


AT = {
    "conversion": "conversion",
    "concentration": "concentration",
    "partial pressure": "partial pressure",
    "amount": "amount",
    "pressure": "total pressure",
    "temperature": "temperature",
}
"""Readings at times, and what the kernel calls them."""

MOMENTS = 48
"""Times at which the pressure is looked at for its highest, evenly on a logarithmic scale."""


def observables(
    reading: Reading, experiment: Experiment, until: float | None
) -> tuple[Observable, ...]:
    """What to ask of the kernel for a reading; () where it cannot be asked."""
    if reading.kind == "reaction time":
        return (ReactionTime(reading.gas, reading.level),)
    if reading.kind == "half-life":
        return (HalfLife(reading.gas),)
    if reading.kind in AT:
        return tuple(At(AT[reading.kind], reading.gas, time) for time in reading.times)
    steady = experiment.constant_temperature is not None
    if reading.kind == "highest pressure" and (steady or not experiment.vessel.is_rigid):
        return (HighestPressure(),)
    if reading.kind == "highest pressure" and until is not None:
        moments = np.geomspace(1e-6, 1.0, MOMENTS) * until
        return tuple(At("total pressure", "", float(time)) for time in moments)
    return ()


def can_be_read_together(
    experiment: Experiment,
    conditions: Mapping[str, Floats],
    readings: Sequence[Reading],
    until: float | None,
    solver: Solver,
) -> bool:
    """True where the kernel can answer all readings of such conditions."""
    if not all(observables(reading, experiment, until) for reading in readings):
        return False
    try:
        _together(_ended(experiment, until), conditions, readings, until, solver)
    except InputError:
        return False
    return True


def _ended(experiment: Experiment, until: float | None) -> Experiment:
    """The experiment with another end [s]; None leaves it."""
    if until is None:
        return experiment
    plan = replace(experiment.plan, until=Sourced(until, "s", dimension="time"), report_at=())
    return replace(experiment, plan=plan)


def _together(
    experiment: Experiment,
    conditions: Mapping[str, Floats],
    readings: Sequence[Reading],
    until: float | None,
    solver: Solver | None,
) -> list[Floats]:
    """All readings by the kernel."""
    from meanfree.integrate.many import Runs

    wanted = [observables(reading, experiment, until) for reading in readings]
    asked = list(dict.fromkeys(one for group in wanted for one in group))
    tolerance = experiment.plan.solver if solver is None else solver
    runs = Runs(experiment, asked, rtol=tolerance.rtol, atol=tolerance.atol)
    found, _ = runs.arrays(conditions)
    known = dict(zip(runs.columns, found, strict=True))
    answers = []
    for reading, group in zip(readings, wanted, strict=True):
        columns = np.stack([known[name] for one in group for name in one.columns], axis=1)
        if reading.kind == "highest pressure":
            columns = columns.max(axis=1, keepdims=True)
        answers.append(columns)
    return answers


def _one_by_one(
    experiment: Experiment,
    conditions: Mapping[str, Floats],
    readings: Sequence[Reading],
    solver: Solver | None,
    progress: Progress,
    note: str,
) -> list[Floats]:
    """All readings off single runs."""
    count = len(next(iter(conditions.values())))
    found = [np.full((count, reading.columns), np.nan) for reading in readings]
    for i in range(count):
        progress(i, count, note)
        try:
            changed = with_inputs(experiment, {a: float(v[i]) for a, v in conditions.items()})
            run = integrate(changed, solver)
        except (InputError, ComputationError):
            continue
        for reading, rows in zip(readings, found, strict=True):
            rows[i] = read_off(run, reading)
    return found
