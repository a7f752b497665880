"""``[plan]``: what planning asks for, each number held against the experiment it is about."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from typing import Any, cast

from meanfree.case.addresses import dimension_at, file_unit_span
from meanfree.case.findings import Findings, did_you_mean, one_of
from meanfree.case.meaning.fill import MEASURES
from meanfree.case.schema.base import AS_GIVEN, shape
from meanfree.case.schema.plan import PlanTable, SamplesTable
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Kind, Portion
from meanfree.experiment.inputs import Input, inputs
from meanfree.planning.request import PlanRequest, Sampling, Tolerance
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, read, read_any, read_number
from meanfree.units.reading import described

_FACTOR = re.compile(r"factor\s+([0-9.eE+-]+)\s*")
_CLOCK = re.compile(r"([01]?\d|2[0-3]):([0-5]\d)")
_SIGNAL = re.compile(r"(total pressure|(?:concentration|partial pressure) of (\S+))")


Tables = tuple[PlanTable | None, SamplesTable | None]


def read_plan(raw: Any, findings: Findings) -> Tables:
    """The table as it stands, and that of the samples; None where there is none.

    They are read apart, so that a mistake in one does not hide those in the other.
    """
    if not isinstance(raw, dict):
        return (None if raw is None else shape(PlanTable, raw, "plan", findings)), None
    rest = {key: value for key, value in raw.items() if key != "samples"}
    samples = None
    if "samples" in raw:
        samples = shape(SamplesTable, raw["samples"], "plan.samples", findings)
    return shape(PlanTable, rest, "plan", findings), samples


def plan_request(tables: Tables, experiment: Experiment, findings: Findings) -> PlanRequest:
    """What the tables ask of this experiment; what is wrong goes to ``findings``."""
    table, samples = tables
    if table is None:
        return PlanRequest()
    known = inputs(experiment)
    for key in ("warm_up", "patience"):
        value = getattr(table, key)
        if value is not None and value.value <= 0:
            findings.wrong(f"plan.{key}", "a time of 0", "a time above 0 s")
    if table.conductance is not None and table.conductance.value <= 0:
        findings.wrong("plan.conductance", "a conductance of 0", "one above 0 W/K")
    tolerances = tuple(
        tolerance
        for address, text in (table.tolerances or {}).items()
        if (tolerance := _tolerance(address, text, known, findings)) is not None
    )
    return PlanRequest(
        warm_up=table.warm_up,
        patience=table.patience,
        detection=_detection(table.detection or {}, experiment, findings),
        narrowest=table.narrowest,
        conductance=table.conductance,
        tolerances=tolerances,
        correlations=_correlations(table.correlations or [], tolerances, findings),
        samples=_samples(samples, experiment, known, findings),
    )


def _detection(
    raw: Mapping[str, Any], experiment: Experiment, findings: Findings
) -> dict[str, Portion]:
    found: dict[str, Portion] = {}
    for gas, value in raw.items():
        key = f"plan.detection.{gas}"
        if gas not in experiment.gas_named:
            expected = f"a gas of the case{did_you_mean(gas, experiment.gas_named)}"
            findings.wrong(key, f'"{gas}"', expected)
            continue
        try:
            quantity = (
                read_any(value, (*MEASURES, "fraction"), AS_GIVEN)
                if isinstance(value, str)
                else read_number(value, "fraction", AS_GIVEN)
            )
        except QuantityError as error:
            findings.refused(key, error)
            continue
        if quantity.value <= 0:
            findings.wrong(key, "a detection limit of 0", "one above 0")
            continue
        found[gas] = Portion(quantity, cast(Kind, quantity.dimension))
    return found


def _tolerance(
    address: str, raw: Any, known: Mapping[str, Input], findings: Findings
) -> Tolerance | None:
    """ "factor 1.5" and "1 %" of the logarithm, "2 K" of the number itself."""
    key = f"plan.tolerances.{address}"
    if address not in known:
        findings.wrong(key, "an unknown address", one_of_addresses(address, known))
        return None
    at = known[address]
    text = raw.strip() if isinstance(raw, str) else raw
    try:
        factor = _FACTOR.fullmatch(text) if isinstance(text, str) else None
        if factor is not None:
            size, spread = math.log(_above_one(factor[1])), "factor"
        elif isinstance(text, str) and text.endswith(("%", "‰", "ppm")):
            size, spread = read(text, "fraction").value, "factor"
        else:
            size, spread = _absolute(text, at), "absolute"
    except QuantityError as error:
        findings.wrong(key, error.found, f'"1 %", "factor 1.5", or {error.expected}')
        return None
    if not size > 0:
        findings.wrong(key, described(raw), "a tolerance above 0")
        return None
    if spread == "factor" and at.value <= 0:
        found = f"a factor for a number of {at.value:g}"
        findings.wrong(key, found, f"a tolerance in {at.unit or 'the unit of the number'}")
        return None
    return Tolerance(address, cast(Any, spread), size, str(raw))


def _above_one(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = 0.0
    if not 1 < value < 1e6:
        raise QuantityError(f'"factor {text}"', "a factor above 1")
    return value


def _absolute(raw: Any, at: Input) -> float:
    """A difference in the unit of the file."""
    dimension = dimension_at(at)
    if dimension in ("pure", "fraction"):
        return read_number(raw, dimension).value
    if dimension == "temperature":
        dimension = "temperature difference"
    return read(raw, dimension).value / file_unit_span(at)


def one_of_addresses(address: str, known: Mapping[str, Input]) -> str:
    """The addresses nearest to a wrong one, else all."""
    from difflib import get_close_matches

    near = get_close_matches(address, list(known), n=3, cutoff=0.5)
    return one_of(near or list(known))


def _correlations(
    raw: list[list[Any]], tolerances: tuple[Tolerance, ...], findings: Findings
) -> tuple[tuple[str, str, float], ...]:
    known = [tolerance.address for tolerance in tolerances]
    found: list[tuple[str, str, float]] = []
    for place, entry in enumerate(raw):
        key = f"plan.correlations.{place}"
        right = len(entry) == 3 and entry[0] in known and entry[1] in known
        if not right or entry[0] == entry[1]:
            findings.wrong(
                key,
                ", ".join(described(part) for part in entry) or "nothing",
                "two addresses under plan.tolerances and a number between -1 and 1",
            )
            continue
        try:
            value = read_number(entry[2]).value
        except QuantityError as error:
            findings.wrong(f"{key}.2", error.found, "a number between -1 and 1")
            continue
        if not -1 < value < 1:
            findings.wrong(f"{key}.2", f"{value:g}", "a number between -1 and 1")
            continue
        found.append((entry[0], entry[1], value))
    if found and not _definite(known, found):
        findings.wrong(
            "plan.correlations", "correlations that contradict each other", "a definite matrix"
        )
    return tuple(found)


def _definite(known: list[str], found: list[tuple[str, str, float]]) -> bool:
    import numpy as np

    matrix = np.eye(len(known))
    for one, two, value in found:
        i, j = known.index(one), known.index(two)
        matrix[i, j] = matrix[j, i] = value
    return bool(np.linalg.eigvalsh(matrix)[0] > 1e-12)


def _samples(
    table: SamplesTable | None,
    experiment: Experiment,
    known: Mapping[str, Input],
    findings: Findings,
) -> Sampling:
    if table is None:
        return Sampling()
    where = "plan.samples"
    count = 8 if table.count is None else int(table.count.value)
    if table.count is not None and table.count.value != count:
        findings.wrong(f"{where}.count", f"{table.count.value:g}", "a whole number")
    for address in table.parameters or []:
        if address not in known:
            key = f"{where}.parameters"
            findings.wrong(key, f'"{address}"', one_of_addresses(address, known))
    signal = _signal(table.signal or "", experiment, findings)
    return Sampling(
        count=count,
        signal=signal,
        sd=_sd(table.sd, signal, findings),
        dead_time=table.dead_time,
        takes=0.0 if table.takes is None else table.takes.value,
        parameters=tuple(table.parameters or ()),
        until=table.until,
        clock=_clock(table.clock, findings),
    )


def _signal(text: str, experiment: Experiment, findings: Findings) -> str:
    if not text:
        return ""
    match = _SIGNAL.fullmatch(text)
    if match is None:
        expected = '"total pressure", "concentration of NO" or "partial pressure of NO", say'
        findings.wrong("plan.samples.signal", f'"{text}"', expected)
        return ""
    if match[2] is not None and match[2] not in experiment.gas_named:
        expected = f"a gas of the case{did_you_mean(match[2], experiment.gas_named)}"
        findings.wrong("plan.samples.signal", f'"{match[2]}"', expected)
        return ""
    return text


def _sd(raw: Any, signal: str, findings: Findings) -> Sourced | None:
    if raw is None:
        return None
    dimension = "pressure" if "pressure" in signal else "concentration"
    try:
        sd = read(raw, dimension)
    except QuantityError as error:
        findings.refused("plan.samples.sd", error)
        return None
    if sd.value <= 0:
        findings.wrong("plan.samples.sd", "a standard deviation of 0", "one above 0")
        return None
    return sd


def _clock(text: str | None, findings: Findings) -> float | None:
    if text is None:
        return None
    match = _CLOCK.fullmatch(text)
    if match is None:
        findings.wrong("plan.samples.clock", f'"{text}"', 'a time of day such as "09:00"')
        return None
    return 3600.0 * int(match[1]) + 60.0 * int(match[2])
