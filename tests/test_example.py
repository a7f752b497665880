"""The committed example that the README shows is what the program makes today."""

from __future__ import annotations

import csv
import json
import math
from pathlib import Path
from typing import Any

import pytest

from meanfree.cli.app import run

ROOT = Path(__file__).parents[1]
EXAMPLE = ROOT / "outputs" / "example"

# The solver's tolerance is 1e-8; its steps, and with them everything read between them, may
# differ from one version of a library to the next by about that much.
SAME = 1e-6


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("example") / "run"
    assert (
        run(["run", str(ROOT / "cases" / "nocl-bulb.toml"), "--quiet", "--out", str(folder)]) == 0
    )
    return folder


def differences(old: Any, new: Any, where: str = "") -> list[str]:
    """Where two JSON values differ by more than `SAME`."""
    if isinstance(old, dict) and isinstance(new, dict):
        assert old.keys() == new.keys(), where
        return [d for key in old for d in differences(old[key], new[key], f"{where}.{key}")]
    if isinstance(old, list) and isinstance(new, list):
        assert len(old) == len(new), where
        pairs = enumerate(zip(old, new, strict=True))
        return [d for i, (a, b) in pairs for d in differences(a, b, f"{where}[{i}]")]
    if isinstance(old, float) and isinstance(new, float):
        same = math.isclose(old, new, rel_tol=SAME, abs_tol=1e-13)
        return [] if same else [f"{where}: {old} and {new}"]
    return [] if old == new else [f"{where}: {old} and {new}"]


def test_the_answers_are_the_same(made: Path) -> None:
    old, new = (json.loads((f / "summary.json").read_text()) for f in (EXAMPLE, made))
    # the path is as typed, and the work may differ with the library
    for summary in (old, new):
        del summary["case"], summary["solver"], summary["drift"], summary["version"]
    assert differences(old, new) == []


@pytest.mark.parametrize(
    "name", ["profiles.csv", "conversions.csv", "half_lives.csv", "rate_constants.csv", "gases.csv"]
)
def test_the_tables_are_the_same(made: Path, name: str) -> None:
    def rows(folder: Path) -> list[list[float | str]]:
        with (folder / name).open(newline="") as file:
            return [[as_number(cell) for cell in row] for row in csv.reader(file)]

    assert differences(rows(EXAMPLE), rows(made), name) == []


def as_number(cell: str) -> float | str:
    try:
        return float(cell)
    except ValueError:
        return cell


def test_the_same_files_are_left(made: Path) -> None:
    assert {f.name for f in EXAMPLE.iterdir()} == {f.name for f in made.iterdir()}
