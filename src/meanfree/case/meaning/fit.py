"""``[fit]``: the addresses, bounds and priors of what shall be found, in the file's units."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from typing import Any

from meanfree.case.addresses import number_at
from meanfree.case.findings import Findings, one_of
from meanfree.case.schema.fit import FitTable, PriorTable
from meanfree.errors import InputError
from meanfree.experiment.inputs import Input, inputs
from meanfree.measured.parameters import (
    SIGNAL_OFFSET,
    TIME_OFFSET,
    Asked,
    Prior,
    owner_of,
    parameters_of,
)
from meanfree.measured.runs import MeasuredRun
from meanfree.sourced import Sourced
from meanfree.units.gate import quoted
from meanfree.units.reading import described


def asked_for(
    table: FitTable, runs: Sequence[MeasuredRun], findings: Findings
) -> tuple[Asked, ...]:
    """The parameters of the table; what is wrong goes to ``findings``."""
    asked: list[Asked] = []
    before = len(findings.problems)
    for address in table.parameters or ():
        known = _known(address, runs)
        low, high = _bounds(table, address, known, findings)
        prior = _prior(table, address, known, findings)
        asked.append(Asked(address, low, high, prior))
    for key in ("bounds", "priors"):
        for address in getattr(table, key) or ():
            if address not in (table.parameters or ()):
                expected = one_of(table.parameters) if table.parameters else "parameters = […] too"
                findings.wrong(f"fit.{key}.{address}", "no parameter of the fit", expected)
    if runs and len(findings.problems) == before:
        try:
            parameters_of(runs, asked)
        except InputError as error:
            findings.add(*error.problems)
    return tuple(asked)


def _known(address: str, runs: Sequence[MeasuredRun]) -> Input | None:
    """The number at an address, also where it is that of one run; offsets in the run's unit."""
    if not runs:
        return None
    owner, key = owner_of(runs, address)
    if not isinstance(owner, tuple) or not owner:
        return None
    run = runs[owner[0]]
    if key in (TIME_OFFSET, SIGNAL_OFFSET):
        time = key == TIME_OFFSET
        unit = run.readings.time_unit if time else run.readings.unit
        dimension = "time" if time else run.readings.dimension
        quantity = Sourced(0.0, unit, "", dimension)
        return Input(key, 0.0, unit, "", -float("inf"), float("inf"), quantity)
    return inputs(run.experiment).get(key)


def _bounds(
    table: FitTable, address: str, known: Input | None, findings: Findings
) -> tuple[float | None, float | None]:
    raw = (table.bounds or {}).get(address)
    if raw is None:
        return None, None
    key = f"fit.bounds.{address}"
    if not isinstance(raw, list) or len(raw) != 2:
        findings.wrong(key, described(raw), "a list of two: the lowest and the highest value")
        return None, None
    if known is None:
        return None, None
    low, high = (_number(known, text, f"{key}.{i}", findings) for i, text in enumerate(raw))
    if low is not None and high is not None and not low < high:
        findings.wrong(key, f"{low:g} and {high:g}", "a lowest value below the highest")
    return low, high


def _prior(table: FitTable, address: str, known: Input | None, findings: Findings) -> Prior | None:
    prior: PriorTable | None = (table.priors or {}).get(address)
    if prior is None:
        return None
    key = f"fit.priors.{address}"
    if (prior.sd is None) == (prior.factor is None):
        found = "both" if prior.sd is not None else "neither"
        findings.wrong(key, f"{found} of sd and factor", "one of them")
        return None
    if known is None:
        return None
    value = _number(known, prior.value, f"{key}.value", findings)
    if value is None:
        return None
    if prior.factor is not None:
        return Prior(value, 0.5 * value * (prior.factor.value - 1 / prior.factor.value))
    sd = _number(known, prior.sd, f"{key}.sd", findings)
    if sd is None or sd > 0:
        return None if sd is None else Prior(value, sd)
    findings.wrong(f"{key}.sd", described(prior.sd), "a standard deviation above 0")
    return None


def _number(known: Input, text: Any, key: str, findings: Findings) -> float | None:
    try:
        return number_at(known, text, key)
    except InputError as error:
        findings.add(*error.problems)
        return None


def flattened(conditions: Mapping[str, Any], key: str, findings: Findings) -> dict[str, str]:
    """Conditions as address to text: dotted keys in quotes and nested tables mean the same.

    A table at a dotted key in quotes (``"vessel.shape" = { … }``) takes the place of the whole one.
    """
    found: dict[str, str] = {}

    def walk(node: Mapping[str, Any], head: str) -> None:
        for name, value in node.items():
            address = f"{head}.{name}" if head else name
            if isinstance(value, Mapping) and "." in name:
                found[address] = _inline(value)
            elif isinstance(value, Mapping):
                walk(value, address)
            elif isinstance(value, str):
                found[address] = value
            elif isinstance(value, int | float) and not isinstance(value, bool):
                found[address] = repr(value)
            else:
                findings.wrong(f"{key}.{address}", described(value), 'a value such as "500 K"')
            if not name.strip():
                findings.wrong(key, quoted(name), "an address such as temperature.value")

    walk(conditions, "")
    return found


def _inline(value: Any) -> str:
    """A value as TOML on one line."""
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{json.dumps(k)} = {_inline(v)}" for k, v in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_inline(entry) for entry in value) + "]"
    return json.dumps(value, ensure_ascii=False, default=str)
