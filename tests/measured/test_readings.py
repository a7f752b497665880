"""Readings in SI: units, clocks, deviations, blanks, and all that is refused or flagged."""

from __future__ import annotations

import math

import numpy as np
import pytest
from measured_runs import case_text, csv, measured

from meanfree.constants import N_A, R
from meanfree.errors import InputError
from meanfree.measured.prediction import predict
from meanfree.measured.signals import predicted

FIRST_ORDER = {
    "reaction": "A -> 2 B",
    "law": 'law = "fixed"\nk = "1e-3 1/s"',
    "fill": "100 Pa",
    "T": 300,
}
TIME = 'time = { column = "t", unit = "s" }\n'
OK = {"t": [0, 100, 300], "y": [1.0, 0.9, 0.7]}


def one(tmp_path, signal, columns=None, more="", case=None, files=None, time=TIME):
    """The only run of a small case."""
    text = case_text(**(case or FIRST_ORDER))
    text += f'\n[[data]]\nfile = "run.csv"\n{time}signal = {{ {signal} }}\n{more}'
    everything = {"run.csv": csv(columns or OK), **(files or {})}
    return measured(tmp_path, text, everything).runs[0]


def refused(tmp_path, signal, columns=None, more="", **options):
    """The problems, as text, without the names of files in front."""
    with pytest.raises(InputError) as caught:
        one(tmp_path, signal, columns, more, **options)
    return [f"{p.key}: {p.found}; {p.expected}" for p in caught.value.problems]


PRESSURE = 'column = "y", unit = "Pa", is = "total pressure"'


def test_units_and_clock(tmp_path):
    run = one(
        tmp_path,
        'column = "y", unit = "torr", is = "total pressure"',
        time='time = { column = "t", unit = "min", zero = "30 s" }\n',
        columns={"t": [0.5, 1, 2], "y": [1, 2, 3]},
    )
    assert run.readings.times == pytest.approx([0, 30, 90], abs=1e-12)
    assert run.readings.values == pytest.approx(np.array([1, 2, 3]) * 101325 / 760, rel=1e-12)
    assert run.name == "run"


@pytest.mark.parametrize(
    ("signal", "expected"),
    [
        ("total pressure", lambda a, b, T: (a + b) * R * T),
        ("partial pressure of B", lambda a, b, T: b * R * T),
        ("concentration of A", lambda a, b, T: a),
        ("concentration of A + B", lambda a, b, T: a + b),
        ("number density of A", lambda a, b, T: a * N_A),
        ("conversion of A", lambda a, b, T: 1 - a / (100 / (R * T))),
        ("mole fraction of B", lambda a, b, T: b / (a + b)),
    ],
)
def test_signals_by_hand(tmp_path, signal, expected):
    units = {"to": "Pa", "pa": "Pa", "co": "mol/m^3", "nu": "1/m^3"}
    unit = "" if signal[:4] in ("conv", "mole") else f'unit = "{units[signal[:2]]}", '
    run = one(tmp_path, f'column = "y", {unit}is = "{signal}"')
    t, T = run.readings.times, 300.0
    a = 100 / (R * T) * np.exp(-1e-3 * t)
    b = 2 * (100 / (R * T) - a)
    shown = predicted(run.readings.signal, predict(run.experiment, t))
    # the closed form of first order: rounding
    assert shown == pytest.approx(expected(a, b, T), rel=1e-12, abs=1e-300)


def test_dead_space_takes_its_share_of_the_pressure(tmp_path):
    """Half the gas in a cold dead space of equal capacity: the pressure rises half as far."""
    base = case_text(**FIRST_ORDER).replace(
        'volume = "0.5 L"',
        'volume = "0.5 L"\ndead_space = { volume = "0.25 L", temperature = "150 K" }',
    )
    text = base + f'\n[[data]]\nfile = "run.csv"\n{TIME}signal = {{ {PRESSURE} }}\n'
    run = measured(tmp_path, text, {"run.csv": csv(OK)}).runs[0]
    t = np.array([0.0, 1e3, 1e9])
    p = predicted(run.readings.signal, predict(run.experiment, t))
    # gas moves between both at the common pressure, so that all of it reacts in the end, at half
    # the rate: only the half that is hot reacts at any time
    assert p == pytest.approx(100 * (2 - np.exp(-0.5e-3 * t)), rel=1e-12)


def test_absorbance(tmp_path):
    """Lambert and Beer by hand, to both bases, by coefficient and by cross-section."""
    c = 100 / (R * 300.0)
    for extra, expected in (
        ('coefficients = { A = "50 L/mol/cm" }', 0.1 * c * 5.0),
        ('coefficients = { A = "50 L/mol/cm", B = "1 L/mol/cm" }', 0.1 * c * 5.0),
        ('coefficients = { A = "1e-19 cm^2" }', 0.1 * c * 1e-23 * N_A / math.log(10)),
        ('coefficients = { A = "1e-19 cm^2" }, base = "e"', 0.1 * c * 1e-23 * N_A),
        ('coefficients = { A = "50 L/mol/cm" }, base = "e"', 0.1 * c * 5.0 * math.log(10)),
    ):
        run = one(tmp_path, f'column = "y", is = "absorbance", path = "10 cm", {extra}')
        shown = predicted(run.readings.signal, predict(run.experiment, np.array([0.0])))
        assert shown[0] == pytest.approx(expected, rel=1e-12)


def test_deviations(tmp_path):
    columns = {**OK, "s": [0.1, 0.2, 0.3]}
    torr = 'column = "y", unit = "torr", is = "total pressure"'
    size = 101325 / 760
    for sd, expected in (
        ('"0.5 torr"', [0.5 * size] * 3),
        ('"2 %"', 0.02 * size * np.array(OK["y"])),
        ('{ column = "s" }', size * np.array([0.1, 0.2, 0.3])),
        ("{ column = 3 }", size * np.array([0.1, 0.2, 0.3])),
    ):
        run = one(tmp_path, torr, columns, f"sd = {sd}\n")
        assert run.readings.sd == pytest.approx(expected, rel=1e-12)
    assert one(tmp_path, torr, columns, 'sd = "estimated"\n').readings.sd is None


def test_blank(tmp_path):
    columns = {"t": [0, 100, 300], "y": [10.0, 9.0, 7.0]}
    files = {"blank.csv": csv({"t": [0, 200, 400], "y": [1.0, 2.0, 3.0]})}
    for subtract, expected in (("signal", [9, 7.5, 4.5]), ("change", [10, 8.5, 5.5])):
        more = f'sd = "0.3 Pa"\nblank = {{ file = "blank.csv", subtract = "{subtract}" }}\n'
        run = one(tmp_path, PRESSURE, columns, more, files=files)
        assert run.readings.values == pytest.approx(expected, rel=1e-12)
        # both have 0.3 Pa; linear between points of the blank
        assert run.readings.sd == pytest.approx([0.3 * math.sqrt(2)] * 3, rel=1e-12)
        assert "of the blank blank.csv is subtracted" in run.readings.notes[0]


def test_blank_that_is_too_short(tmp_path):
    files = {"blank.csv": csv({"t": [0, 200], "y": [1.0, 2.0]})}
    more = 'blank = { file = "blank.csv", subtract = "signal" }\n'
    assert refused(tmp_path, PRESSURE, None, more, files=files) == [
        "blank: a blank from 0 to 200 s, and a reading outside it in line 4; "
        "a blank that covers every time of the run"
    ]


@pytest.mark.parametrize(
    ("columns", "expected"),
    [
        (
            {"t": [0, 100, 50], "y": [1, 2, 3]},
            "line 4, column t: 50 after 100; times that do not go back (at least 100)",
        ),
        (
            {"t": [-1, 100], "y": [1, 2]},
            "line 2, column t: -1 s, before time zero; times from the start of the run; zero = … "
            "says where the clock stood then",
        ),
        ({"t": [0, 100], "y": [1, -2]}, "line 3, column y: -2, a negative pressure; at least 0"),
        (
            {"t": [0, 100, 200], "y": [5, 5, 5]},
            "column y: 3 readings that are all 5; a signal that changes",
        ),
        ({"t": [0], "y": [5]}, ": 1 reading; at least two"),
        (
            {"t": [0, 1], "y": [5, 1e300]},
            "line 3, column y: 1e+300, which no instrument shows; a number of a sensible size",
        ),
    ],
)
def test_nonsense_is_refused(tmp_path, columns, expected):
    assert refused(tmp_path, PRESSURE, columns) == [expected]


def test_everything_wrong_in_a_file_at_once(tmp_path):
    columns = {"t": [0, 50, 20], "y": [1, -2, -3]}
    assert len(refused(tmp_path, PRESSURE, columns)) == 3


def test_replicates_at_one_time_are_kept(tmp_path):
    run = one(tmp_path, PRESSURE, {"t": [0, 100, 100], "y": [1, 2, 3]})
    assert len(run.readings) == 3


def test_odd_readings_are_flagged_and_kept(tmp_path):
    run = one(
        tmp_path,
        'column = "y", unit = "mol/m^3", is = "concentration of A"',
        {"t": [0, 1, 2], "y": [1, -0.1, 0.2]},
    )
    assert len(run.readings) == 3
    assert run.readings.notes == (
        "run.csv: 1 reading below zero in column y (line 3); kept as scatter about zero.",
    )
    run = one(
        tmp_path, 'column = "y", is = "conversion of A"', {"t": [0, 1, 2], "y": [0, 1.1, 1.2]}
    )
    assert run.readings.notes == ("run.csv: 2 readings above 1 in column y (lines 3, 4); kept.",)


def test_deviation_of_zero_in_a_column(tmp_path):
    columns = {**OK, "s": [0.1, 0, 0.3]}
    assert refused(tmp_path, PRESSURE, columns, 'sd = { column = "s" }\n') == [
        "line 3, column s: 0; a standard deviation above 0"
    ]
