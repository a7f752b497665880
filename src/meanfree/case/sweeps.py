"""What a case, or the command line in its place, asks of `sweep`, as a campaign."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from typing import Any

from meanfree.campaigns.campaign import Campaign, part_size_for
from meanfree.case.findings import Findings
from meanfree.case.loaded import LoadedCase
from meanfree.case.meaning.observables import read_observables
from meanfree.case.meaning.sweep import design_of, read_sweep_table
from meanfree.errors import InputError
from meanfree.integrate.observables import Observable

MADE_OF = ("labels", "vessel", "temperature", "fill", "run", "gases", "steps", "samples", "flows")
"""Tables that make the experiment; title, data, fit, plan and the sweep itself do not."""


def campaign_of(case: LoadedCase, instead: Mapping[str, Any] | None = None) -> Campaign:
    """The campaign of a case. ``instead`` holds keys of ``[sweep]`` from the command line.

    Raises
    ------
    InputError
        Anything is wrong with the table or with the file it names: all problems in one go.
    """
    findings = Findings()
    raw = case.tables.get("sweep", {})
    if isinstance(raw, dict):
        raw = {**raw, **(instead or {})}
    table = read_sweep_table(raw, findings)
    design = None
    observables: tuple[Observable, ...] = ()
    if table is not None:
        design = design_of(table, case.experiment, case.path, findings)
        texts = None if table.is_wrong("observables") else table.observables
        observables = read_observables(texts, case.experiment, "sweep.observables", findings)
    if findings.problems or table is None or design is None:
        raise InputError(problem.inside(str(case.path)) for problem in findings.problems)
    size = part_size_for(design.count) if table.part is None else int(table.part.value)
    return Campaign(case.experiment, experiment_hash(case), design, observables, size)


def experiment_hash(case: LoadedCase) -> str:
    """SHA-256 of the tables that make the experiment, after ``--set``."""
    content = {key: case.tables[key] for key in MADE_OF if key in case.tables}
    text = json.dumps(content, ensure_ascii=False, default=str)
    return hashlib.sha256(text.encode()).hexdigest()
