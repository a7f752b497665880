"""``[run]``: how long, watching what, reported when, by which solver."""

from __future__ import annotations

from typing import Any

from meanfree.case.findings import Findings, did_you_mean, one_of
from meanfree.case.schema.base import AS_GIVEN, shape
from meanfree.case.schema.tables import RunTable, SolverTable
from meanfree.experiment.plan import RunPlan, Solver
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, read

MOST_TIMES = 1000


def read_run(raw: Any, findings: Findings) -> RunPlan | None:
    """How the run is carried out, None where something is wrong with it."""
    if raw is None:
        return RunPlan()
    before = len(findings.problems)
    table = shape(RunTable, raw, "run", findings)
    if table is None:
        return None
    until = _until(table.until, findings)
    if len(table.report_at or ()) > MOST_TIMES:
        expected = f"at most {MOST_TIMES}; profiles.csv has 200 times of its own"
        findings.wrong("run.report_at", f"{len(table.report_at)} times", expected)
        return None
    for place, time in enumerate(table.report_at or ()):
        if time.value <= 0:
            findings.wrong(f"run.report_at.{place}", "a time of 0", "times above 0 s")
        elif until is not None and time.value > until.value:
            expected = "times up to the end of the run"
            findings.wrong(
                f"run.report_at.{place}", f"a time after until ({time.value:g} s)", expected
            )
    if len(findings.problems) > before:
        return None
    return RunPlan(until, table.watch, tuple(table.report_at), _solver(table.solver))


def _until(raw: Any, findings: Findings) -> Sourced | None:
    if raw is None or raw == "auto":
        return None
    try:
        until = read(raw, "time", AS_GIVEN)
    except QuantityError as error:
        findings.wrong("run.until", error.found, f'"auto", or {error.expected}')
        return None
    if until.value <= 0:
        findings.wrong("run.until", "a time of 0", '"auto", or a time above 0 s')
    return until


def _solver(table: SolverTable | None) -> Solver:
    if table is None:
        return Solver()
    return Solver(table.method, table.rtol.value, table.atol.value)


def check_watch(
    plan: RunPlan, filled: dict[str, float] | None, consumed: set[str], findings: Findings
) -> None:
    """The watched gas must be filled and used up by some step."""
    if plan.watch is None:
        return
    candidates = [gas for gas in consumed if filled is None or filled.get(gas, 0.0) > 0]
    if plan.watch not in candidates:
        expected = one_of(sorted(candidates)) if candidates else "a gas that is filled and reacts"
        found = f'"{plan.watch}", which is not both filled and used up'
        findings.wrong("run.watch", found, expected + did_you_mean(plan.watch, candidates))
