"""The command equations: what it prints, what it leaves, and how it refuses."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]


@pytest.fixture
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> str:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bulb.toml").write_text(GOOD)
    return "bulb.toml"


FILES = ["equations.html", "equations.tex", "equations.txt", "manifest.json", "summary.json"]


def test_it_prints_the_sheet_and_leaves_a_folder(case: str, capsys: Printed) -> None:
    assert run(["equations", case]) == 0
    out = capsys.readouterr().out
    folder = Path("outputs/bulb/equations")
    assert "\nBalances\n  dn(" in out
    assert out.endswith("Written: outputs/bulb/equations/equations.html\n")
    assert sorted(path.name for path in folder.iterdir()) == FILES
    assert (folder / "equations.txt").read_text(encoding="utf-8").strip() in out
    manifest = json.loads((folder / "manifest.json").read_text())
    assert manifest["command"] == "meanfree equations bulb.toml"


def test_json_is_the_summary_and_nothing_else(case: str, capsys: Printed) -> None:
    assert run(["equations", case, "--json", "--out", "here"]) == 0
    printed = json.loads(capsys.readouterr().out)
    assert printed == json.loads(Path("here/summary.json").read_text(encoding="utf-8"))
    assert printed["schema"] == "meanfree-equations-1"
    assert printed["groups"][0]["heading"] == "Balances"


def test_quiet_prints_the_paths_written(case: str, capsys: Printed) -> None:
    assert run(["equations", case, "--quiet"]) == 0
    paths = [Path(line) for line in capsys.readouterr().out.splitlines()]
    assert sorted(path.name for path in paths) == FILES
    assert all(path.is_file() for path in paths)


def test_a_changed_value_is_in_the_equations(case: str, capsys: Printed) -> None:
    assert run(["equations", case, "--set", "temperature.value=501 K"]) == 0
    assert "T = 501 K" in capsys.readouterr().out


def test_a_wrong_case_leaves_nothing(case: str, capsys: Printed) -> None:
    assert run(["equations", case, "--set", "temperature.value=-1 K", "--json"]) == 2
    assert json.loads(capsys.readouterr().out)["errors"]
    assert not Path("outputs").exists()


def test_results_of_another_case_are_not_replaced_unasked(case: str, capsys: Printed) -> None:
    Path("other.toml").write_text(GOOD)
    assert run(["equations", case, "--out", "here"]) == 0
    assert run(["equations", "other.toml", "--out", "here"]) == 2
    assert run(["equations", "other.toml", "--out", "here", "--replace"]) == 0
    capsys.readouterr()
