"""The command sweep: what it says and leaves, how it is stopped and taken up again."""

from __future__ import annotations

import json
import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
from sweeps import CASE, contents, write_case

import meanfree
from meanfree.case import load_case
from meanfree.cli.app import run
from meanfree.integrate.single import integrate

Printed = pytest.CaptureFixture[str]

GRID = """
[sweep]
observables = ["reaction time of A to 50 %", "conversion of A", "concentration of B at 100 s"]

[sweep.vary]
"temperature.value" = { between = ["480 K", "520 K"], points = 3 }
"fill.gases.A" = { values = ["20 torr", "0.1 bar"] }
"""


@pytest.fixture(autouse=True)
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_a_grid(here: Path, capsys: Printed) -> None:
    Path("grid.toml").write_text(CASE + GRID)
    assert run(["sweep", "grid.toml"]) == 0
    printed = capsys.readouterr()
    said = " ".join(printed.out.split())
    assert said.startswith(
        "6 conditions: Dimerisation Conditions 6 grid over temperature, A filled"
    )
    assert "Failed none" in said
    assert "Observable reached lowest median highest" in said
    assert max(len(line) for line in printed.out.splitlines()) <= 80
    assert printed.err == ""  # no terminal, no progress
    folder = Path("outputs/grid/sweep")
    assert sorted(path.name for path in folder.iterdir()) == [
        *("manifest.json", "map.png", "map.svg", "map_2.png", "map_2.svg", "observables.csv"),
        *("parts", "report.html", "summary.json", "sweep.json"),
    ]
    manifest = json.loads((folder / "manifest.json").read_text())
    assert "parts/part-000000.parquet" in manifest["files"]
    assert manifest["command"] == "meanfree sweep grid.toml"
    assert not Path("outputs/grid/sweep.unfinished").exists()
    frame = meanfree.read_sweep(folder)
    assert frame["temperature.value_K"].tolist() == [480, 480, 500, 500, 520, 520]
    assert frame["fill.gases.A_torr"].tolist()[:2] == pytest.approx([20, 0.1e5 / 101325 * 760])
    # the fifth condition by the other integrator: Radau at rtol 1e-8 is good to about 1e-9, the
    # kernel's control of the error to about 1e-7
    alone = integrate(
        load_case("grid.toml", {"temperature.value": "520 K", "fill.gases.A": "20 torr"}).experiment
    )
    assert frame["X_A"][4] == pytest.approx(alone.conversion("A", 300.0)[0], rel=1e-6)
    assert frame["reaction_time_A_0.5_s"][4] == pytest.approx(
        alone.reaction_time("A", 0.5), rel=1e-6
    )


def test_the_summary(capsys: Printed) -> None:
    Path("grid.toml").write_text(CASE + GRID)
    assert run(["sweep", "grid.toml", "--json"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary == json.loads(Path("outputs/grid/sweep/summary.json").read_text())
    assert summary["schema"] == "meanfree-sweep-1"
    assert summary["design"] == {
        "kind": "grid",
        "points": {"temperature.value": 3, "fill.gases.A": 2},
    }
    assert (summary["conditions"], summary["failed"], summary["parts"]) == (6, 0, 1)
    assert summary["endings"] == [
        {"ending": "reached the stated time", "conditions": 6, "failed": False}
    ]
    frame = meanfree.read_sweep("outputs/grid/sweep")
    for entry in summary["observables"]:
        column = frame[entry["column"]].dropna()
        assert entry["reached"] == len(column)
        assert (entry["lowest"], entry["highest"]) == (column.min(), column.max())
        # classes are 0.1 % wide
        middle = column.quantile(0.5, interpolation="lower")
        assert entry["median"] == pytest.approx(middle, rel=6e-4)


def test_a_list(capsys: Printed) -> None:
    Path("list.toml").write_text(CASE + '\n[sweep]\nfile = "rows.csv"\n')
    Path("rows.csv").write_text(
        "# a comment\ntemperature.value [degC],fill.gases.A (Pa)\n220,5000\n230,6000\n200,7000\n"
    )
    assert run(["sweep", "list.toml", "--quiet"]) == 0
    written = capsys.readouterr().out.split()
    assert written[0] == "outputs/list/sweep/report.html"
    assert all(Path(path).exists() for path in written)
    frame = meanfree.read_sweep("outputs/list/sweep")
    np.testing.assert_allclose(frame["temperature.value_K"], [493.15, 503.15, 473.15], rtol=1e-14)
    torr = np.array([5000, 6000, 7000]) / 101325 * 760
    np.testing.assert_allclose(frame["fill.gases.A_torr"], torr, rtol=1e-14)
    assert list(frame.columns)[3:] == ["half_life_A_1_s", "X_A", "p_total_Pa", "end_s", "ending"]


def test_options_in_place_of_the_table(capsys: Printed) -> None:
    write_case(Path.cwd(), samples=64)
    options = [
        "--vary",
        "temperature.value=480 K..500 K",
        "--vary",
        "steps.two.k=1 L/mol/s..4 L/mol/s;log",
    ]
    options += ["--observe", "mole fraction of B at 1 min", "--samples", "32", "--seed", "9"]
    assert run(["sweep", "case.toml", *options, "--json"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["design"] == {"kind": "quasi-random", "samples": 32, "seed": 9}
    frame = meanfree.read_sweep("outputs/case/sweep")
    assert list(frame.columns) == [
        *("index", "temperature.value_K", "steps.two.k_L_per_mol_per_s"),
        *("y_B_at_60_s", "ending"),
    ]
    assert frame["temperature.value_K"].between(480, 500).all()
    manifest = json.loads(Path("outputs/case/sweep/manifest.json").read_text())
    assert manifest["command"].startswith("meanfree sweep case.toml --samples 32 --seed 9 --vary ")


def test_failures_are_counted_listed_and_no_error(capsys: Printed) -> None:
    path = write_case(Path.cwd())
    path.write_text(path.read_text().replace('mean = "40 torr"', 'mean = "10 torr"'))
    assert run(["sweep", "case.toml", "--json"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["failed"] == sum(e["conditions"] for e in summary["endings"] if e["failed"]) > 20
    lines = Path("outputs/case/sweep/failures.csv").read_text().splitlines()
    assert len(lines) == summary["failed"] + 1
    assert lines[0].endswith(",ending")
    assert all("fill.gases.A is not a number" in line for line in lines[1:])
    page = Path("outputs/case/sweep/report.html").read_text()
    assert "of the conditions failed; the numbers here are of the others." in page


def test_the_same_again_and_another_sweep(capsys: Printed) -> None:
    write_case(Path.cwd(), samples=32)
    assert run(["sweep", "case.toml", "--quiet"]) == 0
    first = contents(Path("outputs"))
    assert run(["sweep", "case.toml", "--quiet"]) == 0
    assert contents(Path("outputs")) == first
    capsys.readouterr()
    other = ["sweep", "case.toml", "--set", "vessel.volume=3 L", "--json"]
    assert run(other) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert problem["key"] == "--out"
    assert problem["found"].endswith(
        "which holds a sweep that cannot be taken up: the case differs"
    )
    assert contents(Path("outputs")) == first
    assert run([*other, "--replace"]) == 0
    assert contents(Path("outputs")) != first


@pytest.mark.parametrize(
    ("table", "key", "found", "expected"),
    [
        ("[sweep]", "sweep.vary", "nothing",
         'such as "temperature.value" = { between = ["400 K", "600 K"] }'),
        ('[sweep]\nsamples = 100\n[sweep.vary]\n"vessel.volume" = { between = ["1 L", "2 L"] }',
         "sweep.samples", "100", "a power of two, such as 64 or 128"),
        ('[sweep.vary]\n"vessel.volum" = { between = ["1 L", "2 L"] }',
         "sweep.vary.vessel.volum", "an unknown address", '"vessel.volume"'),
        ('[sweep.vary]\n"vessel.volume" = { between = ["2 L", "1 L"] }',
         "sweep.vary.vessel.volume.between", "2 to 1", "the lower value first"),
        ('[sweep.vary]\n"vessel.volume" = { between = ["1 L", "300 K"] }',
         "sweep.vary.vessel.volume.between.1", '"300 K", a temperature',
         'a volume such as "1.8 L"'),
        ('[sweep.vary]\n"vessel.volume" = { sd = "1 L" }',
         "sweep.vary.vessel.volume", "a normal spread in a grid",
         'values, between, or design = "quasi-random"'),
        ('[sweep.vary]\n"vessel.volume" = { values = ["1 L", "1000 mL"] }',
         "sweep.vary.vessel.volume.values", "the same value twice", "each once"),
        ('[sweep.vary]\n"vessel.volume" = { values = [] }',
         "sweep.vary.vessel.volume.values", "an empty list", "at least one value"),
        ('[sweep.vary]\n"vessel.volume" = { values = ["1 L"], points = 3 }',
         "sweep.vary.vessel.volume", "points or spacing beside values",
         "values alone, or between"),
        ('[sweep.vary]\n"vessel.volume" = { between = ["1 L", "2 L"], points = 2.5 }',
         "sweep.vary.vessel.volume.points", "2.5", "a whole number"),
        ('[sweep.vary]\n"vessel.volume" = { between = ["1 L"] }',
         "sweep.vary.vessel.volume.between", "1 values",
         'two values, such as ["400 K", "600 K"]'),
        ('[sweep.vary]\n"vessel.volume" = { between = ["0 L", "2 L"] }',
         "sweep.vary.vessel.volume.between.0", '"0 L"', "a volume above 0 m^3"),
        ('[sweep.vary]\n"fill.gases.A" = { between = ["0 torr", "2 torr"], spacing = "log" }',
         "sweep.vary.fill.gases.A.between", '0 with spacing = "log"', "values above 0"),
        ('[sweep]\nsamples = 64\n[sweep.vary]\n"vessel.volume" = { values = ["1 L"] }',
         "sweep.vary.vessel.volume", "values or points in a quasi-random design",
         "between, or a mean and an sd"),
        ('[sweep]\nsamples = 64\n[sweep.vary]\n"vessel.volume" = { mean = "1 L" }',
         "sweep.vary.vessel.volume", "a normal spread with a range or without sd",
         "sd, and mean if you like"),
        ('[sweep]\nsamples = 64\n[sweep.vary]\n"temperature.value" = { sd = "0 K" }',
         "sweep.vary.temperature.value.sd", '"0 K"', "a standard deviation above 0"),
        ('[sweep]\nsamples = 64\nfile = "bad.csv"\ndesign = "quasi-random"',
         "sweep.file", "file beside a quasi-random", "another design, or no file"),
        ('[sweep]\ndesign = "list"', "sweep.file", "nothing", 'file = "conditions.csv"'),
        ('[sweep]\nfile = "absent.csv"', "sweep.file: absent.csv", "no such file",
         "a file beside the case file"),
        ('[sweep]\nfile = "twice.csv"', "sweep.file: twice.csv", '"fill.at" a second time',
         "each once"),
        ('[sweep]\nfile = "cold.csv"', "sweep.file: cold.csv, column fill.at", "0 K",
         "a number above 0"),
        ('[sweep]\nobservables = []', "sweep.observables", "none", "from 1 to 200 observables"),
        ('[sweep]\nobservables = ["volume", "volume"]', "sweep.observables.1",
         '"volume" a second time', "each once"),
        ('[sweep]\nobservables = ["40th half-life of A"]', "sweep.observables.0",
         '"40th half-life of A"', "a half-life from the 1st to the 30th"),
        ('[sweep]\nobservables = ["reaction time of A to 100 %"]', "sweep.observables.0",
         '"100 %"', "a conversion between 0 and 1"),
        ('[sweep.vary]\n"vessel.volume" = { }',
         "sweep.vary.vessel.volume", "neither values nor between", "values or between"),
        ('[sweep]\nfile = "../rows.csv"', "sweep.file",
         '"../rows.csv", which is outside the case file\'s folder',
         "a file inside the case file's folder, such as conditions.csv"),
        ('[sweep]\nfile = "bad.csv"', "sweep.file: bad.csv, line 2, column fill.at [K]", '"warm"',
         "a number"),
        ('[sweep]\nfile = "bare.csv"', "sweep.file: bare.csv",
         'a column headed "fill.at"', 'the unit of the column too, such as "fill.at [K]"'),
        ('[sweep]\nobservables = ["half-life of X"]\n[sweep.vary]\n'
         '"fill.at" = { values = ["3 K"] }',
         "sweep.observables.0", '"X"', "a filled gas: one of A, C"),
        ('[sweep]\nobservables = ["end", "temperature at 0 s"]\n[sweep.vary]\n'
         '"fill.at" = { values = ["3 K"] }', "sweep.observables.1", '"0 s"',
         "a time above 0 s"),
    ],
)  # fmt: skip
def test_wrong_tables(table: str, key: str, found: str, expected: str, capsys: Printed) -> None:
    Path("bad.csv").write_text("fill.at [K]\nwarm\n")
    Path("bare.csv").write_text("fill.at\n300\n")
    Path("twice.csv").write_text("fill.at [K],fill.at [degC]\n300,20\n")
    Path("cold.csv").write_text("fill.at [K]\n300\n0\n")
    Path("case.toml").write_text(f"{CASE}\n{table}\n")
    assert run(["sweep", "case.toml", "--json"]) == 2
    problems = json.loads(capsys.readouterr().out)["errors"]
    entries = {p["key"]: (p["found"], p["expected"]) for p in problems}
    assert entries[key] == (found, expected)
    assert all(p["file"] == "case.toml" for p in problems)
    assert not Path("outputs").exists()


@pytest.mark.parametrize(
    ("options", "key", "found"),
    [
        (["--engine", "cloud"], "--engine", '"cloud"'),
        (["--engine", "dask"], "--scheduler", "nothing beside --engine dask"),
        (["--scheduler", "tcp://a:1"], "--scheduler", "a scheduler alone"),
        (["--workers", "0"], "--workers", "0"),
        (["--design", "random"], "--design", '"random"'),
        (["--vary", "vessel.volume"], "--vary", '"vessel.volume"'),
        (["--vary", "vessel.volume=1 L..2 L;cubic"], "--vary",
         '"cubic" in "vessel.volume=1 L..2 L;cubic"'),
    ],
)  # fmt: skip
def test_wrong_options(options: list[str], key: str, found: str, capsys: Printed) -> None:
    write_case(Path.cwd())
    assert run(["sweep", "case.toml", *options, "--json"]) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert (problem["key"], problem["found"]) == (key, found)
    assert not Path("outputs").exists()


WAIT_S = 120.0
COMMAND = [sys.executable, "-m", "meanfree", "sweep", "case.toml", "--workers", "2"]


def parts_there(folder: Path) -> int:
    return len(list(folder.glob("part-*.parquet")))


def started(parts: int) -> subprocess.Popen[bytes]:
    """The command in a process of its own, once so many parts are finished."""
    process = subprocess.Popen(
        COMMAND,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        # tests themselves may have been started with Ctrl-C ignored, which is inherited
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )
    begun = time.monotonic()
    while parts_there(Path("outputs/case/sweep.unfinished")) < parts and process.poll() is None:
        assert time.monotonic() - begun < WAIT_S
        time.sleep(0.005)
    return process


@pytest.mark.slow
def test_killed_at_random_moments_and_resumed(here: Path, size: str) -> None:
    """SIGKILL again and again, then left alone: the same bytes as without."""
    kills = 2 if size == "small" else 20
    write_case(here, samples=1024, part=16)
    rng, finished = random.Random(4), 0
    for _ in range(kills):
        process = started(finished + rng.randint(1, 2))
        time.sleep(0.1 * rng.random())
        process.kill()
        process.communicate()
        before, finished = finished, parts_there(Path("outputs/case/sweep.unfinished"))
        assert before < finished < 64
        assert not Path("outputs/case/sweep").exists()
    assert run(["sweep", "case.toml", "--quiet"]) == 0
    killed = contents(Path("outputs"))
    assert run(["sweep", "case.toml", "--quiet", "--replace"]) == 0
    assert contents(Path("outputs")) == killed


def test_interrupted(here: Path) -> None:
    write_case(here, samples=1024, part=16)
    process = started(2)
    process.send_signal(signal.SIGINT)
    _, said = process.communicate(timeout=WAIT_S)
    assert process.returncode == 130
    kept = parts_there(Path("outputs/case/sweep.unfinished"))
    folder = os.path.realpath("outputs/case/sweep.unfinished")
    assert said.decode() == (
        f"{kept} of 64 parts are kept in {folder}. The same command goes on from there.\n"
        "Interrupted.\n"
    )
