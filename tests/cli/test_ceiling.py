"""The command ceiling: what it prints, what it leaves, and how it ends."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest
from small_cases import GOOD

from meanfree.cli.app import run

Printed = pytest.CaptureFixture[str]

BACK = GOOD + 'reverse = "thermochemistry"\nvalid = ["400 K", "450 K"]\n'
SECOND = """
[[steps]]
name = "exchange"
reaction = "Br + HBr -> H + Br2"
law = "arrhenius"
A = "1e11 L/mol/s"
Ea = "140 kJ/mol"
reverse = "thermochemistry"
"""


@pytest.fixture(autouse=True)
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    Path("bulb.toml").write_text(BACK + SECOND)
    return Path("bulb.toml")


def test_it_says_what_is_suspect_first_and_leaves_a_folder(capsys: Printed, case: Path) -> None:
    assert run(["ceiling", str(case)]) == 0
    said = " ".join(capsys.readouterr().out.split())
    assert said.startswith("How close to the collision limit? Nitrosyl chloride exchange (reverse)")
    assert (
        "times its ceiling. The reverse is the forward rate constant over Kc: its barrier is"
        in said
    )
    folder = Path("outputs/bulb/ceiling")
    assert sorted(path.name for path in folder.iterdir()) == [
        *("ceiling.csv", "ceiling.png", "ceiling.svg"),
        *("ceiling_2.png", "ceiling_2.svg", "ceiling_curves.csv", "crossings.csv"),
        *("manifest.json", "report.html", "summary.json"),
    ]
    page = (folder / "report.html").read_text()
    assert page.count("<svg") == 2
    assert "http://" not in page.replace("http://www.w3.org/", "")
    assert "no encounter of two molecules" in page
    rows = list(csv.DictReader((folder / "ceiling.csv").read_text().splitlines()))
    assert [row["T_K"] for row in rows[:3]] == ["400", "425", "450"]
    assert rows[0]["step"] == "decomposition"
    assert rows[0]["verdict"] == "activated and hindered"
    curves = list(csv.DictReader((folder / "ceiling_curves.csv").read_text().splitlines()))
    assert float(curves[0]["T_K"]) == pytest.approx(400)
    assert float(curves[0]["k_m3_per_mol_s"]) == pytest.approx(
        float(rows[0]["k_m3_per_mol_s"]), rel=1e-9
    )


def test_json_is_the_summary_and_nothing_else(capsys: Printed, case: Path) -> None:
    assert run(["ceiling", str(case), "--json", "--between", "200 degC", "600 K"]) == 0
    summary = json.loads(capsys.readouterr().out)
    assert summary["schema"] == "meanfree-ceiling-1"
    assert summary["between_K"] == [473.15, 600.0]
    first = summary["encounters"][0]
    assert first["step"] == "decomposition"
    assert first["levels"][0]["outside_valid"]
    assert [level["is_run"] for level in first["levels"]] == [False, True, False]
    assert first["levels"][1]["T_K"] == 480.0
    # 9.4e9 exp(-102000/RT) L/mol/s at 480 K
    assert first["levels"][1]["k_m3_per_mol_s"] == pytest.approx(7.4728e-5, rel=1e-4)
    suspects = [one["step"] for one in summary["encounters"] if one["suspect"]]
    assert suspects == ["exchange (reverse)"]
    assert summary["left_out"] == [
        {"step": "decomposition (reverse)", "why": "no encounter of two molecules"}
    ]
    assert json.loads(Path("outputs/bulb/ceiling/summary.json").read_text()) == summary
    manifest = json.loads(Path("outputs/bulb/ceiling/manifest.json").read_text())
    assert manifest["command"] == "meanfree ceiling bulb.toml --between '200 degC' '600 K'"


def test_no_encounter_is_an_honest_answer(capsys: Printed) -> None:
    text = GOOD.replace("2 NOCl -> 2 NO + Cl2", "NOCl -> NO + 0.5 Cl2").replace("L/mol/s", "1/s")
    Path("first.toml").write_text(text)
    assert run(["ceiling", "first.toml"]) == 0
    assert "no step is an encounter with a known ceiling" in capsys.readouterr().out
    assert not Path("outputs/first/ceiling/ceiling.svg").exists()


@pytest.mark.parametrize(
    ("between", "errors"),
    [
        (
            ("300", "10 torr"),
            [("300", 'a temperature such as "480 K"'), ("torr", 'a temperature such as "480 K"')],
        ),
        (("600 K", "500 K"), [("600 K and then 500 K", "the lower temperature first")]),
        (("500 K", "500 K"), [("500 K and then 500 K", "the lower temperature first")]),
    ],
)
def test_wrong_temperatures(
    capsys: Printed, case: Path, between: tuple[str, str], errors: list[tuple[str, str]]
) -> None:
    assert run(["ceiling", str(case), "--json", "--between", *between]) == 2
    said = json.loads(capsys.readouterr().out)["errors"]
    assert [error["key"] for error in said] == ["--between"] * len(errors)
    for error, (found, expected) in zip(said, errors, strict=True):
        assert found in error["found"]
        assert error["expected"] == expected


def test_text_of_a_case_is_text_on_the_page(capsys: Printed) -> None:
    text = BACK.replace("Nitrosyl chloride", "<script>x</script>")
    Path("odd.toml").write_text(text.replace('"decomposition"', "\"a+(b) '^_^' [c]\""))
    assert run(["ceiling", "odd.toml", "--quiet"]) == 0
    folder = Path("outputs/odd/ceiling")
    page = (folder / "report.html").read_text()
    assert "<script>" not in page
    assert "&lt;script&gt;" in page
    assert "\na+(b) '^_^' [c]," in (folder / "ceiling.csv").read_text()
