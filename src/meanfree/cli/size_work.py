"""What `size` is asked, held against a case, and worked out."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np

from meanfree.case.addresses import input_at, number_at, time_of
from meanfree.errors import InputError, Problem
from meanfree.planning.best_stop import peaks
from meanfree.planning.goal import SHARP, Goal, carried_out, reach
from meanfree.planning.readings import Reading
from meanfree.planning.sensitivity import sensitivities
from meanfree.planning.sizing import Sizing
from meanfree.planning.sizing import size as find_size
from meanfree.planning.uncertainty import spread_of
from meanfree.report.planning.size import SizeResult, size_document
from meanfree.units import QuantityError, read_number

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.experiment.experiment import Experiment
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord

DEFAULT_LEVEL = 0.5
CURVE = 40
"""Times at which conversions are read for curves of sensitivity and bands."""


@dataclass(frozen=True)
class Question:
    """The options of `size` as they were typed."""

    conversion: str | None
    yielded: str | None
    of: str | None
    within: str | None
    vary: str | None
    between: tuple[str, str] | None
    sensitivity: bool
    uncertainty: bool
    runs: int

    @property
    def arguments(self) -> list[str]:
        """The options again, to repeat the command."""
        words: list[str] = []
        for name, value in (
            ("--conversion", self.conversion),
            ("--yield", self.yielded),
            ("--of", self.of),
            ("--within", self.within),
            ("--vary", self.vary),
        ):
            words += [] if value is None else [name, value]
        if self.between is not None:
            words += ["--between", *self.between]
        words += ["--sensitivity"] if self.sensitivity else []
        words += ["--uncertainty", "--runs", str(self.runs)] if self.uncertainty else []
        return words


def worked_out(
    question: Question, case: LoadedCase, record: CaseRecord, progress: Progress
) -> Document:
    """The document that answers a question about a case."""
    experiment = case.experiment
    goal = goal_of(question, experiment)
    within = _within(question, case)
    if question.uncertainty:
        _needs_uncertainties(case)
    sizing = _sizing(question, experiment, goal, within, progress)
    run = carried_out(experiment, goal, None, SHARP)
    reached = reach(run, goal)
    time = reached.time if reached.time is not None else run.end
    until = max(2.0 * time, within or 0.0)
    readings = _readings(goal, until)
    found = None
    if question.sensitivity:
        found = sensitivities(experiment, readings, 1.5 * until, progress)
    spread = None
    if question.uncertainty:
        exponent = round(math.log2(question.runs))
        # Slow draws must get there too: twenty times as long is far out in the tail, or never.
        spread = spread_of(
            experiment,
            case.planning,
            readings[:2],
            exponent=exponent,
            until=20.0 * until,
            progress=progress,
        )
    result = SizeResult(
        experiment, goal, run, reached, tuple(peaks(run)), within, sizing, found, spread
    )
    return size_document(result, record, question.arguments)


def _readings(goal: Goal, until: float) -> list[Reading]:
    """What is followed: the time to the goal, the way there, half-life and pressure."""
    times = tuple(float(t) for t in np.linspace(0, until, CURVE + 1)[1:])
    if goal.kind == "yield":
        return [
            Reading("yield time", goal.gas, goal.level, goal.basis),
            Reading("yield", goal.gas, goal.level, goal.basis, times),
            Reading("half-life", goal.basis),
            Reading("highest pressure"),
        ]
    return [
        Reading("reaction time", goal.gas, goal.level),
        Reading("conversion", goal.gas, times=times),
        Reading("half-life", goal.gas),
        Reading("highest pressure"),
    ]


def goal_of(question: Question, experiment: Experiment) -> Goal:
    """The goal. Raises `InputError` for a gas that cannot reach one, or a level out of range."""
    kind: Literal["conversion", "yield"] = "conversion"
    option, text = "--conversion", question.conversion
    if question.yielded is not None:
        kind, option, text = "yield", "--yield", question.yielded
    watched = experiment.watched
    gas = question.of or watched
    problems = []
    consumed = {g for s in experiment.steps for g, n in s.net.items() if n < 0} | {
        g for s in experiment.steps if s.reverse is not None for g, n in s.net.items() if n > 0
    }
    formed = {g for s in experiment.steps for g, n in s.net.items() if n > 0} | {
        g for s in experiment.steps if s.reverse is not None for g, n in s.net.items() if n < 0
    }
    filled = {g for g, n in experiment.moles.items() if n > 0}
    able = sorted(consumed & filled if kind == "conversion" else formed)
    if gas is None or gas not in able or watched is None:
        found = "no gas" if gas is None else f'"{gas}"'
        problems.append(Problem("--of", found, f"one of {', '.join(able)}" if able else "a gas"))
    level = DEFAULT_LEVEL
    try:
        if text is not None:
            kind_of = "fraction" if kind == "conversion" or text.endswith("%") else "pure"
            level = read_number(_plain(text), kind_of).value
        if not level > 0 or (kind == "conversion" and level >= 1):
            expected = "a fraction between 0 and 1" if kind == "conversion" else "one above 0"
            problems.append(Problem(option, f"{level:g}", expected))
    except QuantityError as error:
        problems.append(Problem(option, error.found, error.expected))
    if problems:
        raise InputError(problems)
    assert gas is not None and watched is not None
    return Goal(kind, gas, level, watched if kind == "yield" else "")


def _plain(text: str) -> str | float:
    try:
        return float(text)
    except ValueError:
        return text


def _within(question: Question, case: LoadedCase) -> float | None:
    if question.within is not None:
        return time_of(question.within, "--within")
    if question.vary is None:
        return None
    if case.planning.patience is None:
        expected = 'a time such as "8 h", or patience under [plan]'
        raise InputError.at("--within", "nothing beside --vary", expected)
    return case.planning.patience.value


def _sizing(
    question: Question,
    experiment: Experiment,
    goal: Goal,
    within: float | None,
    progress: Progress,
) -> Sizing | None:
    if question.vary is None or question.between is None or within is None:
        return None
    known = input_at(experiment, question.vary, "--vary")
    low, high = (number_at(known, text, "--between") for text in question.between)
    return find_size(experiment, goal, within, known.address, low, high, known.unit, progress)


def _needs_uncertainties(case: LoadedCase) -> None:
    stated = any(step.uncertainty is not None for step in case.experiment.steps)
    if not stated and not case.planning.tolerances:
        expected = "uncertainty of a step, or tolerances under [plan]"
        raise InputError.at("--uncertainty", "no uncertainty in the case", expected)
