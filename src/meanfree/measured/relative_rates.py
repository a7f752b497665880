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
from meanfree.measured.straight_lines import Interval, Line, straight_line


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
    xs, ys, errors = [], [], []
    for one, other in _pairs(runs, gas, reference):
        x, dx = _fallen(other)
        y, dy = _fallen(one)
        xs.append(x)
        ys.append(y)
        errors.append((dx, dy))
    x, y = np.concatenate(xs), np.concatenate(ys)
    if len(x) < 3:
        raise InputError.at("fit.analyses", f"{len(x)} pairs of readings", "at least three")
    sd = _effective(x, y, errors)
    line = straight_line(x, y, sd, through_origin=True)
    free = straight_line(x, y, sd)
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


def _fallen(run: MeasuredRun) -> tuple[Floats, Floats | None]:
    """ln(c0/c) from the second reading on, and its standard deviation where readings have one."""
    values, sd = run.readings.values, run.readings.sd
    if run.readings.signal.kind == "conversion":
        values = 1 - values
    if np.any(values <= 0):
        line = run.readings.lines[int(np.flatnonzero(values <= 0)[0])]
        found = f"a reading of {run.name} (line {line}) that is not above zero"
        raise InputError.at("fit.analyses", found, "readings above zero")
    fallen = np.log(values[0] / values[1:])
    return fallen, None if sd is None else np.hypot(sd[1:] / values[1:], sd[0] / values[0])


def _effective(
    x: Floats, y: Floats, errors: Sequence[tuple[Floats | None, Floats | None]]
) -> Floats | None:
    """Deviations of y with those of x carried over by the slope; None where some are not known.

    Source: Orear, Am. J. Phys. 50 (1982) 912 (effective variance).
    """
    if any(dx is None or dy is None for dx, dy in errors):
        return None
    dx = np.concatenate([one for one, _ in errors if one is not None])
    dy = np.concatenate([one for _, one in errors if one is not None])
    slope = float(x @ y / (x @ x))
    for _ in range(50):
        sd = np.hypot(dy, slope * dx)
        after = straight_line(x, y, sd, through_origin=True).slope
        if abs(after - slope) <= 1e-12 * abs(slope):
            break
        slope = after
    return np.asarray(np.hypot(dy, slope * dx))


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
