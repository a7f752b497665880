"""``[vessel]``: what it holds, its size, shape and dead space."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

from meanfree.case.findings import Findings
from meanfree.case.schema.base import shape
from meanfree.case.schema.tables import ShapeTable, VesselTable
from meanfree.experiment.vessel import DeadSpace, Shape, Vessel
from meanfree.sourced import Sourced

# A neck, a dome, a stirrer: the nominal form gives the volume to about this.
SLACK = 0.1


def read_vessel(raw: Any, findings: Findings) -> Vessel | None:
    """The vessel, None where something is wrong with it."""
    if raw is None:
        findings.wrong("vessel", "nothing", 'a table [vessel] with holds = "volume" and a volume')
        return None
    before = len(findings.problems)
    table = shape(VesselTable, raw, "vessel", findings)
    if table is None:
        return None
    if table.holds == "volume" and table.has("pressure"):
        findings.wrong(
            "vessel.pressure",
            "a held pressure in a vessel that holds its volume",
            'holds = "pressure", or no pressure (the fill gives it)',
        )
    inside = _shape(table.shape, table.volume, findings) if table.shape is not None else None
    dead = table.dead_space
    if table.pressure is not None and table.pressure.value <= 0:
        findings.wrong("vessel.pressure", "a pressure of 0", "a pressure above 0 Pa")
    if table.gauge_resolution is not None and table.gauge_resolution.value <= 0:
        found = "a resolution of 0"
        findings.wrong("vessel.gauge_resolution", found, 'the smallest change shown, "0.1 torr"')
    if len(findings.problems) > before:
        return None
    return Vessel(
        holds=table.holds,
        volume=table.volume,
        pressure=table.pressure,
        rated_pressure=table.rated_pressure,
        gauge_resolution=table.gauge_resolution,
        shape=inside,
        dead_space=None if dead is None else DeadSpace(dead.volume, dead.temperature),
    )


def _shape(table: ShapeTable, volume: Sourced | None, findings: Findings) -> Shape | None:
    """The shape; sizes that contradict the volume are refused, a missing length is worked out."""
    given = {key for key in ("diameter", "length", "surface") if getattr(table, key) is not None}
    allowed = {"sphere": {"diameter"}, "cylinder": {"diameter", "length"}, None: {"surface"}}
    form = table.form
    for key in sorted(given - allowed[form]):
        expected = "only diameter" if form == "sphere" else "diameter or length, or both"
        if form is None:
            expected = 'form = "sphere" or form = "cylinder" beside it; or only surface'
        findings.wrong(f"vessel.shape.{key}", f"{key} of {_named(form)}", expected)
    if form != "sphere" and not given & allowed[form]:
        expected = "diameter or length" if form else "form, or surface"
        findings.wrong("vessel.shape", "too little", f'{expected}, such as form = "sphere"')
        return None
    if volume is None or given - allowed[form]:
        return None
    shape_ = Shape(form or "stated", table.diameter, table.length, table.surface)
    if form == "cylinder" and shape_.length is None and shape_.diameter is not None:
        length = 4 * volume.value / (math.pi * shape_.diameter.value**2)
        source = "worked out from volume and diameter"
        shape_ = replace(shape_, length=Sourced(length, "m", source, "length", default=True))
    _contradiction(shape_, volume, findings)
    return shape_


def _named(form: str | None) -> str:
    return f"a {form}" if form else "a shape without form"


def _contradiction(shape_: Shape, volume: Sourced, findings: Findings) -> None:
    if shape_.form == "stated":
        assert shape_.surface is not None
        least = math.pi ** (1 / 3) * (6 * volume.value) ** (2 / 3)
        if shape_.surface.value < least * (1 - SLACK):
            found = f"{shape_.surface.value:.4g} m^2"
            expected = f"at least the surface of a sphere of that volume, {least:.4g} m^2"
            findings.wrong("vessel.shape.surface", found, expected)
        return
    d = shape_.width(volume.value)
    size = math.pi * d**3 / 6
    if shape_.form == "cylinder":
        assert shape_.length is not None
        size = math.pi * d**2 / 4 * shape_.length.value
    if abs(size / volume.value - 1) > SLACK:
        found = f"a {shape_.form} of {size * 1e3:.4g} L, but volume = {volume.value * 1e3:.4g} L"
        findings.wrong("vessel.shape", found, "sizes that give the volume to 10 %")
