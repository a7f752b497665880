"""``[sweep]``: which conditions are run and what is asked, held against the experiment."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, Literal

import numpy as np

from meanfree.campaigns.designs import (
    MOST,
    Design,
    Floats,
    Grid,
    Listed,
    QuasiRandom,
    Spacing,
    Spread,
    spaced,
)
from meanfree.case.addresses import dimension_at, file_unit_span, number_at
from meanfree.case.findings import Findings
from meanfree.case.meaning.conditions import read_conditions
from meanfree.case.meaning.plan import one_of_addresses
from meanfree.case.schema.base import shape
from meanfree.case.schema.sweep import SweepTable, VaryTable
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs, with_inputs
from meanfree.units import QuantityError, read
from meanfree.units.reading import described

DEFAULT_POINTS = 11
DEFAULT_SAMPLES = 1024
MOST_ADDRESSES = 1000
Kind = Literal["grid", "list", "quasi-random"]


def read_sweep_table(raw: Any, findings: Findings) -> SweepTable | None:
    """The table as it stands, with each entry of ``vary`` read apart."""
    table = shape(SweepTable, raw, "sweep", findings)
    if table is None or not isinstance(raw, dict):
        return None
    vary = raw.get("vary")
    if table.is_wrong("vary") and isinstance(vary, dict):
        # read one by one, so that a mistake in one does not hide those in the others
        entries = {a: shape(VaryTable, v, f"sweep.vary.{a}", findings) for a, v in vary.items()}
        table.vary = {address: entry for address, entry in entries.items() if entry is not None}
    return table


def design_of(
    table: SweepTable, experiment: Experiment, case_file: Path, findings: Findings
) -> Design | None:
    """The design that the table asks for; what is wrong goes to ``findings``."""
    before = len(findings.problems)
    known = inputs(experiment)
    kind = _kind(table, findings)
    if kind is None:
        return None
    if kind == "list":
        assert table.file is not None
        listed = read_conditions(table.file, case_file, known, "sweep.file", findings)
        return _within_bounds(listed, experiment, table.file, findings) if listed else None
    values: dict[str, Floats] = {}
    spreads: dict[str, Spread] = {}
    for address, entry in (table.vary or {}).items():
        key = f"sweep.vary.{address}"
        if address not in known:
            findings.wrong(key, "an unknown address", one_of_addresses(address, known))
        elif kind == "grid":
            levels = _levels(entry, known[address], key, findings)
            if levels is not None:
                values[address] = levels
                _refuse_impossible(experiment, {address: levels}, key, findings)
        else:
            spread = _spread(entry, known[address], key, findings)
            if spread is not None:
                spreads[address] = spread
                if spread.spacing != "normal":
                    ends = np.array([spread.first, spread.second])
                    _refuse_impossible(experiment, {address: ends}, key, findings)
    if len(findings.problems) > before:
        return None
    if kind == "grid":
        grid = Grid(values)
        if grid.count > MOST:
            findings.wrong("sweep.vary", f"{grid.count} conditions", f"at most {MOST}")
            return None
        return grid
    return QuasiRandom(spreads, _exponent(table), int(table.seed.value))


def _kind(table: SweepTable, findings: Findings) -> Kind | None:
    """Which design is meant, and what does not go with it."""
    kind: Kind = table.design or (
        "list" if table.file else "quasi-random" if table.samples is not None else "grid"
    )
    unfit = {"grid": ("samples", "file"), "list": ("samples", "vary"), "quasi-random": ("file",)}
    for name in unfit[kind]:
        if getattr(table, name):
            expected = f"another design, or no {name}"
            findings.wrong(f"sweep.{name}", f"{name} beside a {kind}", expected)
    if kind == "list" and not table.file:
        findings.wrong("sweep.file", "nothing", 'file = "conditions.csv"')
        return None
    if kind != "list" and not table.vary and not table.is_wrong("vary"):
        expected = 'such as "temperature.value" = { between = ["400 K", "600 K"] }'
        findings.wrong("sweep.vary", "nothing", expected)
        return None
    if kind != "list" and len(table.vary or {}) > MOST_ADDRESSES:
        findings.wrong("sweep.vary", f"{len(table.vary)}", f"at most {MOST_ADDRESSES} addresses")
        return None
    for name in ("samples", "seed", "part"):
        number = getattr(table, name)
        if number is not None and number.value != int(number.value):
            findings.wrong(f"sweep.{name}", f"{number.value:g}", "a whole number")
    count = None if table.samples is None else int(table.samples.value)
    if kind == "quasi-random" and count is not None and count & (count - 1):
        near = f"{2 ** (count.bit_length() - 1)} or {2 ** count.bit_length()}"
        findings.wrong("sweep.samples", f"{count}", f"a power of two, such as {near}")
    return kind


def _exponent(table: SweepTable) -> int:
    count = DEFAULT_SAMPLES if table.samples is None else int(table.samples.value)
    return count.bit_length() - 1


def _levels(entry: VaryTable, at: Input, key: str, findings: Findings) -> Floats | None:
    """Values of one address of a grid."""
    if (entry.mean, entry.sd) != (None, None) or entry.spacing == "normal":
        expected = 'values, between, or design = "quasi-random"'
        findings.wrong(key, "a normal spread in a grid", expected)
        return None
    if (entry.values is None) == (entry.between is None):
        if not (entry.is_wrong("values") or entry.is_wrong("between")):
            found = "neither values nor between" if entry.values is None else "both"
            findings.wrong(key, found, "values or between")
        return None
    if entry.values is not None:
        if entry.points is not None or entry.spacing is not None:
            findings.wrong(key, "points or spacing beside values", "values alone, or between")
        levels = [_number(v, at, f"{key}.values.{i}", findings) for i, v in enumerate(entry.values)]
        if not levels:
            findings.wrong(f"{key}.values", "an empty list", "at least one value")
        numbers = [level for level in levels if level is not None]
        if len(set(numbers)) < len(numbers):
            findings.wrong(f"{key}.values", "the same value twice", "each once")
        return np.array(numbers) if numbers and len(numbers) == len(levels) else None
    span = _span(entry, at, key, findings)
    points = DEFAULT_POINTS if entry.points is None else int(entry.points.value)
    if entry.points is not None and entry.points.value != points:
        findings.wrong(f"{key}.points", f"{entry.points.value:g}", "a whole number")
    if span is None:
        return None
    return spaced(*span, points, entry.spacing or "linear")


def _spread(entry: VaryTable, at: Input, key: str, findings: Findings) -> Spread | None:
    """How one address is spread in a quasi-random design."""
    if entry.values is not None or entry.points is not None:
        expected = "between, or a mean and an sd"
        findings.wrong(key, "values or points in a quasi-random design", expected)
        return None
    normal = entry.spacing == "normal" or entry.sd is not None or entry.mean is not None
    if not normal:
        span = _span(entry, at, key, findings)
        return None if span is None else Spread(entry.spacing or "linear", *span)
    if entry.between is not None or entry.spacing not in (None, "normal") or entry.sd is None:
        found = "a normal spread with a range or without sd"
        findings.wrong(key, found, "sd, and mean if you like")
        return None
    mean = at.value if entry.mean is None else _number(entry.mean, at, f"{key}.mean", findings)
    sd = _difference(entry.sd, at, f"{key}.sd", findings)
    if mean is None or sd is None:
        return None
    return Spread("normal", mean, sd)


def _span(entry: VaryTable, at: Input, key: str, findings: Findings) -> tuple[float, float] | None:
    if entry.between is None or len(entry.between) != 2:
        if not entry.is_wrong("between"):
            found = "nothing" if entry.between is None else f"{len(entry.between)} values"
            findings.wrong(f"{key}.between", found, 'two values, such as ["400 K", "600 K"]')
        return None
    ends = [_number(v, at, f"{key}.between.{i}", findings) for i, v in enumerate(entry.between)]
    low, high = ends
    if low is None or high is None:
        return None
    spacing: Spacing = entry.spacing or "linear"
    if not low < high:
        findings.wrong(f"{key}.between", f"{low:g} to {high:g}", "the lower value first")
        return None
    if spacing == "log" and low <= 0:
        findings.wrong(f"{key}.between", f'{low:g} with spacing = "log"', "values above 0")
        return None
    return low, high


def _number(raw: Any, at: Input, key: str, findings: Findings) -> float | None:
    """A value at an address, in the unit of the case."""
    try:
        return number_at(at, raw, key)
    except InputError as error:
        findings.add(*error.problems)
        return None


def _difference(raw: Any, at: Input, key: str, findings: Findings) -> float | None:
    """A standard deviation at an address, in the unit of the case."""
    dimension = dimension_at(at)
    if dimension in ("pure", "fraction", "equilibrium constant"):
        size = _number(raw, at, key, findings)
    else:
        word = "temperature difference" if dimension == "temperature" else dimension
        try:
            size = read(raw, word).value / file_unit_span(at)
        except QuantityError as error:
            findings.refused(key, error)
            return None
    if size is not None and size <= 0:
        findings.wrong(key, described(raw), "a standard deviation above 0")
        return None
    return size


def _refuse_impossible(
    experiment: Experiment, columns: Mapping[str, Floats], key: str, findings: Findings
) -> None:
    """Bounds are intervals: the least and the largest value speak for all."""
    for pick in (np.min, np.max):
        try:
            with_inputs(experiment, {a: float(pick(column)) for a, column in columns.items()})
        except InputError as error:
            for problem in error.problems:
                findings.wrong(key, problem.found, problem.expected)


def _within_bounds(
    listed: Listed, experiment: Experiment, name: str, findings: Findings
) -> Design | None:
    before = len(findings.problems)
    for address, column in listed.columns.items():
        where = f"sweep.file: {name}, column {address}"
        _refuse_impossible(experiment, {address: column}, where, findings)
    return listed if len(findings.problems) == before else None
