"""`fit` and `compare` as a user meets them: folders, JSON, exit status, refusals, a new case."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest
from measured_runs import BUTADIENE, DATA, case_text, csv

from meanfree.cli.app import run

CASES = Path(__file__).parents[2] / "cases"
K = '[fit]\nparameters = ["steps.d.k"]\n'
PLAIN = case_text() + DATA + K


@pytest.fixture
def case(tmp_path, monkeypatch):
    """A folder to be in, and a way to write a case and its readings into it."""
    monkeypatch.chdir(tmp_path)

    def write(text=PLAIN, name="case.toml", **files):
        t, p = BUTADIENE
        for file, content in {"run": csv({"t": t, "p": p}), **files}.items():
            Path(f"{file}.csv").write_text(content, encoding="utf-8")
        Path(name).write_text(text, encoding="utf-8")
        return name

    return write


def failures(capsys, arguments):
    """The errors of a command line, as --json has them."""
    assert run([*arguments, "--json"]) == 2
    return json.loads(capsys.readouterr().out)["errors"]


def test_what_fit_says_and_leaves(case, capsys):
    assert run(["fit", case()]) == 0
    said = " ".join(capsys.readouterr().out.split())
    assert "k of d 0.8800 ± 0.0037 L/mol/min 95 %: 0.8720 to 0.8880; for loss of A" in said
    assert "0.4400 ± 0.0018 L/mol/min per event" in said
    folder = Path("outputs/case/fit")
    names = {path.name for path in folder.iterdir()}
    figures = {f"{name}.{end}" for name in ("fit", "profiles") for end in ("svg", "png")}
    tables = {"parameters.csv", "residuals.csv"}
    assert names == {"summary.json", "report.html", "manifest.json", *figures, *tables}
    rows = (folder / "residuals.csv").read_text().splitlines()
    assert rows[0] == "run,line,time_s,T_K,reading_SI,fitted_SI,sd_SI,residual_in_sd"
    assert len(rows) == 1 + len(BUTADIENE[0])
    page = (folder / "report.html").read_text()
    assert "http://" not in page.replace("http://www.w3.org", "")
    assert "<image" not in page  # the page's own policy would not show one


def test_json(case, capsys):
    assert run(["fit", case(), "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["schema"] == "meanfree-fit-1"
    k = found["parameters"]["steps.d.k"]
    assert k["value"] == pytest.approx(0.880, abs=5e-4)
    assert (k["unit"], k["counts"]) == ("L/mol/min", "loss of A")
    assert k["low"] < k["value"] - k["stderr"] < k["value"] < k["value"] + k["stderr"] < k["high"]
    assert {one["counts"] for one in found["rate_constants"]} == {"events", "loss of A"}
    assert found["order"]["candidates"][0]["name"] == "order 2"
    assert json.loads(Path("outputs/case/fit/summary.json").read_text()) == found


def test_quiet_prints_paths(case, capsys):
    assert run(["fit", case(), "--quiet"]) == 0
    lines = capsys.readouterr().out.split()
    assert lines[0] == "outputs/case/fit/report.html"
    assert all(Path(line).exists() for line in lines)


def test_textbook_line_beside_it(case, capsys):
    text = case_text() + DATA + K + 'weighting = "integrated-law line"\n'
    assert run(["fit", case(text), "--json"]) == 0
    line = json.loads(capsys.readouterr().out)["lines"][0]
    assert line["k_loss"] == pytest.approx(0.8659, abs=1e-4)
    assert line["k_per_event"] == pytest.approx(0.4330, abs=1e-4)


def test_a_new_case_with_the_fitted_values(case, capsys):
    text = case_text() + DATA + '[fit]\nparameters = ["steps.d.k", "fill.gases.A"]\n'
    assert run(["fit", case(text), "--write", "fitted.toml", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)["parameters"]
    written = Path("fitted.toml").read_text()
    assert "[[data]]" not in written
    assert "[fit]" not in written
    assert 'source = "fitted to run.csv"' in written
    assert 'k_counts = "loss of A"' in written
    k = re.search(r'^k = "(\S+) L/mol/min"$', written, re.M)
    p = re.search(r'A = "(\S+) mmHg"', written)
    assert k
    assert p
    # ten digits are written
    assert float(k.group(1)) == pytest.approx(found["steps.d.k"]["value"], rel=1e-9)
    assert float(p.group(1)) == pytest.approx(found["fill.gases.A"]["value"], rel=1e-9)
    assert run(["run", "fitted.toml", "--quiet"]) == 0
    capsys.readouterr()
    assert failures(capsys, ["fit", "case.toml", "--write", "fitted.toml"]) == [
        {
            "file": "",
            "key": "--write",
            "found": "fitted.toml, which is there",
            "expected": "another name, or --replace",
        }
    ]
    assert run(["fit", "case.toml", "--write", "fitted.toml", "--replace", "--quiet"]) == 0


def test_writing_over_the_case_is_refused(case, capsys):
    case()
    found = failures(capsys, ["fit", "case.toml", "--write", "case.toml", "--replace"])
    assert found[0]["found"] == "case.toml, the case itself"
    found = failures(capsys, ["fit", "case.toml", "--write", "case.txt"])
    assert found[0]["expected"] == "the name of a case file, ending in .toml"


def test_another_law_against_it(case, capsys):
    case()
    first = case_text("A -> B", 'law = "fixed"\nk = "0.01 1/min"').replace("A -> B", "A -> 0.5 B")
    case(first + DATA + K, name="first.toml")
    assert run(["fit", "case.toml", "--against", "first.toml", "--json"]) == 0
    ranking = json.loads(capsys.readouterr().out)["ranking"]
    assert [one["name"] for one in ranking] == ["case", "first"]
    assert ranking[1]["difference"] > 10
    case(case_text() + DATA.replace("mmHg", "torr") + K, name="other.toml")
    found = failures(capsys, ["fit", "case.toml", "--against", "other.toml"])
    assert found[0]["found"] == "other.toml, whose data are others"


@pytest.mark.parametrize(
    ("edits", "expected"),
    [
        (("DATA", ""), ("data", "nothing", "tables headed [[data]], each with a file of readings")),
        (
            ('file = "run.csv"', 'file = "../run.csv"'),
            (
                "data.0.file",
                '"../run.csv", which is outside the case file\'s folder',
                "a file inside the case file's folder, such as run1.csv",
            ),
        ),
        (
            ('file = "run.csv"', 'file = "/etc/passwd"'),
            (
                "data.0.file",
                '"/etc/passwd"',
                "a file inside the case file's folder, such as run1.csv",
            ),
        ),
        (
            ('file = "run.csv"', 'file = "none.csv"'),
            ("", "no such file", "a file beside the case file"),
        ),
        (
            ('is = "total pressure"', 'is = "pressure"'),
            (
                "data.0.signal.is",
                '"pressure"',
                'one of "total pressure", "partial pressure of …", "concentration of …", "number '
                'density of …", "conversion of …", "mole fraction of …", "absorbance", "rate '
                'constant of …" (did you mean "total pressure"?)',
            ),
        ),
        (
            ('is = "total pressure"', 'is = "partial pressure of D"'),
            ("data.0.signal.is", '"D", no gas of the case', 'one of "A", "B"'),
        ),
        (
            ('unit = "mmHg"', 'unit = "mol/L"'),
            (
                "data.0.signal.unit",
                '"mol/L"',
                'a unit of a pressure such as "50 torr"',
            ),
        ),
        (
            ('column = "p"', 'column = "q"'),
            (
                "the heading",
                '"q", which heads no column',
                'one of "t", "p", or a number',
            ),
        ),
        (
            ('"steps.d.k"', '"steps.d.q"'),
            ("fit.parameters.0", '"steps.d.q", an unknown address', "one of steps.d.k"),
        ),
        (
            ('"steps.d.k"', ""),
            ("fit.parameters", "nothing", 'what to find, such as ["steps.decomposition.k"]'),
        ),
    ],
)
def test_refusals(case, capsys, edits, expected):
    text = case_text() + DATA + K
    old, new = edits
    text = text.replace(DATA if old == "DATA" else old, new)
    (found,) = failures(capsys, ["fit", case(text)])
    assert (found["key"], found["found"], found["expected"]) == expected


def test_a_link_out_of_the_folder_is_refused(case, capsys, tmp_path_factory):
    name = case()
    outside = tmp_path_factory.mktemp("elsewhere") / "run.csv"
    outside.write_text("t,p\n0,1\n1,2\n")
    Path("run.csv").unlink()
    Path("run.csv").symlink_to(outside)
    (found,) = failures(capsys, ["fit", name])
    assert found["found"] == '"run.csv", which is outside the case file\'s folder'


def test_a_wrong_cell_names_file_line_and_column(case, capsys):
    (found,) = failures(capsys, ["fit", case(run="t,p\n0,632\n5,six\n10,592\n")])
    assert found == {
        "file": "run.csv",
        "key": "line 3, column p",
        "found": '"six"',
        "expected": "a number",
    }


def test_every_problem_at_once(case, capsys):
    text = case_text() + DATA.replace('unit = "min"', 'unit = "torr"') + DATA
    text += (
        '[data.conditions]\n"temperature.value" = "-5 K"\n[fit]\nparameters = ["x"]\nloss = "no"\n'
    )
    found = failures(capsys, ["fit", case(text)])
    keys = [one["key"] for one in found]
    assert "fit.loss" in keys
    text = text.replace('loss = "no"\n', "")
    found = failures(capsys, ["fit", case(text)])
    assert [one["key"] for one in found] == [
        "data.0.time.unit",
        "data.1.name",
        "data.1.conditions.temperature.value",
    ]


def test_a_fit_that_fails_ends_with_one(case, capsys):
    """Bounds that leave out every k for which the equations can be integrated in 200,000 steps."""
    text = case_text("2 A -> B", 'law = "arrhenius"\nA = "1e300 L/mol/s"\nEa = "0 kJ/mol"')
    text += DATA + '[fit]\nparameters = ["steps.d.A"]\nbounds = { "steps.d.A" = '
    text += '["1e299 L/mol/s", "1e303 L/mol/s"] }\n'
    status = run(["fit", case(text)])
    said = capsys.readouterr()
    assert status == 1
    assert "The fit failed" in said.err


def test_compare_with_readings_over_the_curves(capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    assert run(["compare", str(CASES / "dimer-runs.toml"), "--out", "here", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["schema"] == "meanfree-compare-1"
    assert found["kinetics"] == "as fitted"
    assert [one["name"] for one in found["scenarios"]] == [
        "as fitted",
        "collision theory, P = 1",
        "every collision reacts",
    ]
    P = found["steps"][0]["steric_factor"]
    # made up with A = 0.92e7 L/mol/s per event and 99.1 kJ/mol
    assert P["low"] < P["value"] < P["high"]
    assert 2e-5 < P["value"] < 5e-5
    names = {path.name for path in Path("here").iterdir()}
    assert {"compare.svg", "compare.png", "comparison.csv", "half_lives.csv"} <= names
    (error,) = failures(
        capsys, ["compare", str(CASES / "dimer-runs.toml"), "--out", "here", "--run", "cold"]
    )
    assert error["expected"] == "one of cool, middle, hot"


def test_shipped_runs_give_back_what_they_were_made_from(capsys, tmp_path, monkeypatch):
    """dimer-runs: A = 1.84e7 L/mol/s for loss, Ea = 99.1 kJ/mol, scatter 0.6 torr."""
    monkeypatch.chdir(tmp_path)
    assert run(["fit", str(CASES / "dimer-runs.toml"), "--out", "here", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    A, Ea = (found["parameters"][f"steps.dimerisation.{key}"] for key in ("A", "Ea"))
    assert A["low"] < 1.84e7 < A["high"]
    assert Ea["low"] < 99.1 < Ea["high"]
    assert 0.5 < found["reduced_chi_square"] < 1.7
    assert found["order"]["low"] < 2 < found["order"]["high"]
    (series,) = found["temperature_series"]
    assert series["Ea_J_per_mol"]["low"] < 99.1e3 < series["Ea_J_per_mol"]["high"]
    assert run(["fit", str(CASES / "peroxide-walls.toml"), "--out", "walls", "--json"]) == 0
    (wall,) = json.loads(capsys.readouterr().out)["walls"]
    # made up with 6e-4 1/s and 3.1e-5 m/s
    assert wall["k_gas_per_s"]["low"] < 6e-4 < wall["k_gas_per_s"]["high"]
    assert wall["wall_m_per_s"]["low"] < 3.1e-5 < wall["wall_m_per_s"]["high"]
