"""The measured runs of a case and the parameters asked for: what `check` reads as well as `fit`.

Apart from `measurements`, because reading needs none of the libraries that a fit computes with.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from meanfree.case import settings as changes
from meanfree.case.findings import Findings
from meanfree.case.loaded import LoadedCase
from meanfree.case.loader import read_experiment
from meanfree.case.meaning.data import readings_of
from meanfree.case.meaning.fit import asked_for, flattened
from meanfree.case.schema.base import shape
from meanfree.case.schema.data import DataTable
from meanfree.case.schema.fit import FitTable
from meanfree.errors import Problem
from meanfree.experiment.experiment import Experiment
from meanfree.measured.parameters import Asked
from meanfree.measured.runs import MeasuredRun


def asked_of(
    case: LoadedCase, findings: Findings, *, needed: bool
) -> tuple[tuple[MeasuredRun, ...], FitTable, tuple[Asked, ...]]:
    """The runs with their readings, the table ``[fit]``, and its parameters.

    ``needed``: without any data that is an error. What is wrong goes to ``findings``.
    """
    if needed and not case.tables.get("data"):
        findings.wrong("data", "nothing", "tables headed [[data]], each with a file of readings")
    runs = _runs(case, findings)
    table = _fit_table(case.tables.get("fit"), findings)
    return runs, table, asked_for(table, runs, findings)


def _fit_table(raw: Any, findings: Findings) -> FitTable:
    found = None if raw is None else shape(FitTable, raw, "fit", findings)
    return FitTable.model_validate({}) if found is None else found


def _runs(case: LoadedCase, findings: Findings) -> tuple[MeasuredRun, ...]:
    runs: list[MeasuredRun] = []
    names: dict[str, int] = {}
    for place, raw in enumerate(case.tables.get("data") or ()):
        key = f"data.{place}"
        table = shape(DataTable, raw, key, findings)
        if table is None:
            continue
        name = table.name or (Path(table.file).stem if table.file else key)
        if name in names:
            expected = f'another name than data.{names[name]}: name = "…"'
            findings.wrong(f"{key}.name", f'"{name}" a second time', expected)
        names[name] = place
        conditions = flattened(table.conditions or {}, f"{key}.conditions", findings)
        experiment = _with_conditions(case, conditions, f"{key}.conditions", findings)
        if experiment is None:
            continue
        readings = readings_of(table, key, case.path, experiment, findings)
        if readings is not None:
            runs.append(MeasuredRun(name, experiment, readings, conditions))
    return tuple(runs)


def _with_conditions(
    case: LoadedCase, conditions: Mapping[str, str], key: str, findings: Findings
) -> Experiment | None:
    """The experiment of one run, read like a case of its own."""
    if not conditions:
        return case.experiment
    own = Findings()
    tables = changes.apply(dict(case.tables), conditions, own)
    experiment = None if own.problems else read_experiment(tables, own)
    for problem in own.problems:
        where = problem.key if problem.key != "--set" else ""
        address = f"{key}.{where}" if where else key
        findings.add(Problem(address, problem.found, problem.expected, problem.file))
    return None if own.problems else experiment
