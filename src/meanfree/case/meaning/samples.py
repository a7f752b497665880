"""``[[samples]]``: gas drawn from the running vessel at stated times."""

from __future__ import annotations

from typing import Any

from meanfree.case.findings import Findings
from meanfree.case.schema.base import shape
from meanfree.case.schema.tables import SampleTable
from meanfree.experiment.samples import Sample
from meanfree.experiment.vessel import Vessel
from meanfree.units.reading import described

MOST = 1000


def read_samples(raw: Any, vessel: Vessel | None, findings: Findings) -> tuple[Sample, ...]:
    """The samples in the order of time; what is wrong with them goes to ``findings``."""
    if raw is None:
        return ()
    if not isinstance(raw, list) or not all(isinstance(table, dict) for table in raw):
        findings.wrong("samples", described(raw), "tables headed [[samples]], with two brackets")
        return ()
    if len(raw) > MOST:
        findings.wrong("samples", f"{len(raw)} samples", f"at most {MOST}")
        return ()
    found: list[Sample] = []
    for place, table in enumerate(raw):
        sample = _sample(table, f"samples.{place}", vessel, findings)
        if sample is None:
            continue
        if any(sample.at.value == other.at.value for other in found):
            expected = "one sample at a time; two at once are one larger one"
            findings.wrong(
                f"samples.{place}.at", f"a second sample at {sample.at.value:g} s", expected
            )
        found.append(sample)
    return tuple(sorted(found, key=lambda sample: sample.at.value))


def _sample(raw: Any, address: str, vessel: Vessel | None, findings: Findings) -> Sample | None:
    table = shape(SampleTable, raw, address, findings)
    if table is None:
        return None
    if table.has("fraction") == table.has("volume"):
        found = "both fraction and volume" if table.has("fraction") else "nothing drawn"
        findings.wrong(address, found, 'fraction = 0.05, or volume = "5 mL"')
        return None
    if table.is_wrong("at") or table._wrong:
        return None
    if table.at.value <= 0:
        findings.wrong(f"{address}.at", "a time of 0", "a time above 0 s: before it is the fill")
    if table.fraction is not None and table.fraction.value >= 1:
        findings.wrong(f"{address}.fraction", "all of the gas", "a share below 1")
    volume = table.volume
    if volume is not None and vessel is not None and volume.value >= vessel.volume.value:
        found = f"{volume.value * 1e3:.4g} L, but the vessel has {vessel.volume.value * 1e3:.4g} L"
        findings.wrong(f"{address}.volume", found, "less than the vessel")
    return Sample(table.at, table.fraction, volume)
