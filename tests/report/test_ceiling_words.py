"""What is said of a rate constant that nothing explains, and where a crossing lies."""

from __future__ import annotations

from pathlib import Path

import pytest
from small_cases import load_text

from meanfree.planning.ceiling import Crossing, StepCeiling, ceiling_table
from meanfree.report.ceiling import sheets
from meanfree.report.ceiling.naming import crossing, crossings, unit_of, wrongs

CASE = """title = "A pair"

[vessel]
holds = "volume"
volume = "1 L"

[temperature]
mode = "isothermal"
value = "500 K"

[fill]
gases = { K = "1 torr", Br2 = "1 torr" }

[gases.K]
diameter = "4.6 angstrom"
[gases.Br2]
diameter = "4.3 angstrom"

[[steps]]
name = "harpoon"
reaction = "K + Br2 -> KBr + Br"
law = "arrhenius"
A = "1e12 L/mol/s"
Ea = "0 kJ/mol"
"""


def one_of(folder: Path, *edits: tuple[str, str]) -> StepCeiling:
    text = CASE
    for old, new in edits:
        assert text.count(old) == 1
        text = text.replace(old, new)
    return ceiling_table(load_text(folder, text).experiment).steps[0]


def test_what_lacks_for_an_explanation_is_said(tmp_path: Path) -> None:
    (said,) = wrongs(one_of(tmp_path))
    assert said.startswith("harpoon at 400 K asks for 5.14 times its ceiling. A long-range attr")
    assert "(polarisability of K and Br2 not known; ionisation energy of K and Br2 not" in said


def test_a_harpoon_is_thought_of_where_dispersion_does_not_do(tmp_path: Path) -> None:
    pull = ("polarisability", "ionisation_energy")
    given = [
        ('"4.6 angstrom"', f'"4.6 angstrom"\n{pull[0]} = "43 angstrom^3"\n{pull[1]} = "4.34 eV"'),
        ('"4.3 angstrom"', f'"4.3 angstrom"\n{pull[0]} = "7 angstrom^3"\n{pull[1]} = "10.5 eV"'),
    ]
    (said,) = wrongs(one_of(tmp_path, *given))
    assert said.endswith(
        "times its ceiling. Its dispersion does not explain it; an electron that jumps between "
        "the two (a harpoon) might."
    )


def test_a_factor_above_z_is_told_apart_from_a_k_above_z(tmp_path: Path) -> None:
    (said,) = wrongs(one_of(tmp_path, ('"0 kJ/mol"', '"60 kJ/mol"')))
    assert "times its ceiling where only encounters with the energy count. A long-range" in said


def test_what_is_below_is_not_remarked(tmp_path: Path) -> None:
    assert list(wrongs(one_of(tmp_path, ('"1e12 L', '"1e10 L')))) == []


@pytest.mark.parametrize(
    ("found", "said"),
    [
        (Crossing(1230.4, "hard spheres", True, True), "above Z from 1230 K on"),
        (Crossing(56.78, "hard spheres", False, False), "above Z below 56.8 K"),
        (Crossing(400.0, "long range", False, True), "above the long-range ceiling below 400 K"),
    ],
)
def test_crossings_in_words(found: Crossing, said: str) -> None:
    assert crossing(found) == said


def test_no_crossing_says_where_it_was_looked_for(tmp_path: Path) -> None:
    one = one_of(tmp_path, ('"1e12 L', '"1e10 L'))
    assert crossings(one) == "nowhere from 133 to 1875 K"
    assert crossings(one_of(tmp_path)) == "above Z everywhere from 133 to 1875 K"


def test_units_are_those_of_the_step(tmp_path: Path) -> None:
    assert unit_of(one_of(tmp_path, ("1e12 L/mol/s", "1e-10 cm^3/s"))).startswith("cm^3")
    collision = (
        'law = "arrhenius"\nA = "1e12 L/mol/s"\nEa = "0 kJ/mol"',
        'law = "collision"\nthreshold = "0 J/mol"\n',
    )
    assert unit_of(one_of(tmp_path, collision)) == "L/mol/s"


def test_tables_have_a_cell_for_every_heading(tmp_path: Path) -> None:
    table = ceiling_table(load_text(tmp_path, CASE).experiment)
    found = [sheets.levels_sheet(table), sheets.factors_sheet(table), sheets.ranges_sheet(table)]
    found += [sheets.pairs_sheet(table)]
    screen = sheets.screen_sheet(table)
    assert screen is not None
    for sheet in (*found, screen):
        assert sheet.rows
        assert all(len(row) == len(sheet.heading) for row in sheet.rows)
