"""What a case means: counting, fills, vessels, orders, reverses, energies, settings."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from scipy import constants
from small_cases import GOOD, LABELS, LAW, PISTON, edited, load_edited, load_text

from meanfree.case import load_case
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.experiment.temperature import Program

R, N_A, TORR = constants.R, constants.N_A, constants.torr
REVERSIBLE = (LAW, f'{LAW}reverse = "thermochemistry"\n')
CASES = Path(__file__).parents[2] / "cases"


def test_the_good_case_is_read_as_written(tmp_path: Path) -> None:
    experiment = load_text(tmp_path, GOOD).experiment
    assert [gas.name for gas in experiment.gases] == ["NOCl", "Ar", "NO", "Cl2"]
    assert experiment.vessel.volume.value == pytest.approx(1.8e-3, rel=1e-14)
    # n = pV/RT at the filling temperature, and p = nRT/V at the run's: by hand.
    n = 50 * TORR * 1.8e-3 / (R * 296)
    assert experiment.moles["NOCl"] == pytest.approx(n, rel=1e-12)
    assert experiment.initial_pressure == pytest.approx(185 * TORR * 480 / 296, rel=1e-12)
    assert experiment.watched == "NOCl"
    law = inputs(experiment)["steps.decomposition.A"]
    assert (law.value, law.unit) == (pytest.approx(9.4e9, rel=1e-14), "L/mol/s")


@pytest.mark.parametrize("name", sorted(path.name for path in CASES.glob("*.toml")))
def test_every_shipped_case_is_understood(name: str) -> None:
    loaded = load_case(CASES / name)
    assert loaded.text.startswith("#:schema ./case.schema.json\n")
    assert "nvented" in loaded.text


def k_of(experiment: Experiment) -> float:
    step = experiment.steps[0]
    return float(step.law.rate_constant(experiment.context(step), 480.0))


@pytest.mark.parametrize(
    ("counts", "per"),
    [("events", 1), ("loss of NOCl", 2), ("formation of NO", 2), ("formation of Cl2", 1)],
)
def test_a_quoted_k_is_divided_by_what_it_counts(counts: str, per: int, tmp_path: Path) -> None:
    law = f'law = "fixed"\nk = "9.4e9 L/mol/s"\nk_counts = "{counts}"\n'
    experiment = load_edited(tmp_path, (LAW, law)).experiment
    assert k_of(experiment) == pytest.approx(9.4e6 / per, rel=1e-14)
    assert inputs(experiment)["steps.decomposition.k"].value == pytest.approx(9.4e9, rel=1e-14)


@pytest.mark.parametrize(
    ("unit", "factor"),
    [
        ("L/mol/s", 1e-3),
        ("cm^3/s", N_A * 1e-6),
        ("cm3 molecule-1 s-1", N_A * 1e-6),
        ("L/mol/min", 1e-3 / 60),
        ("M^-1 s^-1", 1e-3),
    ],
)
def test_a_rate_constant_in_any_unit(unit: str, factor: float, tmp_path: Path) -> None:
    experiment = load_edited(tmp_path, (LAW, f'law = "fixed"\nk = "3 {unit}"\n')).experiment
    assert k_of(experiment) == pytest.approx(3 * factor, rel=1e-13)


FILLS = [
    # 50 torr and 135 torr at 296 K in 1.8 L, in other words
    'gases = { NOCl = "50 torr", Ar = "135 torr" }\nat = "296 K"',
    'gases = { NOCl = "4.875505306380599 mmol", Ar = "135 torr" }\nat = "296 K"',
    'gases = { NOCl = "2.7086140590999996 mol/m^3", Ar = "13.163864327 mmol" }\nat = "296 K"',
    'gases = { NOCl = "1.6311655e18 1/cm^3", Ar = "4.404146861e18 molecule/cm^3" }\nat = "296 K"',
    'gases = { NOCl = 0.27027027027, Ar = "balance" }\ntotal = "185 torr"\nat = "296 K"',
    'gases = { NOCl = "27.027027027 %", Ar = "135 torr" }\ntotal = "185 torr"\nat = "296 K"',
    'gases = { NOCl = "50 torr", Ar = "balance" }\ntotal = "18.039369634 mmol"\nat = "296 K"',
    'gases = { NOCl = "50 torr", Ar = "balance" }\ntotal = "185 torr"\nat = "22.85 degC"',
]


@pytest.mark.parametrize("fill", FILLS)
def test_one_fill_in_any_mixture_of_measures(fill: str, tmp_path: Path) -> None:
    text = edited(GOOD, [('gases = { NOCl = "50 torr", Ar = "135 torr" }\nat = "296 K"', fill)])
    moles = load_text(tmp_path, text).experiment.moles
    # The fills above have seven digits or more: 1e-6 is far below what a wrong factor would do.
    assert moles["NOCl"] == pytest.approx(50 * TORR * 1.8e-3 / (R * 296), rel=1e-6)
    assert moles["Ar"] == pytest.approx(135 * TORR * 1.8e-3 / (R * 296), rel=1e-6)


def test_parts_per_million_in_a_balance(tmp_path: Path) -> None:
    fill = 'gases = { O3 = "0.2 ppm", C2H4 = "10 ppmv", N2 = "balance" }\ntotal = "1 atm"'
    experiment = load_edited(
        tmp_path,
        ('gases = { NOCl = "50 torr", Ar = "135 torr" }\nat = "296 K"', fill),
        ("2 NOCl -> 2 NO + Cl2", "O3 + C2H4 -> CH2O + CO + H2O"),
        ('value = "480 K"', 'value = "298 K"'),
        (LAW, 'law = "fixed"\nk = "1.6e-18 cm^3/molecule/s"\n'),
        ("O3 + C2H4 -> CH2O + CO + H2O", "O3 + C2H4 -> CH2O + CH2O2"),
        ("[run]", '[gases.CH2O2]\ncas = "64-18-6"\n\n[run]'),
    ).experiment
    total = sum(experiment.moles.values())
    assert experiment.moles["O3"] / total == pytest.approx(2e-7, rel=1e-12)
    assert experiment.moles["C2H4"] / total == pytest.approx(1e-5, rel=1e-12)
    assert experiment.initial_pressure == pytest.approx(constants.atm, rel=1e-12)


def test_dead_space_takes_its_share(tmp_path: Path) -> None:
    edit = (
        'volume = "1.8 L"',
        'volume = "1.8 L"\ndead_space = { volume = "25 mL", temperature = "296 K" }',
    )
    experiment = load_edited(tmp_path, edit).experiment
    n = 50 * TORR / R * (1.8e-3 / 296 + 25e-6 / 296)
    assert experiment.moles["NOCl"] == pytest.approx(n, rel=1e-12)


def test_a_piston_is_brought_to_its_pressure_and_says_so(tmp_path: Path) -> None:
    edit = ('volume = "1.8 L"', 'volume = "1.8 L"\npressure = "1 bar"')
    experiment = load_edited(tmp_path, edit, base=PISTON).experiment
    # V(0) = V_fill T(0)/T_fill p_fill/p
    volume = 1.8e-3 * 480 / 296 * 185 * TORR / 1e5
    assert experiment.initial_volume == pytest.approx(volume, rel=1e-12)
    assert experiment.notes == (
        "Filled at 0.2466 bar, the piston is brought to 1 bar at time zero: volume 0.7199 L.",
    )


def test_a_warm_up_program(tmp_path: Path) -> None:
    points = 'mode = "program"\npoints = [["0 s", "23 degC"], ["4 min", "443 K"]]'
    mode = load_edited(
        tmp_path, ('mode = "isothermal"\nvalue = "480 K"', points)
    ).experiment.temperature
    assert isinstance(mode, Program)
    assert [(t.value, T.value) for t, T in mode.points] == [
        (0.0, pytest.approx(296.15)),
        (240.0, 443.0),
    ]


def test_orders_and_bath(tmp_path: Path) -> None:
    law = (
        'law = "fixed"\nk = "3 L^1.5/mol^1.5/s"\norders = { NOCl = 1.5, NO = 0 }\n'
        "partners = { Ar = 0.35, others = 0.9 }\n"
    )
    edits = ((LAW, law), ("2 NOCl -> 2 NO + Cl2", "2 NOCl + M → 2 NO + Cl2 + M"))
    (step,) = load_edited(tmp_path, *edits).experiment.steps
    assert step.orders == {"NOCl": 1.5, "NO": 0.0}
    assert step.bath is not None
    assert (step.bath.efficiency("Ar"), step.bath.efficiency("Cl2")) == (0.35, 0.9)
    # Order 1.5 + 1 for M: (L/mol)^1.5/s is 1e-3^1.5 in SI.
    assert step.law.inputs()["k"].value == pytest.approx(3 * 1e-3**1.5, rel=1e-13)


def test_a_gas_on_both_sides_counts_in_the_order(tmp_path: Path) -> None:
    law = 'law = "fixed"\nk = "3 L^2/mol^2/s"\n'
    edits = ((LAW, law), ("2 NOCl -> 2 NO + Cl2", "2NOCl + Ar -> 2NO + Cl2 + Ar"))
    (step,) = load_edited(tmp_path, *edits).experiment.steps
    assert step.orders == {"NOCl": 2.0, "Ar": 1.0}
    assert step.net == {"NOCl": -2.0, "Ar": 0.0, "NO": 2.0, "Cl2": 1.0}


def test_fractional_yields(tmp_path: Path) -> None:
    edits = (
        (LAW, 'law = "fixed"\nk = "3 1/s"\n'),
        ("2 NOCl -> 2 NO + Cl2", "NOCl -> NO + 0.5 Cl2"),
    )
    (step,) = load_edited(tmp_path, *edits).experiment.steps
    assert dict(step.products) == {"NO": 1.0, "Cl2": 0.5}


@pytest.mark.parametrize(
    ("given", "kind", "value"),
    [
        ('{ Kp = "0.12 bar", at = "480 K" }', "Kp", 12000.0),
        ('{ Kc = "3 mmol/L", at = "480 K" }', "Kc", 3.0),
        ('{ Kc = "1e16 1/cm^3", at = "480 K" }', "Kc", 1e22 / N_A),
        ('{ K = 0.12, at = "480 K" }', "K", 0.12),
        ('{ K = "0.12", at = "298 K", enthalpy = "75 kJ/mol" }', "K", 0.12),
    ],
)
def test_a_given_equilibrium_constant(given: str, kind: str, value: float, tmp_path: Path) -> None:
    (step,) = load_edited(tmp_path, (LAW, f"{LAW}reverse = {given}\n")).experiment.steps
    assert isinstance(step.reverse, GivenEquilibrium)
    assert step.reverse.kind == kind
    assert step.reverse.constant.value == pytest.approx(value, rel=1e-12)


def test_constants_around_a_cycle_may_close(tmp_path: Path) -> None:
    steps = "\n".join(
        f'[[steps]]\nname = "{name}"\nreaction = "{reaction}"\nlaw = "fixed"\nk = "1 1/s"\n'
        f'reverse = {{ K = {K}, at = "480 K" }}\n'
        for name, reaction, K in (("ab", "A -> B", 2), ("bc", "B -> C", 3), ("ac", "A -> C", 6))
    )
    text = LABELS[: LABELS.index("[[steps]]")].replace('"A", "B"', '"A", "B", "C"') + steps
    assert len(load_text(tmp_path, text).experiment.steps) == 3


def test_constants_of_several_kinds_around_a_cycle_may_close(tmp_path: Path) -> None:
    # K = Kp/p° = 0.2 and K = Kc (RT/p°)^-1 = 5 at 480 K multiply to the third, 1.
    Kc = 5 * R * 480 / 1e5 * 1e3  # L/mol
    given = (
        ("ab", "A -> 2 B", 'Kp = "0.2 bar"'),
        ("bc", "2 B -> C", f'Kc = "{Kc:.6f} L/mol"'),
        ("ac", "A -> C", "K = 1"),
    )
    steps = "\n".join(
        f'[[steps]]\nname = "{name}"\nreaction = "{reaction}"\nlaw = "arrhenius"\n'
        f'A = "1 {"L/mol/s" if name == "bc" else "1/s"}"\nEa = "0 J/mol"\n'
        f'reverse = {{ {constant}, at = "480 K" }}\n'
        for name, reaction, constant in given
    )
    text = LABELS[: LABELS.index("[[steps]]")].replace('"A", "B"', '"A", "B", "C"') + steps
    assert len(load_text(tmp_path, text).experiment.steps) == 3
    with pytest.raises(InputError):
        load_text(tmp_path, text, {"steps.ac.reverse.K": "1.02"})


@pytest.mark.parametrize("last", [30, 40])
@pytest.mark.parametrize("varies", ["program", "adiabatic"])
def test_enthalpies_around_a_cycle_add_up_where_the_temperature_varies(
    tmp_path: Path, last: int, varies: str
) -> None:
    """A -> B -> C takes in 10 + 20 kJ/mol, so that A -> C takes in 30 (Hess)."""
    given = (("ab", "A -> B", 2, 10), ("bc", "B -> C", 3, 20), ("ac", "A -> C", 6, last))
    steps = "\n".join(
        f'[[steps]]\nname = "{name}"\nreaction = "{reaction}"\nlaw = "fixed"\nk = "1 1/s"\n'
        f'heat = "-{H} kJ/mol"\n'
        f'reverse = {{ K = {K}, at = "480 K", enthalpy = "{H} kJ/mol" }}\n'
        for name, reaction, K, H in given
    )
    heat = "".join(f'[gases.{gas}]\nheat_capacity = "50 J/mol/K"\n' for gas in "ABC")
    mode = 'mode = "adiabatic"\nvalue = "480 K"'
    if varies == "program":
        mode, heat = 'mode = "program"\npoints = [["0 s", "480 K"], ["9 s", "600 K"]]', ""
    text = LABELS[: LABELS.index("[[steps]]")].replace('"A", "B"', '"A", "B", "C"')
    text = text.replace('mode = "isothermal"\nvalue = "480 K"', mode).replace("Ar =", "C =")
    if last == 30:
        assert len(load_text(tmp_path, text + heat + steps).experiment.steps) == 3
        return
    with pytest.raises(InputError) as caught:
        load_text(tmp_path, text + heat + steps)
    (problem,) = caught.value.problems
    assert problem.key == "steps.ac.reverse.enthalpy"
    assert problem.expected.startswith("30 kJ/mol here")


@pytest.mark.parametrize(("enthalpy", "noted"), [(57, False), (20, True)])
def test_an_equilibrium_at_odds_with_the_energies_is_noted(
    tmp_path: Path, enthalpy: int, noted: bool
) -> None:
    """N2O4 = 2 NO2 takes in 57.3 kJ/mol at 298 K (ATcT heats of formation 34.0 and 10.8)."""
    loaded = load_edited(
        tmp_path,
        ('"isothermal"', '"adiabatic"'),
        ('"480 K"', '"310 K"'),
        ('NOCl = "50 torr"', 'N2O4 = "50 torr"'),
        ("2 NOCl -> 2 NO + Cl2", "N2O4 -> 2 NO2"),
        (
            'A = "9.4e9 L/mol/s"',
            'A = "1e14 1/s"\nreverse = { Kp = "0.15 bar", at = "298.15 K", '
            f'enthalpy = "{enthalpy} kJ/mol" }}',
        ),
    )
    notes = [note for note in loaded.experiment.notes if "reverse.enthalpy" in note]
    assert bool(notes) == noted
    if noted:
        assert "is 20 kJ/mol, but by the energies of its gases it is 57.2" in notes[0]


def test_energies_are_there_where_they_are_needed_and_only_there(tmp_path: Path) -> None:
    gases = {g.name: g for g in load_edited(tmp_path, REVERSIBLE).experiment.gases}
    assert gases["NOCl"].thermochemistry is not None
    assert gases["Ar"].thermochemistry is None
    adiabatic = load_edited(tmp_path, ('"isothermal"', '"adiabatic"')).experiment
    assert all(gas.thermochemistry is not None for gas in adiabatic.gases)


def test_own_energies_replace_the_library(tmp_path: Path) -> None:
    own = (
        '[gases.NOCl]\nenthalpy = "50 kJ/mol"\nentropy = "250 J/mol/K"\n'
        'heat_capacity = [["200 K", "40 J/mol/K"], ["600 K", "50 J/mol/K"]]\n'
        'source = "own"\n\n[run]'
    )
    edits = (REVERSIBLE, ("[run]", own))
    energies = load_edited(tmp_path, *edits).experiment.gas_named["NOCl"].thermochemistry
    assert energies is not None
    assert float(energies.enthalpy(298.15)) == pytest.approx(50e3, rel=1e-9)
    assert float(energies.entropy(298.15)) == pytest.approx(250, rel=1e-9)
    assert float(energies.heat_capacity(400.0)) == pytest.approx(45, rel=1e-9)
    assert energies.enthalpy_298.source == "own"


def test_an_own_enthalpy_shifts_that_of_the_library(tmp_path: Path) -> None:
    known = load_edited(tmp_path, REVERSIBLE).experiment.gas_named["NOCl"].thermochemistry
    own = ("[run]", '[gases.NOCl]\nenthalpy = "50 kJ/mol"\n\n[run]')
    shifted = load_edited(tmp_path, REVERSIBLE, own).experiment.gas_named["NOCl"].thermochemistry
    assert known is not None
    assert shifted is not None
    moved = 50e3 - known.enthalpy_298.value
    assert float(shifted.enthalpy(480.0) - known.enthalpy(480.0)) == pytest.approx(moved, rel=1e-9)
    assert float(shifted.entropy(480.0)) == float(known.entropy(480.0))


LOSS = 'reaction = "A -> "\nlaw = "fixed"\nk = "1e-3 1/s"\n'


def test_what_leaves_has_no_heat_of_its_own(tmp_path: Path) -> None:
    """Stated, it is refused; where labels leave an adiabatic vessel, none is asked for."""
    cp = "".join(f'[gases.{g}]\nheat_capacity = "50 J/mol/K"\n\n' for g in "AB")
    steps = (
        ('"isothermal"', '"adiabatic"'),
        (
            LAW,
            LAW + 'heat = "60 kJ/mol"\n\n[[steps]]\nname = "leak"\n' + LOSS,
        ),
    )
    experiment = load_edited(tmp_path, *steps, ("[run]", cp + "[run]"), base=LABELS).experiment
    assert [step.heat is None for step in experiment.steps] == [False, True]
    heated = steps[0], (LAW, steps[1][1] + 'heat = "1 kJ/mol"\n'), ("[run]", cp + "[run]")
    with pytest.raises(InputError) as error:
        load_edited(tmp_path, *heated, base=LABELS)
    assert [str(problem).partition(": ")[2] for problem in error.value.problems] == [
        "steps.leak.heat: found heat of a step that brings or takes gas; expected no heat: what "
        "comes and goes carries the energy of the gas, and no other"
    ]


def test_labels_with_heat_may_be_adiabatic(tmp_path: Path) -> None:
    cp = "".join(f'[gases.{g}]\nheat_capacity = "50 J/mol/K"\n\n' for g in "AB")
    edits = (
        ('"isothermal"', '"adiabatic"'),
        (LAW, LAW + 'heat = "60 kJ/mol"\n'),
        ("[run]", cp + "[run]"),
    )
    experiment = load_edited(tmp_path, *edits, base=LABELS).experiment
    assert experiment.steps[0].heat is not None
    assert experiment.steps[0].heat.value == 60e3


def test_a_few_kelvin_outside_a_range_are_said(tmp_path: Path) -> None:
    own = (
        '[gases.NOCl]\nheat_capacity = [["200 K", "40 J/mol/K"], ["475 K", "50 J/mol/K"]]\n\n[run]'
    )
    edits = (REVERSIBLE, ("[run]", own))
    notes = load_edited(tmp_path, *edits).experiment.notes
    assert (
        "NOCl: thermochemistry known from 200 to 475 K is used at 480 K, by no more than 10 K."
        in notes
    )


def test_extrapolation_by_name(tmp_path: Path) -> None:
    own = (
        '[gases.NOCl]\nheat_capacity = [["200 K", "40 J/mol/K"], ["400 K", "50 J/mol/K"]]\n'
        "extrapolate = true\n\n[run]"
    )
    edits = (REVERSIBLE, ("[run]", own))
    notes = load_edited(tmp_path, *edits).experiment.notes
    assert (
        "NOCl: thermochemistry known from 200 to 400 K is used at 480 K, as the case allows."
        in notes
    )


def test_a_step_that_never_runs_and_a_law_out_of_range_are_noted(tmp_path: Path) -> None:
    more = (
        LAW
        + 'valid = ["500 K", "600 K"]\n\n[[steps]]\nname = "bromine"\nreaction = "Br2 -> 2 Br"\n'
        'law = "fixed"\nk = "1 1/s"\n'
    )
    notes = load_edited(tmp_path, (LAW, more)).experiment.notes
    assert notes == (
        "steps.decomposition: found from 500 to 600 K, the law is used at 480 K.",
        "steps.bromine never runs: nothing fills or forms Br2.",
    )


def test_every_value_of_a_step_carries_its_source(tmp_path: Path) -> None:
    (step,) = load_edited(tmp_path, (LAW, LAW + 'source = "notebook 7"\n')).experiment.steps
    assert {value.source for value in step.law.inputs().values() if not value.default} == {
        "notebook 7"
    }


def test_settings_are_put_in_before_anything_is_checked(tmp_path: Path) -> None:
    settings = {
        "temperature.value": "500 K",
        "steps.decomposition.Ea": "100 kJ/mol",
        "steps.0.k_counts": "loss of NOCl",
        "fill.gases.Ar": "1 bar",
        "run.report_at": '["10 min", "1 h"]',
        "gases.NOCl.diameter": "4.5 angstrom",
        "title": "Another",
    }
    loaded = load_text(tmp_path, GOOD, settings)
    experiment = loaded.experiment
    assert experiment.temperature.initial == 500
    assert [time.value for time in experiment.plan.report_at] == [600, 3600]
    assert experiment.title == "Another"
    diameter = experiment.gas_named["NOCl"].diameter
    assert diameter is not None
    assert diameter.value == pytest.approx(4.5e-10)
    k = 9.4e6 / 2 * math.exp(-100e3 / (R * 480))
    assert k_of(experiment) == pytest.approx(k, rel=1e-12)
    assert loaded.settings == settings
    assert loaded.text == GOOD


def test_the_hash_is_that_of_the_content(tmp_path: Path) -> None:
    plain = load_text(tmp_path, GOOD).hash
    assert load_text(tmp_path, "# a comment\n" + GOOD).hash == plain
    assert load_text(tmp_path, GOOD, {"temperature.value": "480 K"}).hash == plain
    assert load_text(tmp_path, GOOD, {"temperature.value": "481 K"}).hash != plain


def test_a_byte_order_mark_and_dos_line_ends_are_read(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes(b"\xef\xbb\xbf" + GOOD.replace("\n", "\r\n").encode())
    assert load_case(path).hash == load_text(tmp_path, GOOD).hash


SIGNAL = {"column": "p", "unit": "torr", "is": "total pressure"}


def test_data_are_kept_as_they_stand(tmp_path: Path) -> None:
    """Their files are read by the commands that need them, not here: this one is not there."""
    data = '\n[[data]]\nfile = "a.csv"\ntime = { column = "t", unit = "min" }\n'
    signal = 'signal = { column = "p", unit = "torr", is = "total pressure" }\n'
    assert load_text(tmp_path, GOOD + data + signal).data == (
        {"file": "a.csv", "time": {"column": "t", "unit": "min"}, "signal": SIGNAL},
    )


def test_data_without_what_was_read_are_refused(tmp_path: Path) -> None:
    data = '\n[[data]]\nfile = "a.csv"\ntime = { column = "t", unit = "min" }\n'
    with pytest.raises(InputError) as error:
        load_text(tmp_path, GOOD + data)
    assert [(p.key, p.found) for p in error.value.problems] == [("data.0.signal", "nothing")]
