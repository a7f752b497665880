"""Readings of one run: a column of times and a column of what an instrument showed, in SI.

Whatever makes no sense is refused with its file, line and column, or kept and flagged in words;
nothing is dropped.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from meanfree import units
from meanfree.equations.system import Floats
from meanfree.errors import InputError, Problem
from meanfree.measured.delimited import (
    Cells,
    Column,
    Layout,
    cells_of,
    column,
    content_of,
    decoded,
    first_few,
)
from meanfree.measured.signals import DIMENSIONS, LEAST, Signal

HUGE = 1e60
"""Numbers beyond this (SI) are slips of the keyboard; their squares would not fit a float."""


@dataclass(frozen=True)
class ColumnRequest:
    """A column of the file, by name or by number from 1, and the unit it is in."""

    column: str | int
    unit: str = ""


@dataclass(frozen=True)
class Deviation:
    """The standard deviation of readings: one for all, a column, a share of each reading.

    ``value`` [SI of the signal], ``column`` in the unit of the signal, ``share`` [1]; where all
    are None it is estimated from the scatter about the fit.
    """

    value: float | None = None
    column: ColumnRequest | None = None
    share: float | None = None

    @property
    def is_estimated(self) -> bool:
        """True where the scatter about the fit has to tell it."""
        return self.value is None and self.column is None and self.share is None


@dataclass(frozen=True)
class FileRequest:
    """Which columns of which file are to be read; ``shown`` is the file's name for messages.

    ``axis`` is time, or temperature for rate constants; ``zero`` [s] is what the clock showed when
    the run began.
    """

    path: Path
    shown: str
    axis: ColumnRequest
    signal_column: ColumnRequest
    signal: Signal
    deviation: Deviation = field(default_factory=Deviation)
    layout: Layout = field(default_factory=Layout)
    zero: float = 0.0


@dataclass(frozen=True)
class Readings:
    """What was read, in SI.

    ``times`` [s] (or temperatures [K] where the signal is a rate constant), ``values`` in the SI
    unit of the signal, ``sd`` in the same or None where it is to be estimated, all of shape (n,);
    ``lines`` of the file; ``unit`` the signal is shown in; ``notes`` what a reader should know.
    """

    file: str
    signal: Signal
    times: Floats
    values: Floats
    sd: Floats | None
    lines: tuple[int, ...]
    unit: str
    time_unit: str
    notes: tuple[str, ...] = field(default=())

    def __len__(self) -> int:
        return len(self.times)

    def shown(self, values: Floats) -> Floats:
        """SI values of the signal in the unit of the file."""
        return np.array([self.in_unit(float(value)) for value in np.atleast_1d(values)])

    def in_unit(self, value: float) -> float:
        """One SI value of the signal in the unit of the file."""
        return units.from_si(value * self.signal.per, self.unit, self.dimension)

    @property
    def dimension(self) -> str:
        """The dimension word of the signal."""
        return dimension_of(self.signal)


def dimension_of(signal: Signal) -> str:
    """The dimension word of a signal."""
    if signal.is_rate_constant:
        return units.rate_constant(signal.order)
    return DIMENSIONS[signal.kind]


def read_file(request: FileRequest) -> Readings:
    """The readings of one file.

    Raises
    ------
    InputError
        The file cannot be read, a column is not there, a cell is no number, time goes back, a
        pressure is negative, all readings are equal: all problems in one go.
    """
    cells = _open(request)
    problems: list[Problem] = []
    columns = {
        "axis": _column(cells, request, request.axis, problems),
        "signal": _column(cells, request, request.signal_column, problems),
    }
    if request.deviation.column is not None:
        columns["sd"] = _column(cells, request, request.deviation.column, problems)
    if not problems:
        problems += _nonsense(request, columns["axis"], columns["signal"])
        problems += _bad_deviations(columns.get("sd"))
    if problems:
        raise InputError(problem.inside(request.shown) for problem in problems)
    readings = _in_si(request, columns)
    for name, values in (("axis", readings.times), ("signal", readings.values)):
        huge = np.flatnonzero(~(np.abs(values) < HUGE))
        if len(huge):
            column, at = columns[name], int(huge[0])
            where = f"line {column.lines[at]}, column {column.name}"
            found = f"{column.values[at]:g}, which no instrument shows"
            raise _one(request, Problem(where, found, "a number of a sensible size"))
    return readings


def _open(request: FileRequest) -> Cells:
    content = content_of(request.path)
    text = content if isinstance(content, Problem) else decoded(content)
    if isinstance(text, Problem):
        raise _one(request, text)
    wanted = [request.axis.column, request.signal_column.column]
    if request.deviation.column is not None:
        wanted.append(request.deviation.column.column)
    cells = cells_of(text, request.layout, wanted)
    if isinstance(cells, Problem):
        raise _one(request, cells)
    return cells


def _one(request: FileRequest, problem: Problem) -> InputError:
    return InputError([problem.inside(request.shown)])


def _column(
    cells: Cells, request: FileRequest, wanted: ColumnRequest, problems: list[Problem]
) -> Column:
    found, wrong = column(cells, wanted.column, request.layout, "the heading")
    problems += wrong
    return found if found is not None else Column("", (), ())


def _nonsense(request: FileRequest, axis: Column, signal: Column) -> list[Problem]:
    """What cannot be: time that goes back or is before the start, negative pressures, no change."""
    if len(axis.values) < 2:
        return [Problem("", f"{len(axis.values)} reading", "at least two")]
    problems: list[Problem] = []
    if not request.signal.is_rate_constant:
        backward = _odd_times(request, axis)
        problems += first_few(backward, f"column {axis.name}", "times that do not go back")
    impossible = _impossible(request, signal)
    problems += first_few(impossible, f"column {signal.name}", "numbers that can be")
    if len(set(signal.values)) == 1:
        found = f"{len(signal.values)} readings that are all {signal.values[0]:g}"
        problems.append(Problem(f"column {signal.name}", found, "a signal that changes"))
    return problems


def _odd_times(request: FileRequest, axis: Column) -> Iterator[Problem]:
    scale = units.to_si(1.0, request.axis.unit, "time")
    before = None
    for line, value in zip(axis.lines, axis.values, strict=True):
        where = f"line {line}, column {axis.name}"
        if before is not None and value < before:
            expected = f"times that do not go back (at least {before:g})"
            yield Problem(where, f"{value:g} after {before:g}", expected)
        if value * scale < request.zero:
            found = f"{value:g} {request.axis.unit}, before time zero"
            expected = "times from the start of the run; zero = … says where the clock stood then"
            yield Problem(where, found, expected)
        before = value


def _impossible(request: FileRequest, signal: Column) -> Iterator[Problem]:
    pressure, rates = LEAST.get(request.signal.kind, False), request.signal.is_rate_constant
    for line, value in zip(signal.lines, signal.values, strict=True):
        where = f"line {line}, column {signal.name}"
        if pressure and value < 0:
            yield Problem(where, f"{value:g}, a negative pressure", "at least 0")
        if rates and value <= 0:
            yield Problem(where, f"{value:g}", "a rate constant above 0")


def _bad_deviations(sd: Column | None) -> list[Problem]:
    if sd is None:
        return []
    expected = "a standard deviation above 0"
    bad = (
        Problem(f"line {line}, column {sd.name}", f"{value:g}", expected)
        for line, value in zip(sd.lines, sd.values, strict=True)
        if value <= 0
    )
    return first_few(bad, f"column {sd.name}", expected)


def _in_si(request: FileRequest, columns: dict[str, Column]) -> Readings:
    signal, dimension = request.signal, dimension_of(request.signal)
    unit = request.signal_column.unit
    values = _converted(columns["signal"].values, unit, dimension) / signal.per
    if signal.is_rate_constant:
        axis = _converted(columns["axis"].values, request.axis.unit, "temperature")
    else:
        axis = _converted(columns["axis"].values, request.axis.unit, "time") - request.zero
    return Readings(
        request.shown,
        signal,
        axis,
        values,
        _deviations(request, columns.get("sd"), values, dimension),
        columns["signal"].lines,
        unit,
        request.axis.unit,
        tuple(_flags(request, columns["signal"], values)),
    )


def _converted(values: Sequence[float], unit: str, dimension: str) -> Floats:
    zero, one = units.to_si(0.0, unit, dimension), units.to_si(1.0, unit, dimension)
    return zero + (one - zero) * np.asarray(values, float)


def _deviations(
    request: FileRequest, sd: Column | None, values: Floats, dimension: str
) -> Floats | None:
    deviation = request.deviation
    if sd is not None:
        unit, per = request.signal_column.unit, request.signal.per
        zero = units.to_si(0.0, unit, dimension)
        return np.asarray((_converted(sd.values, unit, dimension) - zero) / per)
    if deviation.value is not None:
        return np.full(len(values), deviation.value)
    if deviation.share is not None:
        return np.asarray(deviation.share * np.maximum(np.abs(values), 1e-300))
    return None


def _flags(request: FileRequest, column: Column, values: Floats) -> list[str]:
    """What is odd but possible, in words; the readings stay."""
    notes = []
    kind = request.signal.kind
    below = [line for line, value in zip(column.lines, values, strict=True) if value < 0]
    if below:
        notes.append(
            f"{request.shown}: {_count(below)} below zero in column {column.name} "
            f"({_lines(below)}); kept as scatter about zero."
        )
    if kind in ("conversion", "mole fraction"):
        above = [line for line, value in zip(column.lines, values, strict=True) if value > 1]
        if above:
            notes.append(
                f"{request.shown}: {_count(above)} above 1 in column {column.name} "
                f"({_lines(above)}); kept."
            )
    return notes


def _count(lines: Sequence[int]) -> str:
    return "1 reading" if len(lines) == 1 else f"{len(lines)} readings"


def _lines(lines: Sequence[int]) -> str:
    shown = ", ".join(str(line) for line in lines[:5])
    return f"line{'' if len(lines) == 1 else 's'} {shown}{', …' if len(lines) > 5 else ''}"
