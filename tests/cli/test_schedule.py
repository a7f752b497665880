"""The command schedule: run sheet, designs, and how it ends."""

from __future__ import annotations

import itertools
import json
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]
PLAN = """
[plan.samples]
count = 6
signal = "total pressure"
sd = "0.2 torr"
dead_time = "2 min"
until = "90 min"
clock = "23:30"
"""


@pytest.fixture(autouse=True)
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    Path("bulb.toml").write_text(GOOD + PLAN)
    return Path("bulb.toml")


def test_the_run_sheet(capsys: Printed, case: Path) -> None:
    assert run(["schedule", str(case)]) == 0
    said = capsys.readouterr().out
    assert said.startswith("When to sample: Nitrosyl chloride\n\nSamples (D-optimal)")
    assert "A of decomposition to" in said
    rows = Path("outputs/bulb/schedule/run_sheet.csv").read_text().splitlines()
    assert rows[0] == "sample,time_s,clock,expected_Pa,sd_Pa,conversion,reading"
    assert len(rows) == 7
    times = [float(row.split(",")[1]) for row in rows[1:]]
    assert min(b - a for a, b in itertools.pairwise(times)) >= 120 - 1e-6
    hours = 23.5 + times[0] / 3600
    assert f"{int(hours) % 24:02d}:" in rows[1]


def test_json_and_the_other_designs(capsys: Printed, case: Path) -> None:
    assert run(["schedule", str(case), "--samples", "4", "--design", "conversion", "--json"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["chosen"] == "equal conversion"
    designs = {entry["design"]: entry for entry in summary["designs"]}
    assert list(designs) == ["equal times", "equal conversion", "D", "A", "E"]
    assert all(len(entry["times_s"]) == 4 for entry in designs.values())
    errors = {name: entry["parameters"][0]["relative_error"] for name, entry in designs.items()}
    assert errors["D"] <= min(errors.values()) + 1e-12
    manifest = json.loads(Path("outputs/bulb/schedule/manifest.json").read_text())
    assert manifest["command"] == "meanfree schedule bulb.toml --samples 4 --design conversion"


def test_what_samples_take_is_told(capsys: Printed, case: Path) -> None:
    found = 'plan.samples.parameters=["steps.decomposition.A", "fill.gases.NOCl"]'
    takes = ["--set", "plan.samples.takes=0.2", "--set", found]
    assert run(["schedule", str(case), *takes]) == 0
    capsys.readouterr()
    page = Path("outputs/bulb/schedule/report.html").read_text()
    said = "each takes 20 % of the contents. Times chosen as if they took nothing would give A of "
    assert said + "decomposition to ±" in page
    assert "errors count what each sample takes out" in page
    assert run(["schedule", str(case), "--replace"]) == 0
    page = Path("outputs/bulb/schedule/report.html").read_text()
    assert "took nothing" not in page
    assert "takes out" not in page


def test_too_many_samples(capsys: Printed, case: Path) -> None:
    assert run(["schedule", str(case), "--samples", "100", "--json"]) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert problem["key"] == "plan.samples"
    assert run(["schedule", str(case), "--samples", "0", "--json"]) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert (problem["found"], problem["expected"]) == ("0", "a number from 1 to 200")
