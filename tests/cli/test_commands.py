"""The commands start, check and schema, and how every command ends."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli import errors
from meanfree.cli.app import run
from meanfree.errors import ComputationError

ROOT = Path(__file__).parents[2]
Printed = pytest.CaptureFixture[str]


@pytest.fixture(autouse=True)
def somewhere_else(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


@pytest.fixture
def case(tmp_path: Path) -> Path:
    (tmp_path / "bulb.toml").write_text(GOOD)
    return Path("bulb.toml")


def test_a_started_case_passes_its_own_check(capsys: Printed, tmp_path: Path) -> None:
    assert run(["start", "bulb"]) == 0
    assert capsys.readouterr().out == (
        "bulb.toml is a case to edit. What it says now:  meanfree check bulb.toml\n"
    )
    assert run(["check", "bulb.toml"]) == 0
    assert "bulb.toml is understood: 4 gases, 1 step." in capsys.readouterr().out
    assert [path.name for path in tmp_path.iterdir()] == ["bulb.toml"]


def test_start_refuses_to_overwrite(capsys: Printed, case: Path) -> None:
    assert run(["start", "bulb.toml"]) == 2
    assert capsys.readouterr() == (
        "",
        "1 problem\n  NAME\n    found     bulb.toml, which exists already\n"
        "    expected  a name that is still free\n",
    )
    assert case.read_text() == GOOD


@pytest.mark.parametrize("name", ["", " ", "a\x1bb", "folder/"])
def test_start_refuses_what_is_no_name(name: str, capsys: Printed, tmp_path: Path) -> None:
    assert run(["start", name]) == 2
    assert capsys.readouterr().err.endswith("    expected  a name for the case, such as bulb\n")
    assert list(tmp_path.iterdir()) == []


def test_check_says_what_was_understood(capsys: Printed, case: Path) -> None:
    assert run(["check", str(case)]) == 0
    assert (
        capsys.readouterr().out
        == """\
Nitrosyl chloride
bulb.toml is understood: 4 gases, 1 step.

Vessel       rigid, 1.8 L
Temperature  isothermal, 480 K
Run          until it is done (auto); watching NOCl; Radau, rtol 1e-08

Fill
  gas    given     at filling, 296 K  at time zero, 480 K  amount
  NOCl   50 torr   6.666 kPa          10.81 kPa            4.876 mmol
  Ar     135 torr  18.00 kPa          29.19 kPa            13.16 mmol
  total            24.66 kPa          40.00 kPa            18.04 mmol

Gases
  NOCl  ClNO  CAS 2696-92-6   diameter 4.11 Å
  Ar    Ar    CAS 7440-37-1   diameter 3.54 Å
  NO    NO    CAS 10102-43-9  diameter 3.49 Å
  Cl2   Cl₂   CAS 7782-50-5   diameter 4.22 Å

Steps
  decomposition: 2 NOCl → 2 NO + Cl₂
    arrhenius: A = 9400000000 L/mol/s, Ea = 102 kJ/mol (counts each event)
    order 2 (2 in NOCl)

Assumed
  The gas is ideal and well mixed, and nothing leaks.
  Filled at 296 K, the vessel is brought to 480 K at time zero; nothing reacts before.
"""
    )


RICH = """
[[steps]]
name = "loss"
reaction = "Cl -> 0.5 Cl2"
law = "wall"
uptake = 0.01
area = "500 cm^2"

[[steps]]
name = "split"
reaction = "Cl2 + M -> 2 Cl + M"
law = "falloff"
k0 = { A = "1e-12 cm^3/s", Ea = "200 kJ/mol" }
kinf = { A = "1e15 1/s", Ea = "230 kJ/mol" }
broadening = "none"
partners = { Ar = 0.5, others = 2 }
uncertainty = { factor = 2 }
valid = ["400 K", "900 K"]

[[steps]]
name = "abstraction"
reaction = "Cl + NOCl -> Cl2 + NO"
law = "cross-section"
shape = "points"
points = [["0 kJ/mol", "0.1 nm^2"], ["50 kJ/mol", "0.2 nm^2"]]
beyond = "constant"

[[samples]]
at = "10 min"
volume = "5 mL"

[[samples]]
at = "1 h"
fraction = 0.1

[[flows]]
kind = "effusion"
hole = "0.01 mm^2"

[[flows]]
kind = "dilution"
rate = "1e-5 1/s"
entering = { Ar = 1 }
"""


def test_check_says_what_stands_beside_the_numbers(capsys: Printed, case: Path) -> None:
    case.write_text(GOOD.replace('"auto"', '"2 h"') + RICH)
    assert run(["check", str(case)]) == 0
    said = capsys.readouterr().out
    for line in (
        "    wall, form uptake only: uptake = 0.01, area = 500 cm² (counts each event)",
        "    M counts 0.5 for Ar, 2 for all others",
        "    k good to ×/÷ 2 at 1 standard deviation",
        "    found from 400 K to 900 K",
        "Samples\n  5 mL of gas drawn at 10 min\n  10 % of the gas drawn at 1 h\n",
        "Flows\n  effusion: each gas leaves through 0.01 mm², into vacuum\n"
        "  dilution: all gases leave alike, 1 × 10⁻⁵ 1/s, and Ar replaces them\n",
        "  The gas is ideal and well mixed, and nothing flows but what is stated.\n"
        "  Samples leave at once, as they are in the vessel, and do not come back.",
    ):
        assert f"{line}\n" in f"{said}\n", said
    assert "    cross-section, shape points, beyond constant: points.0.energy = 0 kJ/mol" in said
    assert "    falloff, broadening none: k0.A" in said
    assert "nothing leaks" not in said


def test_check_as_json(capsys: Printed, case: Path) -> None:
    assert run(["check", str(case), "--json", "--set", "fill.gases.Ar=200 torr"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["schema"] == "meanfree-check-1"
    assert summary["case"] == "bulb"
    assert [filled["given"] for filled in summary["fill"]] == ["50 torr", "200 torr"]
    # p = 250 torr x 480/296, by hand
    assert summary["initial_pressure_Pa"] == pytest.approx(250 * 101325 / 760 * 480 / 296, rel=1e-9)


def test_check_quietly(capsys: Printed, case: Path) -> None:
    assert run(["check", str(case), "--quiet"]) == 0
    assert capsys.readouterr().out == "bulb.toml\n"


def test_wrong_input_for_a_reader(capsys: Printed, case: Path, tmp_path: Path) -> None:
    case.write_text(GOOD.replace('"1.8 L"', '"1,8 L"').replace('value = "480 K"', "value = 480"))
    assert run(["check", str(case)]) == 2
    assert capsys.readouterr() == (
        "",
        "bulb.toml: 2 problems\n"
        "  vessel.volume\n"
        '    found     "1,8 L", with a comma in the number\n'
        '    expected  a volume such as "1.8 L" (a decimal point and no commas)\n'
        "  temperature.value\n"
        "    found     480, a bare number\n"
        '    expected  a temperature such as "480 K", in quotes and with its unit\n',
    )
    assert [path.name for path in tmp_path.iterdir()] == ["bulb.toml"]


def test_wrong_input_for_a_program(capsys: Printed) -> None:
    assert run(["check", "bulb.toml", "--json"]) == 2
    assert json.loads(capsys.readouterr().out) == {
        "errors": [
            {
                "file": "bulb.toml",
                "key": "",
                "found": "no such file",
                "expected": "the name of a case file",
            }
        ]
    }


@pytest.mark.parametrize(
    ("arguments", "where", "found", "expected"),
    [
        (
            ["chek", "x"],
            "meanfree",
            'an unknown command "chek"',
            '(did you mean "check"?)',
        ),
        (
            ["check", "x", "--jsn"],
            "meanfree check",
            "an unknown option --jsn",
            'what "meanfree check --help" lists (did you mean "--json"?)',
        ),
        (["check"], "meanfree check", "no CASE", "meanfree check CASE"),
        (["start"], "meanfree start", "no NAME", "meanfree start NAME"),
        (
            ["check", "x", "y", "z"],
            "meanfree check",
            "too many arguments: y z",
            'what "meanfree check --help" lists',
        ),
        (
            ["check", "x", "--set"],
            "meanfree",
            "--set without its value",
            'what "meanfree --help" lists',
        ),
        (
            ["check", "bulb.toml", "--set", "temperature.value"],
            "--set",
            '"temperature.value"',
            "ADDRESS=VALUE, such as temperature.value=500 K",
        ),
        (
            ["check", "bulb.toml", "--set", "a=1", "--set", "a=2"],
            "--set",
            "a set twice",
            "each address once",
        ),
    ],
)
def test_mistakes_on_the_command_line(
    arguments: list[str], where: str, found: str, expected: str, capsys: Printed
) -> None:
    assert run(arguments) == 2
    printed = capsys.readouterr()
    assert printed.out == ""
    lines = printed.err.splitlines()
    assert lines[1:3] == [f"  {where}", f"    found     {found}"]
    assert lines[3].startswith("    expected  ")
    assert lines[3].endswith(expected)


def test_control_characters_of_a_key_or_a_name_stay_text(capsys: Printed, case: Path) -> None:
    case.write_text('"a\\u001b[31m" = 1\n' + GOOD)
    assert run(["check", str(case)]) == 2
    assert run(["check", "a\x1b[31m.toml"]) == 2
    said = capsys.readouterr().err
    assert "\x1b" not in said
    assert "  a\\u001b[31m\n    found     an unknown key\n" in said
    assert "a\\u001b[31m.toml: 1 problem" in said


def test_no_arguments_are_answered_with_help(capsys: Printed) -> None:
    assert run([]) == 0
    assert capsys.readouterr().out.startswith("Usage: meanfree [OPTIONS] COMMAND")


def test_the_version(capsys: Printed) -> None:
    from importlib.metadata import version

    assert run(["--version"]) == 0
    assert capsys.readouterr().out == f"meanfree {version('meanfree')}\n"


def test_the_schema_is_the_one_beside_the_cases(capsys: Printed, tmp_path: Path) -> None:
    assert run(["schema"]) == 0
    text = capsys.readouterr().out
    assert text == (ROOT / "cases" / "case.schema.json").read_text(encoding="utf-8")
    assert run(["schema", "--out", "s.json", "--quiet"]) == 0
    assert capsys.readouterr().out == "s.json\n"
    assert (tmp_path / "s.json").read_text(encoding="utf-8") == text


def test_the_schema_knows_every_law_and_key() -> None:
    schema = json.loads((ROOT / "cases" / "case.schema.json").read_text(encoding="utf-8"))
    steps = [t for t in schema["$defs"].values() if "reaction" in t.get("properties", {})]
    assert {step["properties"]["law"]["const"] for step in steps} >= {
        "fixed",
        "arrhenius",
        "collision",
    }
    assert set(schema["required"]) == {"title", "vessel", "temperature", "fill", "steps"}
    assert all(step["additionalProperties"] is False for step in steps)


def raising(error: BaseException) -> errors.Callable[[], None]:
    def call() -> None:
        raise error

    return call


@pytest.mark.parametrize(
    ("error", "status", "said"),
    [
        (ComputationError("The integration failed."), 1, "The integration failed.\n"),
        (KeyboardInterrupt(), 130, "Interrupted.\n"),
        (MemoryError(), 1, "There is not enough memory for this.\n"),
    ],
)
def test_how_other_errors_end(
    error: BaseException, status: int, said: str, capsys: Printed
) -> None:
    assert errors.report_errors(raising(error), as_json=False) == status
    assert capsys.readouterr() == ("", said)


def test_an_unexpected_error_is_one_line(capsys: Printed) -> None:
    assert errors.report_errors(raising(ZeroDivisionError("a\nb")), as_json=False) == 1
    said = capsys.readouterr().err
    assert said.count("\n") == 1
    assert said.startswith("meanfree failed unexpectedly (ZeroDivisionError at test_commands.py,")
    assert "a b). This is a fault of the program: please report this line" in said


def test_a_reader_that_goes_away_is_no_error(case: Path) -> None:
    command = f'"{sys.executable}" -m meanfree check {case} | true; echo "${{PIPESTATUS[0]}}"'
    done = subprocess.run(["bash", "-c", command], capture_output=True, text=True, check=True)
    assert (done.stdout, done.stderr) == ("0\n", "")


CASES = sorted((ROOT / "cases").glob("*.toml"))


@pytest.mark.parametrize("file", CASES, ids=lambda file: file.stem)
def test_every_shipped_case_is_understood(file: Path, capsys: Printed) -> None:
    assert run(["check", str(file)]) == 0
    assert "is understood" in capsys.readouterr().out


@pytest.mark.parametrize("columns", ["1", "20", "47"])
def test_a_narrow_terminal_loses_no_number(
    columns: str, capsys: Printed, case: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Lines are left to the terminal to break where words cannot be: every word is there."""
    monkeypatch.setenv("COLUMNS", "200")
    assert run(["run", str(case)]) == 0
    wide = capsys.readouterr().out.split()
    monkeypatch.setenv("COLUMNS", columns)
    assert run(["run", str(case)]) == 0
    assert sorted(capsys.readouterr().out.split()) == sorted(wide)
