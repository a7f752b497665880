"""Pseudo-first-order: k' of a gas in excess of its partner, against the partner's concentration."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.mechanism import Step
from meanfree.measured.covariances import covariance
from meanfree.measured.least_squares import Scales, solve
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.straight_lines import Interval, Line, straight_line, widened

EXCESS = 10.0
"""Partner over gas below which k' falls during a run; common practice, no source."""


@dataclass(frozen=True)
class Decay:
    """One exponential: k' [1/s] with its error, and the partner's concentration [mol/m^3]."""

    run: str
    rate: float
    error: float
    partner: float
    excess: float


@dataclass(frozen=True)
class PseudoFirstOrder:
    """k' against the partner's concentration.

    ``slope`` [m^3/mol/s] is k for the loss of ``gas``; ``per_event`` how many molecules of it one
    event of ``step`` takes (1 where the case has no such step). ``intercept`` [1/s].
    """

    gas: str
    partner: str
    step: str
    per_event: float
    decays: tuple[Decay, ...]
    line: Line
    slope: Interval
    intercept: Interval
    words: tuple[str, ...]


def pseudo_first_order(
    runs: Sequence[MeasuredRun], gas: str, partner: str, *, base_line: bool = False
) -> PseudoFirstOrder:
    """Fit an exponential to each run of ``gas`` and a line to k' against [partner].

    Raises InputError where fewer than three runs follow the gas in different amounts of partner,
    ComputationError where an exponential cannot be fitted.
    """
    decays = [
        decay_of(run, gas, partner, base_line=base_line)
        for run in runs
        if run.readings.signal.gases == (gas,)
    ]
    if len({round(one.partner, 9) for one in decays}) < 3:
        found = f"{len(decays)} runs that follow {gas}, in too few amounts of {partner}"
        raise InputError.at("fit.analyses", found, "three amounts of the partner or more")
    x = np.array([one.partner for one in decays])
    line = widened(
        straight_line(
            x, np.array([one.rate for one in decays]), np.array([one.error for one in decays])
        )
    )
    slope, intercept = line.slope_interval, line.intercept_interval
    step = _step(runs[0], gas, partner)
    return PseudoFirstOrder(
        gas,
        partner,
        "" if step is None else step.name,
        1.0 if step is None else -step.net[gas],
        tuple(decays),
        line,
        slope,
        intercept,
        tuple(_words(gas, partner, decays, line, intercept)),
    )


def _step(run: MeasuredRun, gas: str, partner: str) -> Step | None:
    for step in run.experiment.steps:
        if step.orders == {gas: 1.0, partner: 1.0} and step.net.get(gas, 0.0) < 0:
            return step
    return None


def decay_of(run: MeasuredRun, gas: str, partner: str, *, base_line: bool) -> Decay:
    """The exponential of one run: signal = a exp(-k' t), with a base line where asked for."""
    readings, experiment = run.readings, run.experiment
    if partner not in experiment.moles:
        known = ", ".join(experiment.gas_named)
        raise InputError.at("fit.analyses", f'"{partner}", no gas of the case', f"one of {known}")
    y, t = readings.values, readings.times
    if readings.signal.kind == "conversion":
        y = 1 - y
    sd = readings.sd
    weight = np.ones(len(t)) if sd is None else 1 / sd
    unknowns = 3 if base_line else 2
    if len(t) <= unknowns:
        found = f"{len(t)} readings of {run.name}"
        raise InputError.at("fit.analyses", found, f"more than {unknowns}")

    def misfit(p: Floats) -> Floats:
        shown = p[0] * np.exp(-math.exp(min(p[1], 700.0)) * t) + (p[2] if base_line else 0.0)
        return np.asarray((y - shown) * weight)

    start = [float(y[0]), math.log(_guess(t, y, base_line))] + ([float(y[-1])] if base_line else [])
    size = [abs(float(y[0])) or 1.0, 1.0] + ([abs(float(y[0])) or 1.0] if base_line else [])
    solution = solve(misfit, Scales.of(start, size=size))
    if not solution.converged:
        raise ComputationError(f"No exponential fits {run.name}: {solution.message}")
    scale = 1.0 if sd is not None else solution.sum_of_squares / (len(t) - unknowns)
    rate = math.exp(float(solution.values[1]))
    error = rate * math.sqrt(float(covariance(solution)[1, 1]) * scale)
    volume = experiment.initial_volume + experiment.dead_capacity * experiment.temperature.initial
    there, other = experiment.moles[gas], experiment.moles[partner]
    excess = other / there if there > 0 else math.inf
    return Decay(run.name, rate, error, other / volume, excess)


def _guess(t: Floats, y: Floats, base_line: bool) -> float:
    """k' from the time in which the first reading has fallen to 1/e of what there is to fall."""
    rest = y[-1] if base_line else 0.0
    fallen = np.flatnonzero((y - rest) / (y[0] - rest + 1e-300) < math.exp(-1))
    if len(fallen) and t[fallen[0]] > t[0]:
        return 1 / float(t[fallen[0]] - t[0])
    return 1 / max(float(t[-1] - t[0]), 1e-30)


def _words(
    gas: str, partner: str, decays: Sequence[Decay], line: Line, intercept: Interval
) -> list[str]:
    said = []
    smallest = min(one.excess for one in decays)
    least = float(line.x.min())
    if intercept.low > 0:
        share = intercept.value / float(line.at(np.array([least]))[0])
        said.append(
            f"The intercept is above zero: {gas} is also lost without {partner} (walls, light, "
            "itself, an impurity), and that is "
            f"{100 * share:.0f} % of its loss at the least {partner}."
        )
    elif intercept.high < 0:
        said.append(
            f"The intercept is below zero, which no loss gives: {partner} is less than filled "
            "(used up, adsorbed), or the line curves."
        )
    else:
        said.append(
            f"The intercept is zero within its interval: no loss of {gas} without {partner} shows."
        )
    if smallest < EXCESS:
        said.append(
            f"{partner} is only {smallest:.2g} times {gas} in one run: k' falls as it is used up. "
            "Fit the step itself instead."
        )
    if line.sd is not None and line.freedom is not None:
        said.append("The points scatter more than their errors; the intervals are widened.")
    return said
