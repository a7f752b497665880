"""Small cases to be swept, and what lies in their folders."""

from __future__ import annotations

import hashlib
from pathlib import Path

from meanfree.campaigns.campaign import Campaign
from meanfree.case import load_case
from meanfree.case.sweeps import campaign_of

CASE = """title = "Dimerisation"
labels = ["A", "B", "C", "D"]

[vessel]
holds = "volume"
volume = "2 L"

[temperature]
mode = "isothermal"
value = "500 K"

[fill]
gases = { A = "50 torr", C = "100 torr" }
at = "300 K"

[run]
until = "300 s"

[[steps]]
name = "one"
reaction = "A -> 2 B"
law = "arrhenius"
A = "1e11 1/s"
Ea = "120 kJ/mol"

[[steps]]
name = "two"
reaction = "2 B -> D"
law = "fixed"
k = "2 L/mol/s"
"""
"""Four gases, two steps."""

SWEEP = """
[sweep]
design = "quasi-random"
samples = {samples}
seed = 3
observables = ["half-life of A", "conversion of A", "peak of B", "total pressure at 100 s"]
part = {part}

[sweep.vary]
"temperature.value" = {{ between = ["470 K", "530 K"] }}
"fill.gases.A" = {{ mean = "40 torr", sd = "15 torr" }}
"steps.one.A" = {{ between = ["5e10 1/s", "2e11 1/s"], spacing = "log" }}
"""


def write_case(folder: Path, samples: int = 128, part: int = 16, name: str = "case.toml") -> Path:
    """A case with a quasi-random sweep."""
    path = folder / name
    path.write_text(CASE + SWEEP.format(samples=samples, part=part))
    return path


def campaign_in(folder: Path, samples: int = 128, part: int = 16) -> Campaign:
    """The campaign of that case."""
    return campaign_of(load_case(write_case(folder, samples, part)))


def contents(folder: Path) -> dict[str, str]:
    """Hash of every file below a folder, by its name."""
    return {
        path.relative_to(folder).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }
