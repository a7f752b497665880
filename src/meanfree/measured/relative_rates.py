"""Relative rates: two gases in one mixture, lost to the same partner, against each other.

ln(A0/A) = (k_A/k_R) ln(R0/R), whatever the partner's concentration did meanwhile.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.measured.fits import quantile
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.straight_lines import Interval, Line, correlated_line


@dataclass(frozen=True)
class RelativeRate:
    """The ratio of two rate constants.

    ``ratio`` k_A/k_R [1] from the line through the origin; ``free`` the line with an intercept,
    whose interval tells whether anything else takes one of the gases. ``k`` is the absolute one in
    the unit of ``reference_k``, None without that.
    """

    gas: str
    reference: str
    line: Line
    free: Line
    ratio: Interval
    k: Interval | None
    words: tuple[str, ...]


def relative_rate(
    runs: Sequence[MeasuredRun],
    gas: str,
    reference: str,
    reference_k: float | None = None,
    reference_factor: float = 1.0,
) -> RelativeRate:
    """The plot of two gases that were read at the same times.

    Runs are paired by their conditions: one whose signal is of ``gas`` with one of ``reference``.
    ``reference_factor`` says how good the reference constant is (x/÷, one standard deviation).

    Raises InputError where no two runs belong together or a reading is not above zero.
    """
    pairs = [(_fallen(one), _fallen(other)) for one, other in _pairs(runs, gas, reference)]
    x = np.concatenate([theirs.fallen for _, theirs in pairs])
    y = np.concatenate([ours.fallen for ours, _ in pairs])
    if len(x) < 3:
        raise InputError.at("fit.analyses", f"{len(x)} pairs of readings", "at least three")
    known = all(one.known for pair in pairs for one in pair)
    line, free = (_line(pairs, x, y, known, through_origin=at) for at in (True, False))
    t, ratio = line.quantile, line.slope_interval
    k = None
    if reference_k is not None:
        share = math.hypot(ratio.error / ratio.value, math.log(reference_factor))
        wide = math.hypot(
            t * ratio.error / ratio.value, quantile(None) * math.log(reference_factor)
        )
        value = ratio.value * reference_k
        k = Interval(value, value * share, value * math.exp(-wide), value * math.exp(wide))
    return RelativeRate(gas, reference, line, free, ratio, k, tuple(_words(free, gas, reference)))


def _pairs(
    runs: Sequence[MeasuredRun], gas: str, reference: str
) -> list[tuple[MeasuredRun, MeasuredRun]]:
    ours = [run for run in runs if run.readings.signal.gases == (gas,)]
    theirs = [run for run in runs if run.readings.signal.gases == (reference,)]
    pairs = [
        (one, other)
        for one in ours
        for other in theirs
        if one.conditions == other.conditions
        and len(one.readings) == len(other.readings)
        and np.allclose(one.readings.times, other.readings.times, rtol=1e-9)
    ]
    if not pairs:
        found = f"no runs of {gas} and {reference} at the same times under the same conditions"
        raise InputError.at("fit.analyses", found, "a [[data]] of each from one mixture")
    return pairs


@dataclass(frozen=True)
class _Fallen:
    """ln(c0/c) from the second reading on, its variance, and that of ln c0, which all share."""

    fallen: Floats
    own: Floats
    shared: float
    known: bool


def _fallen(run: MeasuredRun) -> _Fallen:
    """Where no deviation is given, readings scatter alike: variances up to a common factor."""
    values, sd = run.readings.values, run.readings.sd
    if run.readings.signal.kind == "conversion":
        values = 1 - values
    if np.any(values <= 0):
        line = run.readings.lines[int(np.flatnonzero(values <= 0)[0])]
        found = f"a reading of {run.name} (line {line}) that is not above zero"
        raise InputError.at("fit.analyses", found, "readings above zero")
    relative = (np.ones(len(values)) if sd is None else sd) / values
    fallen = np.log(values[0] / values[1:])
    return _Fallen(fallen, relative[1:] ** 2, float(relative[0] ** 2), sd is not None)


def _line(
    pairs: Sequence[tuple[_Fallen, _Fallen]],
    x: Floats,
    y: Floats,
    known: bool,
    *,
    through_origin: bool,
) -> Line:
    """The line with the errors of both axes, those of each run's first readings shared.

    Errors of x are carried over to y by the slope (effective variance: Orear, Am. J. Phys. 50
    (1982) 912).
    """
    slope = float(x @ y / (x @ x))
    for _ in range(50):
        V = np.zeros((len(x), len(x)))
        start = 0
        for ours, theirs in pairs:
            n = len(ours.fallen)
            here = slice(start, start + n)
            V[here, here] = ours.shared + slope**2 * theirs.shared
            V[here, here] += np.diag(ours.own + slope**2 * theirs.own)
            start += n
        line = correlated_line(x, y, V, known=known, through_origin=through_origin)
        if abs(line.slope - slope) <= 1e-12 * abs(slope):
            break
        slope = line.slope
    return line


def _words(free: Line, gas: str, reference: str) -> list[str]:
    t = free.quantile
    low = free.intercept - t * free.intercept_error
    high = free.intercept + t * free.intercept_error
    if low <= 0 <= high:
        return ["A free intercept is zero within its interval, as it should be."]
    which = gas if low > 0 else reference
    return [
        f"A free intercept is {free.intercept:.3g} (95 %: {low:.2g} to {high:.2g}) and not zero: "
        f"something else takes {which}, or a first reading is off."
    ]
