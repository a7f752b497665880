"""The command size: its options, what it prints and leaves, and how it ends."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]
CASE = GOOD + 'reverse = "thermochemistry"\nuncertainty = { factor = 1.5 }\n'


@pytest.fixture(autouse=True)
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    Path("bulb.toml").write_text(CASE)
    return Path("bulb.toml")


def test_a_temperature_for_a_conversion_in_a_time(capsys: Printed, case: Path) -> None:
    options = ["--conversion", "25 %", "--within", "20 min"]
    options += ["--vary", "temperature.value", "--between", "200 degC", "520 K"]
    assert run(["size", str(case), *options, "--json"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["schema"] == "meanfree-size-1"
    assert summary["low"] == pytest.approx(473.15)
    (root,) = summary["roots"]
    assert root["unit"] == "K"
    assert root["time_s"] == pytest.approx(1200.0, rel=1e-8)
    # Run there: the time is the one that was asked for.
    assert (
        run(
            [
                "size",
                str(case),
                "--conversion",
                "0.25",
                "--json",
                "--set",
                f"temperature.value={root['value']:.10f} K",
                "--replace",
            ]
        )
        == 0
    )
    again = json.loads(capsys.readouterr().out)
    assert again["time_s"] == pytest.approx(1200.0, rel=1e-8)
    assert again["roots"] == []


def test_what_it_says_and_leaves(capsys: Printed, case: Path) -> None:
    options = ["--conversion", "0.8", "--within", "20 min"]
    options += ["--vary", "temperature.value", "--between", "440 K", "520 K"]
    assert run(["size", str(case), *options]) == 0  # an honest "no such temperature"
    said = " ".join(capsys.readouterr().out.split())
    assert said.startswith("80 % of NOCl: Nitrosyl chloride 80 % of NOCl in 20 min no temperature")
    assert "between 440.00 K and 520.00 K nearest at 520.00 K" in said
    assert "equilibrium stops it at 5" in said
    folder = Path("outputs/bulb/size")
    assert sorted(path.name for path in folder.iterdir()) == [
        *("manifest.json", "progress.png", "progress.svg", "report.html"),
        *("sizing.csv", "sizing.png", "sizing.svg", "summary.json"),
    ]
    manifest = json.loads((folder / "manifest.json").read_text())
    assert manifest["command"] == (
        "meanfree size bulb.toml --conversion 0.8 --within '20 min' --vary temperature.value "
        "--between '440 K' '520 K'"
    )
    assert (folder / "sizing.csv").read_text().startswith("value,unit,time_s,conversion_within\n")


def test_sensitivity_and_uncertainty(capsys: Printed, case: Path) -> None:
    options = ["--conversion", "0.2", "--sensitivity", "--uncertainty", "--runs", "16"]
    assert run(["size", str(case), *options, "--json"]) == 0
    summary = json.loads(capsys.readouterr().out)
    by_k = next(
        entry
        for entry in summary["sensitivities"]
        if entry["answer"] == "reaction time" and entry["input"] == "decomposition"
    )
    assert by_k["value"] == pytest.approx(-1.0, abs=1e-6)  # forward and reverse scale alike
    low, _, middle, _, high = summary["uncertainty"]["time_quantiles_s"]
    assert low < middle < high
    # A factor of 1.5 is one standard deviation of ln t: about 2 x 1.96 of them across.
    assert high / low == pytest.approx(1.5**3.92, rel=0.4)
    folder = Path("outputs/bulb/size")
    assert (folder / "bands.csv").is_file()
    assert (folder / "sensitivities.csv").is_file()


def test_a_yield(capsys: Printed, case: Path) -> None:
    assert run(["size", str(case), "--yield", "0.1", "--of", "Cl2", "--json"]) == 0
    by_yield = json.loads(capsys.readouterr().out)
    assert run(["size", str(case), "--conversion", "0.2", "--json"]) == 0
    by_conversion = json.loads(capsys.readouterr().out)
    assert by_yield["goal"]["basis"] == "NOCl"
    assert by_yield["time_s"] == pytest.approx(by_conversion["time_s"], rel=1e-8)


@pytest.mark.parametrize(
    ("options", "key", "found", "expected"),
    [
        (
            ["--conversion", "1.2"],
            "--conversion",
            "1.2",
            "a fraction of at most 1",
        ),
        (["--conversion", "0.2", "--of", "Ar"], "--of", '"Ar"', "one of NOCl"),
        (["--yield", "0.2"], "--of", "nothing beside --yield", "the gas that is to form"),
        (
            ["--vary", "temperature.value"],
            "--vary",
            "--vary alone",
            "--vary ADDRESS and --between LOW HIGH together",
        ),
        (
            ["--vary", "temperature.value", "--between", "400 K", "500 K"],
            "--within",
            "nothing beside --vary",
            'a time such as "8 h", or patience under [plan]',
        ),
        (
            ["--within", "1 h", "--vary", "temperature.value", "--between", "400 K", "5 torr"],
            "--between",
            '"5 torr", a pressure',
            'a temperature such as "480 K"',
        ),
        (
            ["--within", "1 h", "--vary", "temperature.valu", "--between", "400 K", "5 K"],
            "--vary",
            '"temperature.valu"',
            '"temperature.value"',
        ),
        (
            ["--within", "1 K"],
            "--within",
            '"1 K", a temperature',
            'a time such as "10 min"',
        ),
        (
            ["--runs", "100"],
            "--runs",
            "100",
            "a power of two from 16 to 1048576",
        ),
    ],
)
def test_wrong_options(
    options: list[str], key: str, found: str, expected: str, capsys: Printed, case: Path
) -> None:
    assert run(["size", str(case), *options, "--json"]) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert (problem["key"], problem["found"], problem["expected"]) == (key, found, expected)
    assert not Path("outputs").exists()


def test_uncertainty_without_any_is_refused(capsys: Printed) -> None:
    Path("sure.toml").write_text(GOOD)
    assert run(["size", "sure.toml", "--uncertainty", "--json"]) == 2
    (problem,) = json.loads(capsys.readouterr().out)["errors"]
    assert problem["found"] == "no uncertainty in the case"
