"""What the compiled loop takes in and hands out: plain arrays, and the numbers that describe them.

Shapes: W [n_slots, lanes] the work array; I [n_marks, lanes] what each lane remembers in integers.
Where an array has a row for each condition, one row alone serves all of them.
"""

from __future__ import annotations

from enum import IntEnum
from typing import Any, NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from meanfree.kernel.cache import machine_code_in_user_cache
from meanfree.kernel.slots import SCALARS

Floats = NDArray[np.float64]
Longs = NDArray[np.int64]


def compiled(function: Any) -> Any:
    """How everything in the loop is compiled: kept on disk, without Python's lock."""
    with machine_code_in_user_cache():
        return njit(cache=True, nogil=True, error_model="numpy")(function)


class Places(NamedTuple):
    """Numbers of one job: sizes, first slots, and what is asked. No arrays, so it costs nothing.

    ``size`` counts the ``states`` and their derivatives. ``heat``, ``v`` and ``T`` are places in
    the state, -1 without them, as is ``watched``, the gas whose conversion counts in an
    ``automatic`` run.
    """

    lanes: int
    size: int
    states: int
    gases: int
    unknowns: int
    n_parameters: int
    n_stages: int
    n_dense: int
    n_functionals: int
    heat: int
    v: int
    T: int
    atol: int
    state: int
    new: int
    argument: int
    value: int
    stage: int
    parameter: int
    alarm: int
    most: int
    still: int
    rest: int
    begin: int
    gamma: float
    exponent: float
    rtol: float
    automatic: bool
    watched: int


class Conditions(NamedTuple):
    """The conditions. A condition is a row of state, parameters, three absolute tolerances and the

    end [s]: ``common`` [size + n_parameters + 4], but ``own`` [n_varied, n] in its places
    ``varied``. ``breaks`` [rows, n_breaks, 3 + n_changed]: when a segment starts [s], the fraction
    retained, the temperature [K] (0: as it is), and the values of the parameters ``changed``.
    ``moving`` [rows, n_breaks, n_directions, 3]: derivatives of the first three.
    """

    common: Floats
    varied: Longs
    own: Floats
    breaks: Floats
    changed: Longs
    moving: Floats


class Request(NamedTuple):
    """What to keep of every run besides its end.

    ``flags`` [n_functionals, 3]: sign (-1 where levels are reached from above), whether drawn
    samples shrink the levels, whether the maximum is asked instead. ``initial`` [n, n_functionals]
    values at time zero. ``levels`` [rows, n_functionals, n_levels] in the order in which they are
    reached, NaN after the last. ``grid`` [rows, n_times] in s. ``bearing`` [n_gases] is 1 for gases
    that must come to rest before a run of open length does.
    """

    flags: Longs
    initial: Floats
    levels: Floats
    grid: Floats
    bearing: Longs


class Kept(NamedTuple):
    """What is kept of every run: one row a condition; NaN is what was not reached.

    ``ends`` [n, size + 1]: state and time at the end; ``rests`` [n or 0, size] where an automatic
    run rests. ``marks`` [n, 4]: how it ended, steps tried, steps refused, steps with pivoting.
    ``events`` [n, n_functionals, n_levels] s; ``peaks`` [n, n_functionals, 2] time and value;
    ``values`` [n, n_times, n_functionals].
    """

    ends: Floats
    rests: Floats
    marks: Longs
    events: Floats
    peaks: Floats
    values: Floats


class Lane(IntEnum):
    """Rows of I. ``WHO`` is the condition, -1 for none; ``AGAIN`` one of the numbers below;

    ``BEGAN`` the step of the loop with which the segment began; ``LEVEL`` and beyond count the
    levels reached.
    """

    WHO = 0
    FRESH = 1
    SEGMENT = 2
    AGAIN = 3
    GRID = 4
    BEGAN = 5
    LEVEL = 6


WHO, FRESH, SEGMENT, AGAIN, GRID, BEGAN, LEVEL = (int(mark) for mark in Lane)

SLOT = {name: SCALARS.index(name) for name in SCALARS}
"""Slot of each scalar by name."""

FIRST_RUN, SECOND_RUN, ONE_STEP, TO_RUN_AGAIN, TO_STEP_AGAIN = range(5)
"""What a lane is doing: integrating a condition, integrating it once more, making one step of it
once more; or about to do one of the latter."""

ROOM, FEWEST, MOST = 4096, 64, 1024
"""Numbers a lane that the history of a run may take, but no fewer steps and no more than these."""


def remembered(states: int) -> int:
    """Steps that are remembered; what comes to rest later than that is integrated twice."""
    return int(min(max(ROOM // (states + 2), FEWEST), MOST))


def kept_for(p: Places, request: Request, count: int) -> Kept:
    """Room for the results of ``count`` conditions."""
    nan, functionals = np.nan, p.n_functionals
    return Kept(
        ends=np.full((count, p.size + 1), nan),
        rests=np.full((count if p.automatic else 0, p.size), nan),
        marks=np.zeros((count, 4), np.int64),
        events=np.full((count, functionals, request.levels.shape[2]), nan),
        peaks=np.full((count, functionals, 2), nan),
        values=np.full((count, request.grid.shape[1], functionals), nan),
    )
