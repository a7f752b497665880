"""Many conditions of one experiment, as arrays: groups that are carried out together.

No law and no way to fill a vessel is written a second time here. A few Systems are built to see how
every number follows the addresses (`meanfree.integrate.template`); then all conditions follow at
once. Conditions that do not, because something switches between them, are parted where it does, and
what is left is built one by one: some 0.4 ms a condition. All that share a structure are carried
out together in any case.
"""

from __future__ import annotations

from collections.abc import Hashable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.integrate.numbers import Numbers, numbers_of
from meanfree.integrate.template import Misfit, Table, Template, template_for
from meanfree.kernel.parameters import Variation
from meanfree.kernel.slots import Name

FEW = 16
"""Conditions that are built one by one rather than looked through for what they share."""

CHECKED = 3
"""Conditions besides the extremes whose Systems are built to compare."""


@dataclass(frozen=True)
class Block:
    """Conditions that share a structure: ``rows`` of the table, and how their numbers vary.

    ``experiment`` is one of them; ``end`` [s, shape (count,) or (1,)], None where runs end by
    themselves: then ``watched`` is the gas whose conversion counts (None: none).
    ``structure`` is equal for blocks that one kernel can serve.
    """

    experiment: Experiment
    rows: np.ndarray
    variation: Variation
    end: Floats | None
    structure: Hashable
    watched: str | None


def as_table(conditions: Mapping[str, Any]) -> tuple[dict[str, Floats], int]:
    """Columns of one length, and that length; numbers alone hold for all conditions.

    Raises
    ------
    InputError
        Columns of different lengths, none at all, or values that are not finite.
    """
    columns = {str(a): np.atleast_1d(np.asarray(conditions[a], float)) for a in conditions}
    lengths = {len(column) for column in columns.values()} - {1}
    if not columns or len(lengths) > 1:
        found = "no columns" if not columns else f"columns of {sorted(lengths)} values"
        raise InputError.at("conditions", found, "columns of one length, one for each address")
    problems = [
        Problem(a, f"{c[~np.isfinite(c)][0]:g}", "a finite number")
        for a, c in columns.items()
        if not np.all(np.isfinite(c))
    ]
    if problems:
        raise InputError(problems)
    count = lengths.pop() if lengths else 1
    return {a: np.broadcast_to(column, count) for a, column in columns.items()}, count


class Conditions:
    """Conditions of one experiment, table after table.

    What was found about the addresses of one table serves the next: where its values lie within
    those seen before, nothing is built. ``built`` counts Systems.
    """

    def __init__(self, experiment: Experiment) -> None:
        self.experiment = experiment
        self.built = 0
        self._kept: Template | None = None
        self._again = False

    def blocks(self, table: Table, count: int) -> list[Block]:
        """As few blocks as the structures of the conditions allow."""
        if count == 0:
            return []
        if self._kept is not None and self._kept.covers(table):
            pieces = [_Piece(self._kept.base, np.arange(count), self._kept.values(table))]
        else:
            _refuse_impossible(self.experiment, table)
            pieces = self._pieces(table, np.arange(count))
        return [block for merged in _merged(pieces) for block in _by_watched(merged)]

    def _numbers(self, table: Table, row: int) -> Numbers:
        self.built += 1
        changed = {address: float(column[row]) for address, column in table.items()}
        return numbers_of(with_inputs(self.experiment, changed))

    def _pieces(self, table: Table, rows: np.ndarray) -> list[_Piece]:
        """Rows parted until each part follows a template."""
        if len(rows) <= FEW:
            return [_Piece(self._numbers(table, int(row)), np.array([row]), {}) for row in rows]
        part = {address: column[rows] for address, column in table.items()}
        found = self._template(part)
        if isinstance(found, Template):
            if len(rows) == len(next(iter(table.values()))):
                self._kept = found
            return [_Piece(found.base, rows, found.values(part))]
        column = part[_widest(part) if part.get(found.address) is None else found.address]
        middle = np.median(column)
        low = column <= middle if np.any(column > middle) else column < middle
        if low.all() or not low.any():
            return [_Piece(self._numbers(table, int(row)), np.array([row]), {}) for row in rows]
        return [*self._pieces(table, rows[low]), *self._pieces(table, rows[~low])]

    def _template(self, part: Table) -> Template | Misfit:
        spans = {a: (float(column.min()), float(column.max())) for a, column in part.items()}
        count = len(next(iter(part.values())))
        looked = {int(i) for i in np.linspace(0, count - 1, CHECKED)}
        for column in part.values():
            looked |= {int(np.argmin(column)), int(np.argmax(column))}
        rows = {address: column[sorted(looked)] for address, column in part.items()}
        # Neither an end nor the middle, where something may vanish.
        base = self._numbers(part, int(0.382 * (count - 1)))
        found, builds = template_for(base, spans, rows)
        self.built += builds
        return found


@dataclass(frozen=True)
class _Piece:
    """Rows that follow one System: ``values`` as a Variation's."""

    base: Numbers
    rows: np.ndarray
    values: Mapping[Name, Floats]


def _widest(part: Table) -> str:
    """The address with most different values."""
    return max(part, key=lambda address: len(np.unique(part[address])))


def _merged(pieces: list[_Piece]) -> Iterator[_Piece]:
    """Pieces of one structure as one."""
    groups: dict[Hashable, list[_Piece]] = {}
    for piece in pieces:
        groups.setdefault(piece.base.structure, []).append(piece)
    for group in groups.values():
        if len(group) == 1:
            yield group[0]
            continue
        first, names = group[0].base, group[0].base.names
        rows = np.concatenate([piece.rows for piece in group])
        order = np.argsort(rows, kind="stable")
        bases = np.array([piece.base.values for piece in group])
        moved = ~((bases == bases[0]) | (np.isnan(bases) & np.isnan(bases[0]))).all(axis=0)
        varied = {name for piece in group for name in piece.values}
        varied |= {names[i] for i in np.flatnonzero(moved)}
        values = {}
        for place, name in enumerate(names):
            if name not in varied:
                continue
            parts = [
                np.broadcast_to(
                    piece.values.get(name, bases[k, place : place + 1]), len(piece.rows)
                )
                for k, piece in enumerate(group)
            ]
            values[name] = np.concatenate(parts)[order]
        yield _Piece(first, rows[order], values)


def _by_watched(piece: _Piece) -> Iterator[Block]:
    """A piece as a block, or one for each gas that is the first to run out."""
    base, count = piece.base, len(piece.rows)
    values = {name: value for name, value in piece.values.items() if name != ("end",)}
    variation = Variation(base.system, count, values)
    plan = base.experiment.plan
    if plan.until is not None:
        end = piece.values.get(("end",), np.array([plan.until.value]))
        yield Block(base.experiment, piece.rows, variation, end, base.structure, None)
        return
    gases, which = _watched(base.experiment, variation)
    for place in np.unique(which):
        rows = np.flatnonzero(which == place)
        part = variation
        if len(rows) < count:
            picked = {n: v if len(v) == 1 else v[rows] for n, v in values.items()}
            part = Variation(base.system, len(rows), picked)
        gas = gases[place] if place >= 0 else None
        yield Block(base.experiment, piece.rows[rows], part, None, base.structure, gas)


NEAR = 1e-12
"""Gases that run out together to this share: the first one is watched, as with equal numbers."""


def _watched(experiment: Experiment, variation: Variation) -> tuple[list[str], np.ndarray]:
    """Gases, and which of them is watched in each condition (-1: none); see `Experiment.watched`"""
    count = variation.count
    if experiment.plan.watch is not None:
        return [experiment.plan.watch], np.zeros(count, int)
    needs = {
        gas: coefficient
        for step in experiment.steps
        for gas, coefficient in step.reactants
        if step.net.get(gas, 0.0) < 0
    }
    if not needs:
        return [], np.full(count, -1)
    lasts = np.full((len(needs), count), np.inf)
    for place, (gas, coefficient) in enumerate(needs.items()):
        start = variation.get("x", variation.system.gases.index(gas))
        lasts[place] = np.where(start > 0, start / coefficient, np.inf)
    least = lasts.min(axis=0)
    first = np.argmax(lasts <= least * (1 + NEAR), axis=0)
    return list(needs), np.where(np.isfinite(least), first, -1)


def blocks_of(experiment: Experiment, table: Table, count: int) -> Iterator[Block]:
    """The conditions as few blocks as their structure allows."""
    yield from Conditions(experiment).blocks(table, count)


def _refuse_impossible(experiment: Experiment, table: Table) -> None:
    """Bounds are intervals: the least and the largest value of each column speak for all."""
    problems: dict[str, Problem] = {}
    for pick in (np.min, np.max):
        try:
            with_inputs(experiment, {a: float(pick(column)) for a, column in table.items()})
        except InputError as error:
            problems.update({p.key: p for p in error.problems})
    if problems:
        raise InputError(problems.values())
