"""The command limits: what it prints, what it leaves, and how it ends."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]

PLAN = '\n[plan]\nwarm_up = "4 min"\ndetection = { NOCl = "0.5 torr" }\n'


@pytest.fixture(autouse=True)
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    Path("bulb.toml").write_text(GOOD + PLAN)
    return Path("bulb.toml")


def test_it_says_the_gravest_first_and_leaves_a_folder(capsys: Printed, case: Path) -> None:
    assert run(["limits", str(case)]) == 0
    said = capsys.readouterr().out
    assert said.startswith("Is the model honest here? Nitrosyl chloride\n\nBeyond a guideline")
    assert "Caution: Air that dilutes Cl₂ to its limit: " in said
    assert "licensed practice decide" in said.replace("\n", " ")
    folder = Path("outputs/bulb/limits")
    assert sorted(path.name for path in folder.iterdir()) == [
        *("gases.csv", "limits.csv", "limits.png", "limits.svg"),
        *("manifest.json", "report.html", "summary.json"),
    ]
    page = (folder / "report.html").read_text()
    assert page.count("<svg") == 1
    assert "http://" not in page.replace("http://www.w3.org/", "")
    manifest = json.loads((folder / "manifest.json").read_text())
    assert manifest["command"] == "meanfree limits bulb.toml"
    assert "limits.csv" in manifest["files"]


def test_json_is_the_summary_and_nothing_else(capsys: Printed, case: Path) -> None:
    assert run(["limits", str(case), "--json", "--set", "vessel.rated_pressure=30 kPa"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["schema"] == "meanfree-limits-1"
    assert summary["limits"][0]["verdict"] == "beyond the guideline"
    pressure = next(e for e in summary["limits"] if e["limit"] == "pressure")
    assert pressure["value"] > 1
    assert pressure["verdict"] == "beyond the guideline"
    counts = [summary[key] for key in ("beyond", "cautions", "within", "not_known")]
    assert sum(counts) == len(summary["limits"])
    assert json.loads(Path("outputs/bulb/limits/summary.json").read_text()) == summary


def test_several_cases_at_once(capsys: Printed, case: Path) -> None:
    Path("other.toml").write_text(GOOD.replace("480 K", "500 K"))
    assert run(["limits", "bulb.toml", "other.toml", "--out", "both", "--quiet"]) == 0
    paths = capsys.readouterr().out.split()
    assert paths[0] == "both/bulb/report.html"
    assert "both/other/report.html" in paths
    assert all(Path(path).is_file() for path in paths)


def test_wrong_cases_are_all_told(capsys: Printed, case: Path) -> None:
    Path("other.toml").write_text(GOOD.replace('"480 K"', "480"))
    case.write_text(GOOD + PLAN.replace("4 min", "4 torr"))
    assert run(["limits", "bulb.toml", "other.toml", "--json"]) == 2
    errors = json.loads(capsys.readouterr().out)["errors"]
    assert [error["key"] for error in errors] == ["plan.warm_up", "temperature.value"]
    assert not Path("outputs").exists()


def test_a_folder_of_another_case_is_kept(capsys: Printed, case: Path) -> None:
    Path("other.toml").write_text(GOOD)
    assert run(["limits", "bulb.toml", "--out", "here", "--quiet"]) == 0
    capsys.readouterr()
    assert run(["limits", "other.toml", "--out", "here"]) == 2
    assert "--replace" in capsys.readouterr().err
    assert run(["limits", "other.toml", "--out", "here", "--replace", "--quiet"]) == 0
