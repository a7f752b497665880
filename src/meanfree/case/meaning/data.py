"""``[[data]]``: each table held against the experiment whose readings it names."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from meanfree import units
from meanfree.case.findings import Findings
from meanfree.case.meaning.beside import file_beside
from meanfree.case.meaning.signals import read_signal
from meanfree.case.schema.data import BlankTable, ColumnTable, DataTable, LayoutTable
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.measured.blank import without_blank
from meanfree.measured.delimited import NAMES, Layout
from meanfree.measured.readings import (
    ColumnRequest,
    Deviation,
    FileRequest,
    Readings,
    dimension_of,
    read_file,
)
from meanfree.measured.signals import Signal
from meanfree.units import QuantityError
from meanfree.units.gate import quoted
from meanfree.units.reading import described

_DELIMITERS = {name: character for character, name in NAMES.items()}
_UNITLESS = ("fraction", "pure")


def readings_of(
    table: DataTable, key: str, case_file: Path, experiment: Experiment, findings: Findings
) -> Readings | None:
    """The readings of one table; what is wrong goes to ``findings``. None where something is."""
    before = len(findings.problems)
    signal = read_signal(table, f"{key}.signal", experiment, findings)
    path = file_beside(table.file, f"{key}.file", case_file, findings)
    axis = _axis(table, key, signal, findings)
    if signal is None or path is None or axis is None:
        return None
    column = _column(table.signal, f"{key}.signal", dimension_of(signal), findings)
    deviation = _deviation(table.sd, f"{key}.sd", column, signal, findings)
    layout = _layout(table, key, findings)
    if len(findings.problems) > before or column is None or deviation is None:
        return None
    zero = table.time.zero.value if table.time is not None and table.time.zero is not None else 0.0
    request = FileRequest(path, table.file, axis, column, signal, deviation, layout, zero)
    try:
        readings = read_file(request)
        if table.blank is not None:
            blank = _blank(table.blank, f"{key}.blank", request, case_file, findings)
            if blank is not None:
                readings = without_blank(readings, blank, table.blank.subtract)
    except InputError as error:
        findings.add(*error.problems)
        return None
    return None if len(findings.problems) > before else readings


def _layout(table: LayoutTable, key: str, findings: Findings) -> Layout:
    delimiter = "" if table.delimiter is None else _DELIMITERS[table.delimiter]
    decimal = "." if table.is_wrong("decimal") else table.decimal
    if delimiter == "," == decimal:
        findings.wrong(
            f"{key}.delimiter", "the comma, which is the decimal mark too", "another delimiter"
        )
    return Layout(delimiter, decimal, 0 if table.is_wrong("skip") else table.skip, table.heading)


def _axis(
    table: DataTable, key: str, signal: Signal | None, findings: Findings
) -> ColumnRequest | None:
    """The column of times, or of temperatures for rate constants."""
    rates = signal is not None and signal.is_rate_constant
    name, other = ("temperature", "time") if rates else ("time", "temperature")
    wanted = table.temperature if rates else table.time
    if signal is not None and table.has(other):
        findings.wrong(f"{key}.{other}", f"{other} of a {signal.words}", f"{name} = … in its place")
    if wanted is None:
        if signal is not None and not table.has(name):
            unit = "K" if rates else "min"
            expected = f'{name} = {{ column = "{name[0]}", unit = "{unit}" }}, say'
            findings.wrong(f"{key}.{name}", "nothing", expected)
        return None
    return _column(wanted, f"{key}.{name}", name, findings)


def _column(
    table: ColumnTable | None, key: str, dimension: str, findings: Findings
) -> ColumnRequest | None:
    """A column with a unit that measures ``dimension``."""
    if table is None:
        return None
    place = table.column
    number = isinstance(place, int) and not isinstance(place, bool) and place >= 1
    good = number or (isinstance(place, str) and bool(place.strip()))
    if not table.is_wrong("column") and not good:
        expected = "a name in the heading, or a number from 1"
        findings.wrong(f"{key}.column", described(place), expected)
    unit = table.unit or ""
    if not unit and dimension not in _UNITLESS and not table.is_wrong("unit"):
        findings.wrong(f"{key}.unit", "nothing", f"the unit of the column, of {_of(dimension)}")
        return None
    try:
        units.to_si(1.0, unit, dimension)
    except QuantityError:
        findings.wrong(f"{key}.unit", quoted(unit), f"a unit of {_of(dimension)}")
        return None
    return ColumnRequest(place, unit) if good else None


def _of(dimension: str) -> str:
    return units.phrase(dimension)


def _deviation(
    raw: Any, key: str, column: ColumnRequest | None, signal: Signal, findings: Findings
) -> Deviation | None:
    if raw is None or raw == "estimated":
        return Deviation()
    if isinstance(raw, dict):
        place = raw.get("column")
        if set(raw) != {"column"} or not isinstance(place, str | int) or isinstance(place, bool):
            findings.wrong(key, "a table", 'a table { column = "s" } and nothing else')
            return None
        return Deviation(column=ColumnRequest(place))
    dimension = dimension_of(signal)
    try:
        if dimension in _UNITLESS and not isinstance(raw, str):
            value = units.read_number(raw, "pure").value
        else:
            both = ("fraction",) if dimension in _UNITLESS else (dimension, "fraction")
            found = units.read_any(raw, both)
            if found.dimension == "fraction" and dimension not in _UNITLESS:
                return _positive(Deviation(share=found.value), found.value, raw, key, findings)
            # A deviation is a difference: without the zero of a scale.
            value = found.value / signal.per
    except QuantityError as error:
        findings.wrong(key, error.found, f'{error.expected}, "2 %", or {{ column = "s" }}')
        return None
    return _positive(Deviation(value=value), value, raw, key, findings)


def _positive(
    deviation: Deviation, value: float, raw: Any, key: str, findings: Findings
) -> Deviation | None:
    if value > 0:
        return deviation
    findings.wrong(key, described(raw), "a standard deviation above 0")
    return None


def _blank(
    table: BlankTable, key: str, run: FileRequest, case_file: Path, findings: Findings
) -> Readings | None:
    path = file_beside(table.file, f"{key}.file", case_file, findings)
    if run.signal.is_rate_constant:
        findings.wrong(key, "a blank of rate constants", "a blank of readings against time")
        return None
    axis, zero = run.axis, run.zero
    if table.time is not None:
        found = _column(table.time, f"{key}.time", "time", findings)
        if found is None:
            return None
        axis, zero = found, 0.0 if table.time.zero is None else table.time.zero.value
    place = run.signal_column.column if table.column is None else table.column
    if path is None:
        return None
    column = ColumnRequest(place, run.signal_column.unit)
    layout = _layout(table, key, findings)
    deviation = Deviation() if run.deviation.column is not None else run.deviation
    return read_file(
        FileRequest(path, table.file, axis, column, run.signal, deviation, layout, zero)
    )
