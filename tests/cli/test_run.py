"""The command run: what it prints, what it leaves, and how it ends."""

from __future__ import annotations

import json
import math
import os
import subprocess
import sys
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]

LEFT = {
    "conversions.csv",
    "gases.csv",
    "half_lives.csv",
    "half_lives.png",
    "half_lives.svg",
    "manifest.json",
    "profiles.csv",
    "profiles.png",
    "profiles.svg",
    "rate_constants.csv",
    "rates.png",
    "rates.svg",
    "report.html",
    "summary.json",
}

LABELS = """\
title = "{title}"
labels = ["A", "B"]
[vessel]
holds = "volume"
volume = "1 L"
[temperature]
mode = "isothermal"
value = "300 K"
[fill]
gases = {{ A = "1 mol/L" }}
[[steps]]
name = "s"
reaction = "A -> B"
law = "fixed"
k = "1e-3 1/s"
"""


@pytest.fixture(autouse=True)
def somewhere_else(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


@pytest.fixture
def case(tmp_path: Path) -> Path:
    (tmp_path / "bulb.toml").write_text(GOOD)
    return Path("bulb.toml")


@pytest.fixture
def simple(tmp_path: Path) -> Path:
    (tmp_path / "simple.toml").write_text(LABELS.format(title="One step"))
    return Path("simple.toml")


def names_in(folder: str) -> set[str]:
    return {path.name for path in Path(folder).iterdir()}


def test_it_leaves_a_whole_folder_and_says_where(capsys: Printed, case: Path) -> None:
    assert run(["run", str(case)]) == 0
    out, err = capsys.readouterr()
    assert err == ""
    assert names_in("outputs/bulb/run") == LEFT
    lines = out.splitlines()
    assert lines[0] == "Nitrosyl chloride"
    # second order in NOCl: t = X / (1 - X) / (2 k c0) = 274.5 s at X = 0.1
    assert "10 % of NOCl converted after 4.57 min" in [" ".join(line.split()) for line in lines]
    assert "outputs/bulb/run/report.html" in out
    assert "\x1b" not in out


def test_the_answers_are_those_of_first_order(capsys: Printed, simple: Path) -> None:
    # t = -ln(1 - X)/k and a constant half-life ln 2/k: any textbook of kinetics.
    assert run(["run", str(simple)]) == 0
    words = [" ".join(line.split()) for line in capsys.readouterr().out.splitlines()]
    assert "10 % of A converted after 105 s" in words  # 105.36 s
    assert "50 % of A converted after 11.6 min" in words  # 693.15 s
    assert "90 % of A converted after 38.4 min" in words  # 2302.6 s
    assert any(line.startswith("Half-lives of A 11.6 min · 11.6 min · 11.6 min") for line in words)


def test_json_is_the_summary_and_nothing_else(capsys: Printed, simple: Path) -> None:
    assert run(["run", str(simple), "--json"]) == 0
    out = capsys.readouterr().out
    assert json.loads(out) == json.loads(Path("outputs/simple/run/summary.json").read_text())
    assert json.loads(out)["gases"][0]["time_to_50_percent_s"] == pytest.approx(
        math.log(2) / 1e-3, rel=1e-7
    )


def test_quiet_is_the_paths_and_nothing_else(capsys: Printed, simple: Path) -> None:
    assert run(["run", str(simple), "--quiet", "--out", "there"]) == 0
    paths = [Path(line) for line in capsys.readouterr().out.splitlines()]
    assert paths[0] == Path("there/report.html")
    assert {path.name for path in paths} == LEFT
    assert all(path.is_file() for path in paths)


def test_the_same_case_again_replaces_its_own_results(simple: Path) -> None:
    assert run(["run", str(simple), "--quiet"]) == 0
    first = Path("outputs/simple/run/report.html").read_bytes()
    assert run(["run", str(simple), "--quiet"]) == 0
    assert Path("outputs/simple/run/report.html").read_bytes() == first


def test_another_case_needs_replace(capsys: Printed, simple: Path, case: Path) -> None:
    assert run(["run", str(simple), "--quiet", "--out", "there"]) == 0
    before = Path("there/manifest.json").read_bytes()
    capsys.readouterr()
    assert run(["run", str(case), "--quiet", "--out", "there"]) == 2
    assert "--replace" in capsys.readouterr().err
    assert Path("there/manifest.json").read_bytes() == before
    assert run(["run", str(case), "--quiet", "--out", "there", "--replace"]) == 0
    assert json.loads(Path("there/manifest.json").read_text())["case_file"] == "../bulb.toml"


def test_set_changes_the_case_and_is_recorded(simple: Path) -> None:
    assert run(["run", str(simple), "--quiet", "--set", "steps.s.k=2e-3 1/s"]) == 0
    summary = json.loads(Path("outputs/simple/run/summary.json").read_text())
    assert summary["gases"][0]["time_to_50_percent_s"] == pytest.approx(
        math.log(2) / 2e-3, rel=1e-7
    )
    manifest = json.loads(Path("outputs/simple/run/manifest.json").read_text())
    assert manifest["settings"] == {"steps.s.k": "2e-3 1/s"}
    assert manifest["command"] == "meanfree run simple.toml --set 'steps.s.k=2e-3 1/s'"
    assert manifest["case_sha256"] == summary["case_sha256"]
    assert run(["run", str(simple), "--quiet"]) == 0
    assert (
        json.loads(Path("outputs/simple/run/summary.json").read_text())["case_sha256"]
        != (summary["case_sha256"])
    )


def test_the_manifest_names_versions_work_and_drift(simple: Path) -> None:
    assert run(["run", str(simple), "--quiet"]) == 0
    manifest = json.loads(Path("outputs/simple/run/manifest.json").read_text())
    assert {"python", "meanfree", "numpy", "scipy"} <= set(manifest["versions"])
    assert manifest["solver"]["method"] == "Radau"
    assert manifest["solver"]["nfev"] > 0
    assert set(manifest["drift"]) == {
        "elements",
        "energy",
        "volume",
        "most_negative",
        "closed_form",
        "closed_form_difference",
    }
    assert manifest["drift"]["closed_form"] == "first order"
    assert manifest["drift"]["closed_form_difference"] < 1e-8
    assert set(manifest["files"]) == LEFT - {"manifest.json"} or set(manifest["files"]) == LEFT


def test_verify_states_the_difference_from_a_second_method(capsys: Printed, simple: Path) -> None:
    assert run(["run", str(simple), "--verify"]) == 0
    assert "Repeated with BDF at a relative tolerance of 1 × 10⁻⁹" in capsys.readouterr().out
    found = json.loads(Path("outputs/simple/run/summary.json").read_text())["verification"]
    assert found["method"] == "BDF"
    # BDF adds up about ten tolerances over a run
    assert 0 < found["largest_difference"] < 1e-7
    assert run(["run", str(simple), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["verification"] is None


def test_several_cases_at_once(capsys: Printed, simple: Path, case: Path) -> None:
    assert run(["run", str(simple), str(case), "--json", "--out", "both"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert [entry["title"] for entry in found] == ["One step", "Nitrosyl chloride"]
    assert names_in("both") == {"simple", "bulb"}


def test_two_cases_of_one_name_do_not_share_a_folder(
    capsys: Printed, tmp_path: Path, simple: Path
) -> None:
    (tmp_path / "other").mkdir()
    (tmp_path / "other" / "simple.toml").write_text(LABELS.format(title="Another"))
    assert run(["run", "simple.toml", "other/simple.toml"]) == 2
    assert capsys.readouterr().err == (
        "1 problem\n  CASE\n"
        "    found     other/simple.toml, whose results would also go to outputs/simple/run\n"
        "    expected  cases whose files have different names\n"
    )
    assert not (tmp_path / "outputs").exists()


def test_a_wrong_case_leaves_nothing(capsys: Printed, tmp_path: Path, simple: Path) -> None:
    (tmp_path / "wrong.toml").write_text(LABELS.format(title="x").replace("1 L", "1 parsec"))
    assert run(["run", str(simple), "wrong.toml", "--json"]) == 2
    out, err = capsys.readouterr()
    assert err == ""
    (problem,) = json.loads(out)["errors"]
    assert (problem["file"], problem["key"]) == ("wrong.toml", "vessel.volume")
    assert not (tmp_path / "outputs").exists()


def test_a_failed_integration_ends_with_1_and_leaves_nothing(
    capsys: Printed, tmp_path: Path
) -> None:
    # Second-order autocatalysis without an end: c grows to infinity at t = 1/(k c0) = 1000 s.
    text = LABELS.format(title="Blows up").replace("A -> B", "2 A -> 3 A")
    (tmp_path / "blow.toml").write_text(
        text.replace("1e-3 1/s", "1e-3 L/mol/s").replace('"A", "B"', '"A"')
        + '[run]\nuntil = "2000 s"\n'
    )
    assert run(["run", "blow.toml"]) == 1
    out, err = capsys.readouterr()
    assert out == ""
    assert "Radau" in err
    assert "Traceback" not in err
    assert not (tmp_path / "outputs").exists()


def test_a_hostile_title_does_not_reach_the_terminal(capsys: Printed, tmp_path: Path) -> None:
    title = "[bold]$x^2$ <script> \\u001b[31m red"
    (tmp_path / "hostile.toml").write_text(LABELS.format(title=title))
    status = run(["run", "hostile.toml"])
    out, err = capsys.readouterr()
    assert "\x1b" not in out + err
    if status == 0:  # a loader may refuse control characters instead
        assert "[bold]$x^2$ <script>" in out
        page = Path("outputs/hostile/run/report.html").read_text()
        assert "\x1b" not in page
        assert "<script" not in page


def test_run_needs_no_window_and_no_pandas(simple: Path) -> None:
    code = (
        "import sys\nfrom meanfree.cli.app import run\n"
        "status = run(['run', 'simple.toml', '--quiet'])\n"
        "slow = ('matplotlib.pyplot', 'pandas', 'numba', 'chemicals')\n"
        "print(status, [m for m in slow if m in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stderr.strip() == "0 []"


def test_no_place_of_this_machine_is_left(capsys: Printed, case: Path, tmp_path: Path) -> None:
    """A case named by its whole path: relative to the present folder, or by its bare name."""
    assert run(["run", str(tmp_path / "bulb.toml"), "--out", "here"]) == 0
    away = tmp_path / "away"
    away.mkdir()
    os.chdir(away)
    assert run(["run", str(tmp_path / "bulb.toml"), "--out", "there"]) == 0
    assert run(["equations", str(tmp_path / "bulb.toml"), "--out", "written"]) == 0
    for folder in (tmp_path / "here", away / "there", away / "written"):
        for file in ("manifest.json", "summary.json", "report.html"):
            for found in folder.glob(file):
                assert str(tmp_path) not in found.read_text(), found
    manifest = json.loads((tmp_path / "here" / "manifest.json").read_text())
    assert manifest["command"] == "meanfree run bulb.toml"
