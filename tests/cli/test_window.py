"""The command window: what it prints and leaves, and how it ends."""

from __future__ import annotations

import json
import math
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]
CASE = GOOD + '\n[plan]\nwarm_up = "4 min"\npatience = "8 h"\n'


@pytest.fixture(autouse=True)
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    Path("bulb.toml").write_text(CASE)
    return Path("bulb.toml")


def test_the_default_map(capsys: Printed, case: Path) -> None:
    assert run(["window", str(case), "--points", "20"]) == 0
    said = " ".join(capsys.readouterr().out.split())
    assert said.startswith("Where to run: Nitrosyl chloride Usable")
    assert "In its middle temperature" in said
    assert "The case as it stands 50 % of NOCl after" in said
    folder = Path("outputs/bulb/window")
    assert sorted(path.name for path in folder.iterdir()) == [
        *("manifest.json", "report.html", "summary.json"),
        *("window.csv", "window.png", "window.svg"),
    ]
    rows = (folder / "window.csv").read_text().splitlines()
    assert len(rows) == 401
    assert rows[0].startswith("across,up,time_s,highest_pressure_Pa,usable,shorter than mixing")


def test_json_with_addresses(capsys: Printed, case: Path) -> None:
    options = ["--across", "temperature.value", "--across-range", "420 K", "560 K"]
    options += ["--up", "steps.decomposition.A", "--up-range", "1e9 L/mol/s", "1e11 L/mol/s"]
    assert (
        run(["window", str(case), *options, "--points", "12", "--conversion", "25 %", "--json"])
        == 0
    )
    summary = json.loads(capsys.readouterr().out)
    assert summary["schema"] == "meanfree-window-1"
    assert summary["conversion"] == 0.25
    assert summary["across"] == {
        "address": "temperature.value",
        "low": 420.0,
        "high": 560.0,
        "unit": "K",
        "points": 12,
    }
    assert summary["up"]["unit"] == "L/mol/s"
    regions = {entry["region"]: entry for entry in summary["regions"]}
    assert regions["longer than patience"]["share"] > 0
    assert regions["above the rated pressure"]["why_not"] == "no rated_pressure under [vessel]"
    assert 0 < summary["usable_share"] < 1
    stands = summary["case_as_it_stands"]
    # Second order by hand: X/(1 - X)/(2 k c0) with 50 torr at 296 K; the map's rtol is 1e-6.
    c0 = 50 * 101325 / 760 / (8.31446261815324 * 296.0)
    k = 9.4e6 * math.exp(-102e3 / (8.31446261815324 * 480.0))
    assert stands["time_s"] == pytest.approx(1 / 3 / (2 * k * c0), rel=2e-5)
    assert stands["stands_against"] == []


@pytest.mark.parametrize(
    ("options", "key", "found"),
    [
        (["--points", "5"], "--points", "5"),
        (["--across-range", "1 K", "2 K"], "--across-range", "a range alone"),
        (["--up", "temperature.value"], "--up", '"temperature.value" both ways'),
        (["--up", "vessel.volum"], "--up", '"vessel.volum"'),
        (["--conversion", "1"], "--conversion", "1"),
        (
            ["--across", "temperature.value", "--across-range", "500 K", "400 K"],
            "--across-range",
            "500 400",
        ),
    ],
)
def test_wrong_options(
    options: list[str], key: str, found: str, capsys: Printed, case: Path
) -> None:
    assert run(["window", str(case), *options, "--json"]) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert (problem["key"], problem["found"]) == (key, found)
    assert not Path("outputs").exists()
