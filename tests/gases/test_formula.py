"""Formulas: what is read, what is refused, and that text and composition agree."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants
from validation import Checked

from meanfree.errors import InputError
from meanfree.gases.atomic_weights import ATOMIC_NUMBERS, ATOMIC_WEIGHTS
from meanfree.gases.formula import Formula, parse_formula

ELEMENTS = st.sampled_from(sorted(ATOMIC_WEIGHTS))
COUNTS = st.dictionaries(ELEMENTS, st.integers(1, 99), min_size=1, max_size=6)


@settings(max_examples=200, deadline=None)
@given(COUNTS, st.integers(-3, 3))
def test_a_formula_written_in_hill_order_reads_back(counts: dict[str, int], charge: int) -> None:
    charge = min(charge, sum(ATOMIC_NUMBERS[element] * n for element, n in counts.items()))
    formula = Formula(tuple(sorted(counts.items())), charge)
    assert parse_formula(formula.hill) == formula


@settings(max_examples=200, deadline=None)
@given(COUNTS, COUNTS, st.integers(1, 20))
def test_a_group_counts_each_atom_as_often_as_its_factor(
    outer: dict[str, int], inner: dict[str, int], factor: int
) -> None:
    def text(counts: dict[str, int]) -> str:
        return "".join(f"{element}{count}" for element, count in counts.items())

    read = parse_formula(f"{text(outer)}({text(inner)}){factor}")
    for element in {*outer, *inner}:
        assert read.count(element) == outer.get(element, 0) + factor * inner.get(element, 0)


@settings(max_examples=300, deadline=None)
@given(st.text(max_size=12))
def test_any_text_is_read_or_refused_with_an_input_error(text: str) -> None:
    try:
        formula = parse_formula(text)
    except InputError:
        return
    assert parse_formula(formula.hill) == formula


@pytest.mark.parametrize(
    ("text", "elements", "charge"),
    [
        ("(CH3)3COOC(CH3)3", {"C": 8, "H": 18, "O": 2}, 0),
        ("O2+", {"O": 2}, 1),
        ("O2-", {"O": 2}, -1),
        ("SO4^2-", {"S": 1, "O": 4}, -2),
        ("SO4--", {"S": 1, "O": 4}, -2),
        ("[Ca]2+", {"Ca": 1}, 2),
        ("e-", {}, -1),
        ("CH3D", {"C": 1, "H": 3, "D": 1}, 0),
        ("Co", {"Co": 1}, 0),
        ("CO", {"C": 1, "O": 1}, 0),
        ("HO", {"H": 1, "O": 1}, 0),
        ("Ho", {"Ho": 1}, 0),
        ("[Ni(CO)4]", {"Ni": 1, "C": 4, "O": 4}, 0),
    ],
)
def test_reads(text: str, elements: dict[str, int], charge: int) -> None:
    assert parse_formula(text) == Formula(tuple(sorted(elements.items())), charge)


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("", '"" (empty)'),
        ("Xx2", '"Xx2" (no element "Xx")'),
        ("h2o", '"h2o" (no element "h")'),
        ("2NO", '"2NO" (no element "2")'),
        ("H0", '"H0" (count 0)'),
        ("H02", '"H02" (count 02)'),
        ("C99999", '"C99999" (count 99999)'),
        ("(CH3", '"(CH3" (")" is missing)'),
        ("CH3)", '"CH3)" (")" closes nothing)'),
        ("(CH3]", '"(CH3]" ("]" closes nothing)'),
        ("()", '"()" (")" closes nothing)'),
        ("H++", '"H++" (charge 2, but 1 electron(s) to lose)'),
        ("He^9999+", '"He^9999+" (charge 9999, but 2 electron(s) to lose)'),
        ("H+-", '"H+-" (both signs in the charge)'),
        ("SO4^-2", '"SO4^-2" (unreadable charge)'),
        ("SO4^0-", '"SO4^0-" (unreadable charge)'),
        ("+", '"+" (no atoms)'),
        ("H 2", '"H 2" (no element " ")'),
        ("H₂O", '"H₂O" (character 2 is SUBSCRIPT TWO)'),
        ("\u041d2", '"\u041d2" (character 1 is CYRILLIC CAPITAL LETTER EN)'),
        ("NO\u2212", '"NO\u2212" (character 3 is MINUS SIGN)'),
        ("H\u200b2", '"H?2" (character 2 is ZERO WIDTH SPACE)'),
        ("H2\n", '"H2?" (character 3 is U+000A)'),
    ],
)
def test_refuses_and_says_why(text: str, found: str) -> None:
    with pytest.raises(InputError) as caught:
        parse_formula(text, key="gases.x.formula")
    problem = caught.value.problems[0]
    assert (problem.key, problem.found) == ("gases.x.formula", found)
    assert problem.expected.startswith(("a formula such as CH4", "a count from 1 to 9999"))


def test_a_very_long_text_is_refused_at_once() -> None:
    with pytest.raises(InputError, match="at most 120 characters"):
        parse_formula("(" * 100_000)


def test_molar_masses(checked: Checked) -> None:
    """CRC Handbook, 97th ed., physical constants (from memory), in g/mol to its 3 decimals.

    The atomic weights here are of an older IUPAC table; they differ by up to 0.005 g/mol
    for sulfur, so the bound is one in the last figure common to both.
    """
    for text, grams in {"NOCl": 65.459, "C6H6": 78.112, "HBr": 80.912, "SF6": 146.055}.items():
        mass = parse_formula(text).molar_mass
        source = "CRC Handbook, 97th ed. (from memory)"
        ours = 1e3 * mass.value
        checked("molar mass of four gases", ours, f"{grams}", "g/mol", source, within=0.01)
        assert "IUPAC" in mass.source


def test_an_ion_weighs_its_electrons_less_or_more() -> None:
    neutral, cation, anion = (parse_formula(t).molar_mass.value for t in ("O2", "O2+", "O2-"))
    electron = constants.m_e * constants.N_A
    assert neutral - cation == pytest.approx(electron, rel=1e-9)
    assert anion - neutral == pytest.approx(electron, rel=1e-9)
    assert parse_formula("e-").molar_mass.value == pytest.approx(electron, rel=1e-15)


def test_the_atomic_weights_are_those_of_the_library() -> None:
    from chemicals.elements import periodic_table

    library = {element.symbol: element.MW for element in periodic_table}
    assert library | {"D": 2.014102} == ATOMIC_WEIGHTS
    numbers = {element.symbol: element.number for element in periodic_table}
    assert numbers | {"D": 1} == ATOMIC_NUMBERS


def test_a_bare_nucleus_is_the_lightest_ion() -> None:
    # Mass of the alpha particle 6.6446573e-27 kg and of the proton 1.67262192e-27 kg (CODATA);
    # atomic weights of the table are rounded to 1e-6 (He) and mix in deuterium, 1.2e-4 (H).
    alpha = parse_formula("He++").molar_mass.value / constants.N_A
    assert alpha == pytest.approx(6.6446573e-27, rel=1e-6)
    proton = parse_formula("H+").molar_mass.value / constants.N_A
    assert proton == pytest.approx(constants.m_p, rel=2e-4)
