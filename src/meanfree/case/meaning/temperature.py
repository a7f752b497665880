"""``[temperature]``: held, free, exchanging heat, or programmed."""

from __future__ import annotations

from itertools import pairwise
from typing import Any, cast

from meanfree.case.findings import Findings, did_you_mean, one_of
from meanfree.case.schema.base import Table, shape
from meanfree.case.schema.tables import (
    TEMPERATURES,
    AdiabaticTable,
    ExchangeTable,
    IsothermalTable,
    ProgramTable,
)
from meanfree.experiment.temperature import (
    Adiabatic,
    Exchange,
    Isothermal,
    Program,
    Temperature,
)
from meanfree.units.reading import described

MOST_POINTS = 10_000


def read_temperature(raw: Any, findings: Findings) -> Temperature | None:
    """The temperature of the gas, None where something is wrong with it."""
    if not isinstance(raw, dict):
        found = "nothing" if raw is None else described(raw)
        findings.wrong("temperature", found, 'a table [temperature] with mode = "isothermal", say')
        return None
    mode = raw.get("mode")
    model = TEMPERATURES.get(mode) if isinstance(mode, str) else None
    if model is None:
        near = did_you_mean(mode, TEMPERATURES) if isinstance(mode, str) else ""
        found = "nothing" if mode is None else described(mode)
        findings.wrong("temperature.mode", found, one_of(TEMPERATURES) + near)
        return None
    before = len(findings.problems)
    table = shape(model, raw, "temperature", findings)
    if len(findings.problems) > before or table is None:
        return None
    return _joined(table, findings)


def _joined(table: Table, findings: Findings) -> Temperature | None:
    if isinstance(table, IsothermalTable):
        return Isothermal(table.value)
    if isinstance(table, AdiabaticTable):
        return Adiabatic(table.value)
    if isinstance(table, ExchangeTable):
        return Exchange(
            table.value, table.surroundings, table.conductance, table.wall_heat_capacity
        )
    return _program(cast(ProgramTable, table), findings)


def _program(table: ProgramTable, findings: Findings) -> Program | None:
    times = [time.value for time, _ in table.points]
    if len(times) > MOST_POINTS:
        expected = f"at most {MOST_POINTS}: the integration restarts at every one"
        findings.wrong("temperature.points", f"{len(times)} points", expected)
        return None
    before = len(findings.problems)
    if times[0] != 0:
        findings.wrong(
            "temperature.points.0", f"a first point at {times[0]:g} s", 'a first point at "0 s"'
        )
    for place, (earlier, later) in enumerate(pairwise(times), start=1):
        if later <= earlier:
            found = f"{later:g} s after {earlier:g} s"
            findings.wrong(
                f"temperature.points.{place}", found, "times that rise from point to point"
            )
    return None if len(findings.problems) > before else Program(tuple(table.points))


def span(temperature: Temperature) -> tuple[float, float]:
    """Lowest and highest temperature that is known beforehand [K]."""
    if isinstance(temperature, Program):
        values = [T.value for _, T in temperature.points]
        return min(values), max(values)
    values = [temperature.initial]
    if isinstance(temperature, Exchange):
        values.append(temperature.surroundings.value)
    return min(values), max(values)
