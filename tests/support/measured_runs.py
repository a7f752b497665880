"""Measured runs made in memory, and small cases with data beside them, for the tests of fits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np

from meanfree.case import load_case
from meanfree.case.loaded import LoadedCase
from meanfree.case.measurements import Measurements, measurements_of
from meanfree.measured.readings import Readings
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.signals import Signal

CASE = """title = "A test"
labels = ["A", "B", "C"]

[vessel]
holds = "volume"
volume = "0.5 L"

[temperature]
mode = "isothermal"
value = "{T} K"

[fill]
gases = {{ A = "{fill}" }}

[[steps]]
name = "d"
reaction = "{reaction}"
{law}
"""


def case_text(
    reaction: str = "2 A -> B",
    law: str = 'law = "fixed"\nk = "0.5 L/mol/min"\nk_counts = "loss of A"',
    fill: str = "632 mmHg",
    T: float = 599.15,
) -> str:
    """A case of one step, the labels being those that it uses."""
    text = CASE.format(reaction=reaction, law=law, fill=fill, T=T)
    used = [f'"{name}"' for name in "ABC" if name in reaction]
    return text.replace('"A", "B", "C"', ", ".join(used))


DATA = """
[[data]]
file = "run.csv"
time = { column = "t", unit = "min" }
signal = { column = "p", unit = "mmHg", is = "total pressure" }
"""

BUTADIENE = (
    [0, 5, 10, 15, 20, 25, 30, 35, 40, 45, 50, 55, 60, 70],
    [632, 611, 592, 573.5, 558.5, 545, 533.5, 523, 514, 505, 497, 490, 484, 473],
)
"""Minutes and mmHg. Vaughan, J. Am. Chem. Soc. 54, 3863 (1932): 1,3-butadiene at 326 °C."""


def csv(columns: Mapping[str, Sequence[float]]) -> str:
    """Columns as CSV."""
    rows = zip(*columns.values(), strict=True)
    lines = [",".join(columns), *(",".join(f"{float(value)!r}" for value in row) for row in rows)]
    return "\n".join(lines) + "\n"


def loaded(folder: Path, text: str, files: Mapping[str, str]) -> LoadedCase:
    """The case of a text with files beside it."""
    for name, content in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(content, encoding="utf-8")
    path = folder / "case.toml"
    path.write_text(text, encoding="utf-8")
    return load_case(path)


def measured(folder: Path, text: str, files: Mapping[str, str]) -> Measurements:
    """The runs of a case of that text."""
    return measurements_of(loaded(folder, text, files))


def butadiene(folder: Path, fit: str) -> Measurements:
    """Vaughan's run with a table [fit]."""
    t, p = BUTADIENE
    return measured(folder, case_text() + DATA + fit, {"run.csv": csv({"t": t, "p": p})})


def made_up(
    case: LoadedCase | MeasuredRun,
    times: Sequence[float],
    values: Sequence[float],
    *,
    signal: Signal | None = None,
    sd: float | None = None,
    unit: str = "Pa",
    name: str = "run",
    conditions: Mapping[str, str] | None = None,
) -> MeasuredRun:
    """A run with readings in SI, without any file."""
    n = len(times)
    readings = Readings(
        f"{name}.csv",
        signal or Signal("total pressure"),
        np.asarray(times, float),
        np.asarray(values, float),
        None if sd is None else np.full(n, sd),
        tuple(range(2, n + 2)),
        unit,
        "s",
    )
    return MeasuredRun(name, case.experiment, readings, dict(conditions or {}))
