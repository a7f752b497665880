"""From a case file to an Experiment: shape first, then meaning, and every problem in one go."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from meanfree.case import settings as changes
from meanfree.case.findings import Findings
from meanfree.case.loaded import LoadedCase
from meanfree.case.meaning import together
from meanfree.case.meaning.beside import look_at_files
from meanfree.case.meaning.fill import check_sum, read_fill
from meanfree.case.meaning.flows import check_flows, gases_in, read_flows
from meanfree.case.meaning.gases import (
    find_gases,
    read_gas_tables,
    read_labels,
    refuse_unused,
)
from meanfree.case.meaning.plan import plan_request, read_plan
from meanfree.case.meaning.run import check_watch, read_run
from meanfree.case.meaning.samples import read_samples
from meanfree.case.meaning.steps import Written, read_step, read_written
from meanfree.case.meaning.temperature import read_temperature
from meanfree.case.meaning.vessel import read_vessel
from meanfree.case.schema.base import shape
from meanfree.case.schema.data import DataTable
from meanfree.case.schema.fit import FitTable
from meanfree.case.schema.sweep import SweepTable
from meanfree.case.schema.tables import CaseTable, GasTable
from meanfree.case.text import parse, read_text
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill
from meanfree.experiment.flows import Flow
from meanfree.experiment.mechanism import Step
from meanfree.experiment.plan import RunPlan
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Temperature
from meanfree.experiment.vessel import Vessel
from meanfree.gases.gas import Gas
from meanfree.planning.request import PlanRequest
from meanfree.units.reading import described


def load_case(
    path: str | Path, settings: Mapping[str, str] | None = None, *, files: bool = False
) -> LoadedCase:
    """Read a case file.

    ``settings`` maps addresses (``steps.decomposition.Ea``) to the text of another value; they are
    put into the parsed file before anything is checked. ``files``: what ``[[data]]``, ``[fit]`` and
    ``[sweep]`` ask for, and the files that they name, are read as well, and left again.

    Raises
    ------
    InputError
        The file cannot be read, or anything in it is wrong: all problems at once, each with
        the file, the key, what was found and what would be right.
    """
    file, settings = Path(path), dict(settings or {})
    try:
        text = read_text(file)
        findings = Findings()
        tables = changes.apply(parse(text), settings, findings)
        _mend_labels(tables, findings)
        experiment = read_experiment(tables, findings)
        data = _data(tables.get("data"), findings)
        if tables.get("fit") is not None:
            shape(FitTable, tables["fit"], "fit", findings)
        if tables.get("sweep") is not None:
            shape(SweepTable, tables["sweep"], "sweep", findings)
        plan = read_plan(tables.get("plan"), findings)
        planning = PlanRequest() if experiment is None else plan_request(plan, experiment, findings)
        case = None
        if experiment is not None:
            case = LoadedCase(file, text, tables, experiment, settings, data, planning)
        if files:
            _look_further(case, tables, file, findings)
        if findings.problems or case is None:
            raise InputError(_with_settings(findings.problems, settings))
    except InputError as error:
        raise InputError(problem.inside(str(path)) for problem in error.problems) from None
    return case


def _look_further(
    case: LoadedCase | None, tables: dict[str, Any], file: Path, findings: Findings
) -> None:
    """What `fit` and `sweep` would find wrong; of a wrong case only whether its files are there."""
    if case is None or findings.problems:
        look_at_files(tables, file, findings)
        return
    if tables.get("data") or tables.get("fit") is not None:
        from meanfree.case.readings import asked_of

        asked_of(case, findings, needed=tables.get("fit") is not None)
    if tables.get("sweep") is not None:
        from meanfree.case.meaning.sweep import design_of, read_sweep_table

        # What is to be observed is left to `sweep`: it needs the integrator's libraries.
        table = read_sweep_table(tables["sweep"], findings)
        if table is not None:
            design_of(table, case.experiment, file, findings)


@dataclass
class _Parts:
    """The tables once read; None where something is wrong with one."""

    vessel: Vessel | None
    temperature: Temperature | None
    fill: Fill | None
    plan: RunPlan | None
    written: list[Written]
    gases: dict[str, Gas | None]
    tables: dict[str, GasTable]


@dataclass(frozen=True)
class Exchanged:
    """What passes between the vessel and the world outside while it runs."""

    samples: tuple[Sample, ...]
    flows: tuple[Flow, ...]


def read_experiment(tables: dict[str, Any], findings: Findings) -> Experiment | None:
    """The experiment of parsed tables; what is wrong goes to ``findings``."""
    top = shape(CaseTable, tables, "", findings)
    assert top is not None
    labels = read_labels(None if top.is_wrong("labels") else tables.get("labels"), findings)
    parts = _Parts(
        vessel=read_vessel(tables.get("vessel"), findings),
        temperature=read_temperature(tables.get("temperature"), findings),
        fill=read_fill(tables.get("fill"), findings),
        plan=read_run(tables.get("run"), findings),
        tables=read_gas_tables(tables.get("gases"), findings),
        written=read_written(tables.get("steps"), findings),
        gases={},
    )
    names = _names(parts, tables)
    parts.gases = find_gases(names, labels, parts.tables, findings)
    if all(step.reaction is not None for step in parts.written):
        refuse_unused(names, labels, parts.tables, findings)
    together.check_dead_space(parts.vessel, parts.temperature, findings)
    steps = [
        read_step(written, parts.gases, parts.temperature, findings) for written in parts.written
    ]
    reversible = {
        step.table.name: [gas for gas, n in step.reaction.net.items() if n != 0]
        for step in parts.written
        if step.raw_reverse == "thermochemistry" and step.reaction is not None
    }
    parts.gases = together.gases_with_energies(
        parts.gases, parts.tables, reversible, parts.temperature, findings
    )
    _check_fill_and_watch(parts, findings)
    samples = read_samples(tables.get("samples"), parts.vessel, findings)
    flows = read_flows(tables.get("flows"), parts.gases, findings)
    found = [step for step in steps if step is not None]
    return _joined(top, parts, found, Exchanged(samples, flows), findings)


def _names(parts: _Parts, tables: dict[str, Any]) -> list[str]:
    """Every readable gas name of fill and steps, in the order of the case file."""
    from meanfree.case.meaning.names import gas_name_problem

    fill = tables.get("fill")
    filled = fill.get("gases") if isinstance(fill, dict) else None
    names = list(filled) if isinstance(filled, dict) else []
    for step in parts.written:
        names.extend(step.reaction.gases if step.reaction is not None else ())
    names.extend(gases_in(tables.get("flows")))
    return [name for name in dict.fromkeys(names) if gas_name_problem(name) is None]


def _check_fill_and_watch(parts: _Parts, findings: Findings) -> None:
    filled = None
    if parts.fill is not None and parts.vessel is not None and parts.temperature is not None:
        initial = parts.temperature.initial
        check_sum(parts.fill, parts.vessel, initial, findings)
        filled = parts.fill.moles(parts.vessel, initial)
    consumed = {
        gas
        for step in parts.written
        if step.reaction is not None
        for gas, net in step.reaction.net.items()
        if net < 0
    }
    if parts.plan is not None and all(step.reaction is not None for step in parts.written):
        check_watch(parts.plan, filled, consumed, findings)


def _joined(
    top: CaseTable,
    parts: _Parts,
    steps: list[Step],
    exchanged: Exchanged,
    findings: Findings,
) -> Experiment | None:
    """The experiment, and the checks that need all of it.

    Where something is wrong already, what the laws say is found all the same, as far as they do not
    depend on it: all problems in one go.
    """
    gases = tuple(gas for gas in parts.gases.values() if gas is not None)
    if parts.temperature is None or len(gases) < len(parts.gases):
        return None
    experiment = Experiment(
        title=top.title,
        gases=gases,
        steps=tuple(steps),
        vessel=parts.vessel or together.ANY_VESSEL,
        temperature=parts.temperature,
        fill=parts.fill or Fill({}),
        plan=parts.plan or RunPlan(),
        purpose=top.purpose,
        samples=exchanged.samples,
        flows=exchanged.flows,
    )
    if findings.problems:
        known = parts.vessel is not None and parts.fill is not None
        together.check_laws(experiment, findings, surroundings_known=known)
        return None
    together.check_piston(experiment, findings)
    together.check_amounts(experiment, findings)
    together.check_laws(experiment, findings)
    check_flows(experiment, findings)
    if findings.problems:
        return None
    together.check_rates(experiment, findings)
    named = {gas.name: gas for gas in gases}
    together.check_given_enthalpies(experiment, findings)
    together.check_cycles(steps, named, experiment.temperature, findings)
    if findings.problems:
        return None
    from dataclasses import replace

    return replace(experiment, notes=tuple(findings.notes))


def _data(raw: Any, findings: Findings) -> tuple[Mapping[str, Any], ...]:
    """The ``[[data]]`` tables as they stand."""
    if raw is None:
        return ()
    if not isinstance(raw, list) or not all(isinstance(table, dict) for table in raw):
        findings.wrong("data", described(raw), "tables headed [[data]], with two brackets")
        return ()
    for place, table in enumerate(raw):
        shape(DataTable, table, f"data.{place}", findings)
    return tuple(raw)


def _mend_labels(tables: dict[str, Any], findings: Findings) -> None:
    """`labels` after a table header silently belongs to that table: say so, and read on."""
    if "labels" in tables:
        return
    for where, table in _all_tables(tables, ""):
        if isinstance(table.get("labels"), list):
            findings.wrong(
                f"{where}.labels",
                "labels after a table header, which makes them part of that table",
                "labels at the top of the file, before the first [table]",
            )
            tables["labels"] = table.pop("labels")
            return


def _all_tables(node: Any, where: str) -> list[tuple[str, dict[str, Any]]]:
    found: list[tuple[str, dict[str, Any]]] = []
    pending = [(where, node)]
    while pending:
        place, value = pending.pop()
        if isinstance(value, dict):
            if place:
                found.append((place, value))
            pending.extend((f"{place}.{key}" if place else key, v) for key, v in value.items())
        elif isinstance(value, list):
            pending.extend((f"{place}.{i}", v) for i, v in enumerate(value))
    return found


def _with_settings(problems: list[Problem], settings: Mapping[str, str]) -> list[Problem]:
    """Problems at an address that ``--set`` changed say so."""
    return [
        Problem(p.key, f"{p.found} (from --set)", p.expected, p.file) if p.key in settings else p
        for p in problems
    ]
