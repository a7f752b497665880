"""Text into SI and back: every trap of unit libraries, and factors from outside."""

# ruff: noqa: E501 -- a table of messages reads best with one row a line

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from validation import Checked

from meanfree.units import (
    QuantityError,
    equilibrium_constant,
    from_si,
    rate_constant,
    read,
    read_any,
    read_number,
    to_si,
)
from meanfree.units.dimensions import _plain_dimensions, named

SP811 = "NIST Special Publication 811 (2008), appendix B.8"
CODATA = "CODATA 2018, NIST SP 961"
GREEN = "IUPAC Green Book, 3rd ed. (2007), table of conversion factors of energy units"
N_A = 6.02214076e23  # exact, SI Brochure, 9th ed.


@pytest.mark.parametrize(
    ("text", "dimension", "value", "digits", "source"),
    [
        ("1 atm", "pressure", 1.01325e5, 9, SP811),
        ("1 torr", "pressure", 1.333224e2, 7, SP811),
        ("760 Torr", "pressure", 1.01325e5, 12, "definition of the torr"),
        ("1 mTorr", "pressure", 1.333224e-1, 7, SP811),
        ("1 mmHg", "pressure", 1.333224e2, 7, SP811),
        ("1 inHg", "pressure", 3.386389e3, 7, SP811),
        ("1 psi", "pressure", 6.894757e3, 7, SP811),
        ("1 mbar", "pressure", 100.0, 12, SP811),
        ("10 hPa", "pressure", 1000.0, 12, "SI"),
        ("1 kcal/mol", "molar energy", 4184.0, 12, SP811 + " (thermochemical)"),
        ("1 eV", "molar energy", 96485.33, 7, GREEN),
        ("1 cm^-1", "molar energy", 11.96266, 7, GREEN),
        ("1 K", "molar energy", 8.314463, 7, GREEN + " (R of CODATA 2018)"),
        ("1 hartree", "molar energy", 2625499.6, 7, GREEN),
        ("32 degF", "temperature", 273.15, 12, SP811),
        ("212 °F", "temperature", 373.15, 12, SP811),
        ("326 degC", "temperature", 599.15, 12, SP811),
        ("20 °C", "temperature", 293.15, 12, SP811),
        ("1 in", "length", 0.0254, 12, SP811),
        ("1 angstrom", "length", 1e-10, 12, SP811),
        ("1 Å", "length", 1e-10, 12, SP811),
        ("25 cm3", "volume", 25e-6, 12, "SI"),
        ("25 mL", "volume", 25e-6, 12, SP811),
        ("3 hours", "time", 10800.0, 12, SP811),
        ("1 d", "time", 86400.0, 12, SP811),
        ("1 debye", "dipole moment", 3.33564e-30, 6, SP811 + " (from memory)"),
        ("1 bohr", "length", 5.29177211e-11, 9, CODATA),
        ("0.09 W/K", "conductance", 0.09, 12, "SI"),
        ("29.1 J mol^-1 K^-1", "molar heat capacity", 29.1, 12, "SI"),
        # 100 nm photons: 1239.84 eV nm / 100 nm (CODATA), times 96.48533 kJ/mol/eV
        ("100 nm", "photon energy", 12.39842 * 96485.33, 6, CODATA),
    ],
)
def test_published_factors(
    text: str, dimension: str, value: float, digits: int, source: str, checked: Checked
) -> None:
    """The tolerance is half a unit of the last digit that the source prints."""
    ours, within = read(text, dimension).value, 0.5 * 10.0 ** (1 - digits)
    checked("units in SI", ours, f"{value!r}", "", source, rel=within)


@pytest.mark.parametrize(
    ("text", "order", "value", "unit"),
    [
        ("1e-12 cm^3/s", 2, 1e-18 * N_A, "cm^3/molecule/s"),
        ("1e-12 cm3 molecule-1 s-1", 2, 1e-18 * N_A, "cm^3/molecule/s"),
        ("1e-12 cm³·molecule⁻¹·s⁻¹", 2, 1e-18 * N_A, "cm^3/molecule/s"),
        ("1e-31 cm^6/s", 3, 1e-43 * N_A**2, "cm^6/molecule^2/s"),
        ("9.4e9 L/mol/s", 2, 9.4e6, "L/mol/s"),
        ("9.4e9 L/(mol s)", 2, 9.4e6, "L/mol/s"),
        ("9.4e9 L*mol**-1*s**-1", 2, 9.4e6, "L/mol/s"),
        ("0.866 L/mol/min", 2, 0.866e-3 / 60, "L/mol/min"),
        ("2 1/s", 1, 2.0, "1/s"),
        ("2 s-1", 1, 2.0, "1/s"),
        ("2 L^0.5/mol^0.5/s", 1.5, 2 * 1e-3**0.5, "L^0.5/mol^0.5/s"),
        ("2e12 1/cm^3/s", 0, 2e18 / N_A, "molecule/cm^3/s"),
        ("2 mol/L/s", 0, 2e3, "mol/L/s"),
    ],
)
def test_rate_constants_per_molecule_and_per_mole(
    text: str, order: float, value: float, unit: str
) -> None:
    k = read(text, rate_constant(order), "a source")
    assert k.value == pytest.approx(value, rel=1e-13)
    assert (k.unit, k.source, k.dimension) == (unit, "a source", rate_constant(order))
    assert from_si(k.value, k.unit, k.dimension) == pytest.approx(float(text.split()[0]), rel=1e-13)


def test_a_number_density_counts_molecules() -> None:
    measures = ("pressure", "amount", "number density", "concentration")
    for text in ("1e12 1/cm^3", "1e12 cm-3", "1e12 molecule/cm^3"):
        found = read_any(text, measures)
        assert (found.value, found.dimension) == (pytest.approx(1e18, rel=1e-13), "number density")
    assert read_any("2 mol/L", measures).dimension == "concentration"
    assert read("1e12 1/cm^3", "concentration").value == pytest.approx(1e18 / N_A, rel=1e-13)


@pytest.mark.parametrize(
    ("text", "value"),
    [("5 mol%", 0.05), ("5 mol %", 0.05), ("5 vol%", 0.05), ("5 %", 0.05), ("0.27", 0.27),
     ("200 ppm", 2e-4), ("3 ppb", 3e-9), ("3 ppbv", 3e-9), ("4 ‰", 4e-3)],
)  # fmt: skip
def test_fractions(text: str, value: float) -> None:
    assert read(text, "fraction").value == pytest.approx(value, rel=1e-14)


def test_equilibrium_constants_by_change_of_moles() -> None:
    assert read("0.12 bar", equilibrium_constant("Kp", 1)).value == pytest.approx(12e3)
    assert read("0.12 1/bar", equilibrium_constant("Kp", -1)).value == pytest.approx(0.12e-5)
    assert read("2 atm^2", equilibrium_constant("Kp", 2)).value == pytest.approx(2 * 101325.0**2)
    assert read("3 L/mol", equilibrium_constant("Kc", -1)).value == pytest.approx(3e-3)
    assert read("3 cm^3", equilibrium_constant("Kc", -1)).value == pytest.approx(3e-6 * N_A)
    assert read("0.5", equilibrium_constant("Kp", 0)).value == 0.5
    assert read("0.5", equilibrium_constant("K", 3)).value == 0.5


P = 'a pressure such as "50 torr"'
T = 'a temperature such as "480 K"'
TIME = 'a time such as "10 min"'
V = 'a volume such as "1.8 L"'


@pytest.mark.parametrize(
    ("text", "dimension", "found", "expected"),
    [
        ("1,5 bar", "pressure", '"1,5 bar", with a comma in the number', f"{P} (a decimal point and no commas)"),
        ("80 torr + 3 torr", "pressure", '"80 torr + 3 torr", in which "torr + 3 torr" is no product of units', P),
        ("10**10**10**10 s", "time", '"10**10**10**10 s", in which "**10**10**10 s" is no product of units', TIME),
        ("5 mol%", "amount", '"5 mol%", a fraction', 'an amount such as "2 mmol"'),
        ("10 C", "temperature", '"10 C", in which "C" is no unit known here', f'{T} (did you mean "degC"?)'),
        ("-300 degC", "temperature", '"-300 degC"', "a temperature above 0 K"),
        ("0 K", "temperature", '"0 K"', "a temperature above 0 K"),
        (480, "temperature", "480, a bare number", f"{T}, in quotes and with its unit"),
        (True, "temperature", "true", f"{T}, in quotes and with its unit"),
        (["480 K"], "temperature", "a list", f"{T}, in quotes and with its unit"),
        ("480", "temperature", '"480", which has no unit', T),
        ("K", "temperature", '"K", which does not begin with a number', T),
        ("", "temperature", '"", which is empty', T),
        ("480 Pa", "temperature", '"480 Pa", a pressure', T),
        ("3 psig", "pressure", '"3 psig", a gauge pressure', f"{P} (an absolute pressure: add the pressure of the room)"),
        ("2 bar(g)", "pressure", '"2 bar(g)", a gauge pressure', f"{P} (an absolute pressure: add the pressure of the room)"),
        ("2 barg", "pressure", '"2 barg", a gauge pressure', f"{P} (an absolute pressure: add the pressure of the room)"),
        ("2 kPa gauge", "pressure", '"2 kPa gauge", a gauge pressure', f"{P} (an absolute pressure: add the pressure of the room)"),
        ("5 kpa", "pressure", '"5 kpa", in which "kpa" is no unit known here', f'{P} (did you mean "kPa"?)'),
        ("5 Pas", "pressure", '"5 Pas", in which "Pas" is no unit known here', f'{P} (did you mean "Pa"?)'),
        ("5 Tor", "pressure", '"5 Tor", in which "Tor" is no unit known here', f'{P} (did you mean "torr"?)'),
        ("2 J/degC", "heat capacity", '"2 J/degC", with a temperature scale inside a compound unit', 'a heat capacity such as "40 J/K" (K instead)'),
        ("nan K", "temperature", '"nan K", which is not finite', f"{T} (a finite number)"),
        ("inf K", "temperature", '"inf K", which is not finite', f"{T} (a finite number)"),
        ("1e400 K", "temperature", '"1e400 K", a number too large to hold', f"{T} (a finite number)"),
        ("1e-400 L", "volume", '"1e-400 L", a number too small to hold', f"{V} (a number that is not lost in rounding)"),
        ("1e300 L", "volume", '"1e300 L"', "a volume of at most 1e+12 m^3"),
        ("-1 torr", "pressure", '"-1 torr"', "a pressure of at least 0 Pa"),
        ("480 \u041a", "temperature", '"480 \u041a", in which a character is U+041A (CYRILLIC CAPITAL LETTER KA)', T),
        ("\u22125 K", "temperature", '"\u22125 K", in which a character is U+2212 (MINUS SIGN)', T),
        ("\uff15 K", "temperature", '"\uff15 K", in which a character is U+FF15 (FULLWIDTH DIGIT FIVE)', T),
        ("1.2.3 K", "temperature", '"1.2.3 K", in which the number cannot be read', T),
        ("1_000 K", "temperature", '"1_000 K", in which the number cannot be read', T),
        ("5 L/(mol", "volume", '"5 L/(mol", in which "L/(mol" is no product of units', V),
        ("5 TPa^20*TPa^20", "pressure", '"5 TPa^20*TPa^20", with a unit too large or too small to hold', P),
        ("5 L^999", "volume", '"5 L^999", in which "L^999" has no sensible power', V),
        ("5 /s", "frequency", '"5 /s", in which "/s" is no product of units', 'a frequency such as "1e-3 1/s"'),
        ("1.2", "fraction", '"1.2"', "a fraction of at most 1"),
        ("3 kJ", "molar energy", '"3 kJ", an energy', 'a molar energy such as "102 kJ/mol"'),
        ("1 L/mol/s", "rate constant of order 1", '"1 L/mol/s", whose unit is L/mol/s', 'a rate constant of order 1 such as "1e-3 1/s"'),
        ("9" * 200 + " s", "time", f'"{"9" * 45}\u2026 (202 characters)", which is too long for a quantity', TIME),
        ("5 K\x1b[31m", "temperature", '"5 K\\u001b[31m", in which a character is U+001B (a control character)', T),
    ],
)  # fmt: skip
def test_what_is_no_quantity(text: object, dimension: str, found: str, expected: str) -> None:
    with pytest.raises(QuantityError) as caught:
        read(text, dimension)
    assert (caught.value.found, caught.value.expected) == (found, expected)


def test_several_kinds_are_named_with_one_example() -> None:
    with pytest.raises(QuantityError) as caught:
        read_any("3 K", ("pressure", "amount", "concentration"))
    assert str(caught.value) == (
        'found "3 K", a temperature; expected a pressure, an amount or a concentration, '
        'such as "50 torr"'
    )


def test_a_unit_of_another_kind_in_a_conversion() -> None:
    with pytest.raises(QuantityError) as caught:
        to_si(1.0, "torr", "volume")
    assert str(caught.value) == f'found the unit "torr"; expected {V}'
    with pytest.raises(QuantityError) as caught:
        from_si(1.0, "torrr", "pressure")
    assert str(caught.value) == (
        f'found the unit "torrr", in which "torrr" is no unit known here; expected {P}'
    )


@pytest.mark.parametrize(
    ("value", "found"),
    [
        (True, "true"),
        (math.nan, "nan, which is not finite"),
        (10**400, "a number too large to hold"),
    ],
)
def test_what_is_no_number(value: object, found: str) -> None:
    with pytest.raises(QuantityError) as caught:
        read_number(value)
    assert caught.value.found == found


@pytest.mark.parametrize("dimension", [d.word for d in _plain_dimensions()])
def test_every_example_in_a_message_can_be_read(dimension: str) -> None:
    assert math.isfinite(read(named(dimension).example, dimension).value)


@pytest.mark.parametrize("order", [0, 0.5, 1, 1.5, 2, 2.5, 3, 4])
def test_every_example_of_a_rate_constant_can_be_read(order: float) -> None:
    dimension = named(rate_constant(order))
    assert read(dimension.example, dimension.word).value > 0
    assert to_si(1.0, dimension.si, dimension.word) == pytest.approx(1.0, rel=1e-14)


@pytest.mark.parametrize("change", [-3, -2, -1, 1, 2, 3])
@pytest.mark.parametrize("kind", ["Kp", "Kc"])
def test_every_example_of_an_equilibrium_constant_can_be_read(kind: str, change: float) -> None:
    dimension = named(equilibrium_constant(kind, change))
    assert read(dimension.example, dimension.word).value > 0
    assert to_si(1.0, dimension.si, dimension.word) == pytest.approx(1.0, rel=1e-14)


UNITS = [
    ("temperature", "K degC degF"),
    ("pressure", "Pa kPa bar mbar atm torr mTorr mmHg psi"),
    ("volume", "m^3 L mL cm3 ft^3"),
    ("molar energy", "J/mol kJ/mol kcal/mol K eV cm^-1 hartree"),
    ("photon energy", "nm eV cm^-1 kJ/mol"),
    ("rate constant of order 2", "L/mol/s cm^3/s cm^3/molecule/s m^3/mol/min"),
]
PAIRS = [(dimension, unit) for dimension, units in UNITS for unit in units.split()]


@given(pair=st.sampled_from(PAIRS), value=st.floats(1e-6, 1e6))
@settings(max_examples=200, deadline=None, derandomize=True)
def test_there_and_back(pair: tuple[str, str], value: float) -> None:
    dimension, unit = pair
    back = from_si(to_si(value, unit, dimension), unit, dimension)
    # An offset of 460 degF costs its share of the digits of a small number.
    assert back == pytest.approx(value, rel=1e-12, abs=1e-10 if "deg" in unit else 0)


FRAGMENTS = st.sampled_from(
    [*"0123456789.,+-*/^()% _eE", "K", "torr", "bar", "mol", "cm", "s", "L", "degC", "µ", "°",
    "Å", "10**9", "M", "%", "ppm", "nan", "inf", "\u041a", "\u00b3", "__import__", "1e999", "\n"]
)  # fmt: skip
DIMENSIONS = st.sampled_from(
    ["temperature", "pressure", "fraction", "molar energy", "pure", rate_constant(2),
     rate_constant(1.5), equilibrium_constant("Kc", -1), "photon energy", "number density"]
)  # fmt: skip


@given(text=st.lists(FRAGMENTS, max_size=12).map("".join) | st.text(max_size=30), word=DIMENSIONS)
@settings(max_examples=600, deadline=None, derandomize=True)
def test_any_text_is_a_finite_quantity_or_refused(text: str, word: str) -> None:
    try:
        found = read(text, word)
    except QuantityError as error:
        refused = error
    else:
        refused = None
    if refused is not None:
        assert refused.found.isprintable()
        assert refused.expected.isprintable()
        return
    assert math.isfinite(found.value)
    shown = from_si(found.value, found.unit, word)
    assert to_si(shown, found.unit, word) == pytest.approx(found.value, rel=1e-9, abs=1e-9)
