"""Small good cases as text, to be edited by tests, and what loading an edited one says."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path

from meanfree.case import LoadedCase, load_case

GOOD = """title = "Nitrosyl chloride"

[vessel]
holds = "volume"
volume = "1.8 L"

[temperature]
mode = "isothermal"
value = "480 K"

[fill]
gases = { NOCl = "50 torr", Ar = "135 torr" }
at = "296 K"

[run]
until = "auto"

[[steps]]
name = "decomposition"
reaction = "2 NOCl -> 2 NO + Cl2"
law = "arrhenius"
A = "9.4e9 L/mol/s"
Ea = "102 kJ/mol"
"""
PISTON = GOOD.replace('holds = "volume"', 'holds = "pressure"')
LABELS = 'labels = ["A", "B"]\n' + GOOD.replace('NOCl = "50 torr"', 'A = "50 torr"').replace(
    "2 NOCl -> 2 NO + Cl2", "2 A -> B"
)
BASES = {"good": GOOD, "piston": PISTON, "labels": LABELS}
LAW = 'law = "arrhenius"\nA = "9.4e9 L/mol/s"\nEa = "102 kJ/mol"\n'


def edited(text: str, edits: Iterable[tuple[str, str]]) -> str:
    """``text`` with each (old, new) exchanged; every old text must stand there once."""
    for old, new in edits:
        assert text.count(old) == 1, f"{old!r} stands {text.count(old)} times in the case"
        text = text.replace(old, new)
    return text


def load_text(folder: Path, text: str, settings: Mapping[str, str] | None = None) -> LoadedCase:
    """The case of that text, by way of a file in ``folder``."""
    path = folder / "case.toml"
    path.write_text(text, encoding="utf-8")
    return load_case(path, settings)


def load_edited(folder: Path, *edits: tuple[str, str], base: str = GOOD) -> LoadedCase:
    """A good case with some edits."""
    return load_text(folder, edited(base, edits))
