"""A blank run taken off: what the instrument shows without the reaction, at the same times."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

import numpy as np

from meanfree.errors import InputError, Problem
from meanfree.measured.readings import Readings

Subtraction = Literal["signal", "change"]


def without_blank(readings: Readings, blank: Readings, what: Subtraction) -> Readings:
    """Readings less those of a blank run, linear between its points.

    "signal" takes all of the blank's signal off (a base line), "change" only its change since its
    first reading (a leak, a drift). Where both have standard deviations these add in quadrature.

    Raises InputError where the blank does not cover the times of the run.
    """
    first, last = float(blank.times[0]), float(blank.times[-1])
    outside = (readings.times < first) | (readings.times > last)
    if np.any(outside):
        line = readings.lines[int(np.flatnonzero(outside)[0])]
        found = f"a blank from {first:g} to {last:g} s, and a reading outside it in line {line}"
        problem = Problem("blank", found, "a blank that covers every time of the run")
        raise InputError([problem.inside(readings.file)])
    taken = np.interp(readings.times, blank.times, blank.values)
    if what == "change":
        taken = taken - blank.values[0]
    sd = readings.sd
    if sd is not None and blank.sd is not None:
        of_blank = np.interp(readings.times, blank.times, blank.sd)
        sd = np.hypot(sd, of_blank)
    whole = "the signal" if what == "signal" else "the change"
    note = f"{readings.file}: {whole} of the blank {blank.file} is subtracted."
    return replace(
        readings, values=readings.values - taken, sd=sd, notes=(*readings.notes, note, *blank.notes)
    )
