"""All problems in one go: laws and files too; rates by pressures, steps that do nothing."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from small_cases import GOOD, LAW, edited, load_text

from meanfree.case import load_case
from meanfree.case.findings import MOST, Findings
from meanfree.case.text import DEEPEST
from meanfree.constants import R
from meanfree.errors import InputError
from meanfree.measured.delimited import content_of

TORR = 101325 / 760
DISPERSION = edited(GOOD, [(LAW, 'law = "capture"\nattraction = "dispersion"\n')])
DATA = """
[[data]]
file = "run.csv"
time = { column = "t", unit = "min" }
signal = { column = "p", unit = "torr", is = "total pressure" }
"""


def refused(folder: Path, text: str, *, files: bool = False) -> list[str]:
    """What is said of a case, without the name of its file."""
    (folder / "case.toml").write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as caught:
        load_case(folder / "case.toml", files=files)
    return [str(p).removeprefix(f"{folder / 'case.toml'}: ") for p in caught.value.problems]


@pytest.mark.parametrize(
    "slip", [('"1.8 L"', '"1,8 L"'), ('"50 torr"', '"50 tor"'), ('until = "auto"', "until = 3")]
)
def test_a_law_speaks_in_the_same_go_as_the_rest(slip: tuple[str, str], tmp_path: Path) -> None:
    alone = refused(tmp_path, DISPERSION)
    assert alone == [
        f"steps.decomposition.{key}.NOCl: found nothing; expected one for each partner, or C6"
        for key in ("polarisability", "ionisation_energy")
    ]
    both = refused(tmp_path, edited(DISPERSION, [slip]))
    assert both == [*refused(tmp_path, edited(GOOD, [slip])), *alone]


def test_a_wall_is_not_judged_by_a_vessel_that_was_refused(tmp_path: Path) -> None:
    wall = edited(GOOD, [(LAW, 'law = "wall"\nuptake = 0.1\n'), ("2 NOCl -> 2 NO", "NOCl -> NO")])
    wall = wall.replace("NO + Cl2", "NO + 0.5 Cl2")
    expected = "found nothing; expected an area here, or a shape under [vessel]"
    assert refused(tmp_path, wall) == [f"steps.decomposition.area: {expected}"]
    (only,) = refused(tmp_path, wall.replace('"1.8 L"', '"1,8 L"'))
    assert only.startswith("vessel.volume: ")


@pytest.mark.parametrize("text", ["NOCl -> NOCl", "NO + Ar -> Ar + NO", "Ar + M -> Ar + M"])
def test_a_step_that_does_nothing_is_refused(text: str, tmp_path: Path) -> None:
    said = refused(tmp_path, edited(GOOD, [("2 NOCl -> 2 NO + Cl2", text)]))
    assert said[0] == (
        f'steps.decomposition.reaction: found "{text}", which changes nothing; '
        "expected a step that uses up or forms a gas"
    )


def test_a_gas_on_both_sides_of_a_step_that_does_something_stays(tmp_path: Path) -> None:
    text = GOOD.replace("2 NOCl -> 2 NO + Cl2", "2 NOCl + Ar -> 2 NO + Cl2 + Ar")
    case = load_text(tmp_path, text.replace("L/mol/s", "L^2/mol^2/s"))
    assert case.experiment.steps[0].order == 3


@pytest.mark.parametrize(
    ("reaction", "text", "power"),
    [
        ("2 NOCl -> 2 NO + Cl2", "1e-5 1/torr/min", 1),
        ("2 NOCl + Ar -> 2 NO + Cl2 + Ar", "1e-7 torr^-2/min", 2),
    ],
)
def test_a_rate_constant_in_pressures(reaction: str, text: str, power: int, tmp_path: Path) -> None:
    """c = p/RT of an ideal gas: a rate in concentrations needs k (RT)^(order - 1)."""
    law = (LAW, f'law = "fixed"\nk = "{text}"\n')
    case = load_text(tmp_path, edited(GOOD, [law, ("2 NOCl -> 2 NO + Cl2", reaction)]))
    step = case.experiment.steps[0]
    k = step.law.rate_constant(case.experiment.context(step), 480.0)
    by_hand = float(text.split()[0]) / TORR**power / 60 * (R * 480) ** power
    assert k == pytest.approx(by_hand, rel=1e-12)  # rounding of a few products
    (note,) = [note for note in case.experiment.notes if "counts pressures" in note]
    assert f"times (RT)^{power} at 480 K" in note
    # the rate by pressures, -dp/dt = 2 k p^order, is the rate by concentrations times RT
    p = 50 * TORR
    rate = 2 * float(text.split()[0]) / TORR**power / 60 * p ** (power + 1)
    assert 2 * k * (p / (R * 480)) ** (power + 1) * R * 480 == pytest.approx(rate, rel=1e-12)


def test_a_zero_order_rate_and_a_table_in_pressures(tmp_path: Path) -> None:
    text = edited(GOOD, [(LAW, LAW + '[[steps]]\nname = "in"\nreaction = "-> Ar"\n'
                               'law = "source"\nrate = "3 mtorr/min"\n')])  # fmt: skip
    step = load_text(tmp_path, text).experiment.steps[1]
    case = load_text(tmp_path, text).experiment
    rate = step.law.rate_constant(case.context(step), 480.0)
    assert rate == pytest.approx(3e-3 * TORR / 60 / (R * 480), rel=1e-12)
    table = 'law = "table"\npoints = [["450 K", "1e-6 1/torr/s"], ["500 K", "4e-6 1/torr/s"]]\n'
    case = load_text(tmp_path, edited(GOOD, [(LAW, table)])).experiment
    step = case.steps[0]
    for T, k in ((450.0, 1e-6), (500.0, 4e-6)):
        found = step.law.rate_constant(case.context(step), T)
        assert found == pytest.approx(k / TORR * R * T, rel=1e-12)


@pytest.mark.parametrize(
    "edits",
    [
        [('A = "9.4e9 L/mol/s"', 'A = "9.4e9 1/torr/s"')],
        [(LAW, 'law = "fixed"\nk = "1e-5 1/torr/min"\n'),
         ('mode = "isothermal"\nvalue = "480 K"',
          'mode = "program"\npoints = [["0 s", "300 K"], ["1 min", "480 K"]]')],
    ],
    ids=["a factor", "a program"],
)  # fmt: skip
def test_pressures_are_refused_where_their_temperature_is_open(
    edits: list[tuple[str, str]], tmp_path: Path
) -> None:
    (said,) = refused(tmp_path, edited(GOOD, edits))
    assert ", in pressures; expected the same in concentrations: times (RT)^(order - 1)" in said


def test_check_reads_the_files_that_a_case_names(tmp_path: Path) -> None:
    inside = refused(tmp_path, GOOD + DATA, files=True)
    assert inside == ["run.csv: found no such file; expected a file beside the case file"]
    # with another slip, in the same go
    both = refused(tmp_path, GOOD.replace('"1.8 L"', '"1,8 L"') + DATA, files=True)
    assert both[0].startswith("vessel.volume: ")
    assert both[1:] == inside
    (tmp_path / "run.csv").write_text("t,p\n0,50\n1,x\n2,-1\n")
    assert refused(tmp_path, GOOD + DATA, files=True) == [
        'run.csv: line 3, column p: found "x"; expected a number'
    ]
    (tmp_path / "run.csv").write_text("t,p\n0,50\n1,60\n2,65\n")
    assert load_case(tmp_path / "case.toml", files=True).data
    sweep = '\n[sweep]\nfile = "rows.csv"\n'
    assert refused(tmp_path, GOOD + DATA + sweep, files=True) == [
        "sweep.file: rows.csv: found no such file; expected a file beside the case file"
    ]
    load_case(tmp_path / "case.toml")  # whoever needs no files does not ask for them


def test_a_fit_without_data_is_found_by_check(tmp_path: Path) -> None:
    said = refused(tmp_path, GOOD + '[fit]\nparameters = ["steps.decomposition.A"]\n', files=True)
    assert said[0].startswith("data: found nothing; expected tables headed [[data]]")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="a system without named pipes")
def test_pipes_devices_and_folders_are_no_readings(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe")
    (tmp_path / "loop").symlink_to("loop")
    said = {
        "pipe": "found something that is no file; expected a file of readings",
        "/dev/zero": "found something that is no file; expected a file of readings",
        "": "found a folder; expected a file of readings",
        "nothing": "found no such file; expected a file beside the case file",
        "x"
        * 300: "found what cannot be read (File name too long); expected a file that can be read",
    }
    for name, message in said.items():
        assert str(content_of(tmp_path / name)) == message
    assert not isinstance(content_of(tmp_path / "loop"), bytes)


@pytest.mark.parametrize(
    ("name", "found"),
    [
        ("...toml", "a name of dots alone"),  # its results would go to outputs/../run
        ("..toml", "a name of dots alone"),
        ("a\nb.toml", "a name that cannot be printed"),
        ("a\x1b[2J.toml", "a name that cannot be printed"),
        ("\udcff.toml", "a name that cannot be printed"),
    ],
)
def test_a_case_has_a_name_that_results_can_bear(name: str, found: str, tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        load_case(tmp_path / name)
    assert caught.value.problems[0].found == found


def test_reading_stops_at_many_problems() -> None:
    findings = Findings()
    for n in range(MOST):
        findings.wrong(f"k{n}", "x", "y")
        findings.wrong(f"k{n}", "x", "y")
    with pytest.raises(InputError) as caught:
        findings.wrong("one more", "x", "y")
    assert len(caught.value.problems) == MOST + 1
    assert str(caught.value.problems[-1]) == (
        f"found more than {MOST} problems; expected these mended first"
    )


def test_long_keys_are_shortened() -> None:
    findings = Findings()
    findings.wrong("x" * 10**6, "a", "b")
    assert findings.problems[0].key == "x" * 160 + "… (1000000 characters)"


def test_tables_are_not_walked_without_end(tmp_path: Path) -> None:
    dotted = ".".join(["a"] * (DEEPEST + 1))
    assert refused(tmp_path, f"{dotted} = 1\n{GOOD}")[0].startswith(
        "found tables or lists nested too deeply to read"
    )
    assert refused(tmp_path, f"a.a.a = 1\n{GOOD}")[0].startswith("a: found an unknown key")


def test_less_than_a_molecule(tmp_path: Path) -> None:
    """185 torr at 296 K are 6.04e18 molecules/cm^3 (n = p/kT)."""
    said = refused(tmp_path, GOOD.replace("1.8 L", "1e-19 cm^3"))
    assert said == [
        "fill: found a fill of 0.604 molecules in all; "
        "expected at least one; rate laws need a great many"
    ]
    assert load_text(tmp_path, GOOD.replace("1.8 L", "2e-19 cm^3")).experiment.steps


def test_a_fill_out_of_all_bounds(tmp_path: Path) -> None:
    """50 torr read at 1e-20 K are 4.8e25 torr at 480 K."""
    said = refused(tmp_path, GOOD.replace('at = "296 K"', 'at = "1e-20 K"'))
    assert said == [
        "fill: found a fill that has 1.18e+27 Pa at time zero; expected at most 1e+12 Pa"
    ]
