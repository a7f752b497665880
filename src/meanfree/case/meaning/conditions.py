"""Conditions of a sweep out of a file: one row a condition, headed by addresses with units."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from meanfree import units
from meanfree.campaigns.designs import Floats, Listed
from meanfree.case.addresses import dimension_at
from meanfree.case.findings import Findings
from meanfree.case.meaning.beside import file_beside
from meanfree.case.meaning.plan import one_of_addresses
from meanfree.errors import Problem
from meanfree.experiment.inputs import Input
from meanfree.measured.delimited import Layout, cells_of, column, content_of, decoded
from meanfree.units import QuantityError
from meanfree.units.gate import quoted

_HEADING = re.compile(r"(.+?)\s*(?:\[(.+)\]|\((.+)\))")
_LAYOUT = Layout(delimiter=",", heading=1)


def read_conditions(
    name: str, case_file: Path, known: Mapping[str, Input], key: str, findings: Findings
) -> Listed | None:
    """The conditions in a file; what is wrong goes to ``findings``, with line and column."""
    path = file_beside(name, key, case_file, findings, "conditions.csv")
    if path is None:
        return None
    content = content_of(path)
    text = content if isinstance(content, Problem) else decoded(content)
    cells = text if not isinstance(text, str) else cells_of(text, _LAYOUT, [])
    if isinstance(cells, Problem):
        findings.wrong(f"{key}: {name}", cells.found, cells.expected)
        return None
    before = len(findings.problems)
    columns: dict[str, Floats] = {}
    for heading in cells.heading:
        address, scale = _headed(heading, known, f"{key}: {name}", findings)
        values, problems = column(cells, heading, _LAYOUT, f"{key}: {name}")
        for problem in problems:
            findings.wrong(f"{key}: {name}, {problem.key}", problem.found, problem.expected)
        if not address or values is None or problems:
            continue
        if address in columns:
            findings.wrong(f"{key}: {name}", f"{quoted(address)} a second time", "each once")
        columns[address] = scale(np.array(values.values))
    return Listed(columns, name) if len(findings.problems) == before else None


def _headed(
    heading: str, known: Mapping[str, Input], key: str, findings: Findings
) -> tuple[str, Any]:
    """The address of a column, and how its numbers become those of the case."""
    match = _HEADING.fullmatch(heading)
    address, unit = (match[1], match[2] or match[3]) if match else (heading, "")
    if address not in known:
        findings.wrong(key, f"a column headed {quoted(heading)}", one_of_addresses(address, known))
        return "", None
    at = known[address]
    dimension = dimension_at(at)
    if dimension in ("pure", "fraction", "equilibrium constant") and not unit:
        return address, lambda values: values
    try:
        there: Any = units.read(f"1 {unit}", dimension).unit
        units.from_si(1.0, at.unit, dimension)
    except QuantityError as error:
        bare = f'the unit of the column too, such as "{address} [{at.unit}]"'
        expected = error.expected if unit else bare
        findings.wrong(key, f"a column headed {quoted(heading)}", expected)
        return "", None

    def scaled(values: Any) -> Floats:
        if there == at.unit:
            return np.asarray(values, float)
        return np.asarray(
            units.from_si(units.to_si(values, there, dimension), at.unit, dimension), float
        )

    return address, scaled
