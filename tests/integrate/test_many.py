"""Many runs against single ones: the same case, the same numbers, one condition after the other."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from meanfree.case.loader import load_case
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs, with_inputs
from meanfree.experiment.plan import RunPlan
from meanfree.integrate.conditions import as_table, blocks_of
from meanfree.integrate.many import Runs, many
from meanfree.integrate.numbers import numbers_of
from meanfree.integrate.observables import (
    At,
    EndTime,
    HalfLife,
    HighestPressure,
    Peak,
    ReactionTime,
)
from meanfree.integrate.single import integrate
from meanfree.sourced import Sourced

HEAD = 'title = "t"\nlabels = ["A", "B", "C"]\n'
RIGID = '[vessel]\nholds = "volume"\nvolume = "2 L"\n'
PISTON = '[vessel]\nholds = "pressure"\nvolume = "2 L"\n'
ISOTHERMAL = '[temperature]\nmode = "isothermal"\nvalue = "500 K"\n'
PROGRAM = '[temperature]\nmode = "program"\npoints = [["0 s", "400 K"], ["50 s", "520 K"]]\n'
FILL = '[fill]\ngases = { A = "50 torr", C = "100 torr" }\nat = "300 K"\n'
STEPS = """[[steps]]
name = "one"
reaction = "A -> 2 B"
law = "arrhenius"
A = "1e11 1/s"
Ea = "120 kJ/mol"
reverse = { Kp = "0.4 bar", at = "500 K" }
[[steps]]
name = "two"
reaction = "2 B -> C"
law = "fixed"
k = "2 L/mol/s"
"""
CASES = {
    "rigid": HEAD + RIGID + ISOTHERMAL + FILL + STEPS,
    "piston": HEAD + PISTON + ISOTHERMAL + FILL + STEPS,
    "program": HEAD
    + PISTON
    + PROGRAM
    + FILL
    + STEPS.replace(', at = "500 K" }', ', at = "500 K", enthalpy = "50 kJ/mol" }'),
}
VARIED = {
    "vessel.volume": (1.0, 3.0),
    "temperature.value": (470.0, 530.0),
    "fill.gases.A": (20.0, 90.0),
    "fill.gases.C": (0.0, 200.0),
    "fill.at": (280.0, 320.0),
    "steps.one.A": (5e10, 2e11),
    "steps.one.Ea": (116.0, 124.0),
    "steps.one.reverse.Kp": (0.1, 1.0),
    "steps.two.k": (0.5, 5.0),
}


def experiment(tmp_path: Path, name: str, until: float | None = 300.0) -> Experiment:
    file = tmp_path / f"{name}.toml"
    file.write_text(CASES[name])
    plan = RunPlan(None if until is None else Sourced(until, "s", dimension="time"))
    return replace(load_case(file).experiment, plan=plan)


def table(e: Experiment, count: int, seed: int = 1) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    known = inputs(e)
    return {a: rng.uniform(*span, count) for a, span in VARIED.items() if a in known}


OBSERVABLES = (
    ReactionTime("A", 0.3),
    HalfLife("A", 2),
    At("concentration", "A"),
    At("partial pressure", "B", 40.0),
    At("total pressure", time=100.0),
    At("mole fraction", "C", 60.0),
    At("conversion", "A", 20.0),
    At("amount", "B"),
    At("temperature", time=30.0),
    At("volume", time=30.0),
    Peak("B"),
    EndTime(),
)


@pytest.mark.parametrize("name", CASES)
def test_conditions_agree_with_single_runs(tmp_path: Path, name: str) -> None:
    e = experiment(tmp_path, name)
    conditions = table(e, 12)
    assert len(conditions) >= 7
    frame = many(e, conditions, OBSERVABLES, rtol=1e-9, workers=2)
    assert list(frame.columns) == [
        *conditions,
        *(c for o in OBSERVABLES for c in o.columns),
        "ending",
    ]
    assert set(frame["ending"]) == {"reached the stated time"}
    for row in (0, 7):
        at = {address: float(column[row]) for address, column in conditions.items()}
        run = integrate(replace(with_inputs(e, at), plan=e.plan))
        A, B, C = (run.index(g) for g in "ABC")
        expected = {
            "reaction_time_A_0.3_s": run.reaction_time("A", 0.3),
            "c_A_mol_per_m3": run.concentrations(300.0)[A, 0],
            "p_B_at_40_s_Pa": run.partial_pressures(40.0)[B, 0],
            "p_total_at_100_s_Pa": run.pressure(100.0)[0],
            "y_C_at_60_s": run.amounts(60.0)[C, 0] / run.amounts(60.0)[:, 0].sum(),
            "X_A_at_20_s": run.conversion("A", 20.0)[0],
            "n_B_mol": run.amounts(300.0)[B, 0],
            "T_at_30_s_K": run.temperature(30.0)[0],
            "V_at_30_s_m3": run.volume(30.0)[0],
            "peak_amount_B_mol": run.peak("B")[1],
            "end_s": 300.0,
        }
        halves = [h.duration for h in run.half_lives("A")]
        expected["half_life_A_2_s"] = halves[1] if len(halves) > 1 else None
        for column, value in expected.items():
            found = frame[column][row]
            if value is None:
                assert np.isnan(found)
            else:
                # The single run's dense output at its default tolerance is what limits this.
                assert found == pytest.approx(value, rel=3e-6), column


@pytest.mark.parametrize("name", CASES)
def test_all_conditions_follow_at_once(tmp_path: Path, name: str) -> None:
    """One block: no System is built for each condition."""
    e = experiment(tmp_path, name)
    conditions = table(e, 50)
    blocks = list(blocks_of(e, *as_table(conditions)))
    assert len(blocks) == 1
    for row in (3, 31):
        at = {address: float(column[row]) for address, column in conditions.items()}
        for name_of, value in numbers_of(with_inputs(e, at)).by_name.items():
            if name_of != ("end",):
                got = blocks[0].variation.get(*name_of)
                assert got[min(row, len(got) - 1)] == pytest.approx(value, rel=1e-11)


def test_points_of_a_program_go_into_lanes(tmp_path: Path) -> None:
    """Breaks come at times of their own in each condition."""
    e = experiment(tmp_path, "program")
    points = {
        "temperature.points.1.temperature": np.linspace(500.0, 560.0, 20),
        "temperature.points.1.time": np.linspace(20.0, 90.0, 20),
    }
    assert len(list(blocks_of(e, *as_table(points)))) == 1
    frame = many(e, points, [At("conversion", "A"), At("temperature", time=30.0)])
    for row in (0, 13):
        at = {address: float(column[row]) for address, column in points.items()}
        run = integrate(replace(with_inputs(e, at), plan=e.plan))
        assert frame["X_A"][row] == pytest.approx(run.conversion("A", 300.0)[0], rel=1e-6)
        assert frame["T_at_30_s_K"][row] == pytest.approx(run.temperature(30.0)[0], rel=1e-12)


def test_the_gas_that_runs_out_first_ends_each_run(tmp_path: Path) -> None:
    """Which gas is watched depends on the filling: on both sides of equal amounts as singly."""
    from laboratory import experiment as made
    from laboratory import step

    e = made([step("A + B -> C", 2e-3)], {"A": 1000.0, "B": 1000.0}, until=None)
    filled = np.array([500.0, 1000.0, 1500.0])
    frame = many(e, {"fill.gases.A": filled}, [EndTime(), At("conversion", "A")])
    for row, value in enumerate(filled):
        run = integrate(with_inputs(e, {"fill.gases.A": float(value)}))
        # where rest was seen, to 1e-6 of the way
        assert frame["end_s"][row] == pytest.approx(run.end, rel=1e-4)
        assert frame["X_A"][row] == pytest.approx(run.conversion("A", run.end)[0], rel=1e-6)


def test_times_close_together_keep_columns_of_their_own(tmp_path: Path) -> None:
    """Names have as many digits as they need; a hundred columns and more come in one piece."""
    e = experiment(tmp_path, "rigid")
    times = [*np.linspace(10.0, 10.0001, 150), 0.1 + 0.2]
    asked = [At("total pressure", time=float(t)) for t in times]
    frame = many(e, {"steps.two.k": [1.0, 2.0]}, [*asked, At("total pressure", time=0.3)])
    assert frame.shape == (2, 1 + 151 + 1)
    assert {"p_total_at_10_s_Pa", "p_total_at_10.0001_s_Pa", "p_total_at_0.3_s_Pa"} < set(frame)
    assert (np.diff(frame.iloc[0, 1:151].to_numpy(float)) > 0).all()


def test_no_conditions_give_an_empty_table(tmp_path: Path) -> None:
    e = experiment(tmp_path, "rigid")
    frame = many(e, {"steps.two.k": []}, [EndTime()])
    assert list(frame) == ["steps.two.k", "end_s", "ending"]
    assert len(frame) == 0


def test_the_next_table_builds_nothing(tmp_path: Path) -> None:
    """Within the values seen before; what comes out is what a fresh start gives."""
    e = experiment(tmp_path, "piston")
    runs = Runs(e, OBSERVABLES)
    first = table(e, 40, seed=1)
    runs.frame(first)
    built = runs.conditions.built
    second = {a: np.clip(c, first[a].min(), first[a].max()) for a, c in table(e, 9, 2).items()}
    again = runs.frame(second)
    assert runs.conditions.built == built
    fresh = many(e, second, OBSERVABLES)
    for name in again:
        if name != "ending":
            # Rounding of the numbers, 1e-15, shifts steps; results follow within the case's rtol.
            np.testing.assert_allclose(again[name], fresh[name], rtol=1e-7)


def test_numbers_that_pass_zero_warn_of_nothing(tmp_path: Path) -> None:
    """An activation energy from below zero to above, and one that is zero at an end."""
    e = experiment(tmp_path, "rigid")
    for low in (-1.0, 0.0):
        energies = {"steps.one.Ea": np.linspace(low, 1.0, 33), "steps.one.A": [0.1] * 33}
        assert len(list(blocks_of(e, *as_table(energies)))) == 1


def test_runs_that_end_by_themselves(tmp_path: Path) -> None:
    e = experiment(tmp_path, "piston", None)
    conditions = table(e, 6)
    frame = many(e, conditions, [EndTime(), At("conversion", "A")])
    for row in (1, 4):
        at = {address: float(column[row]) for address, column in conditions.items()}
        run = integrate(replace(with_inputs(e, at), plan=e.plan))
        assert frame["ending"][row] == run.status.value
        # Where a slow end is approached its time depends on where rest was seen, to 1e-6 of it.
        assert frame["end_s"][row] == pytest.approx(run.end, rel=1e-4)
        assert frame["X_A"][row] == pytest.approx(run.conversion("A", run.end)[0], rel=1e-6)


def test_same_rows_in_any_number_of_threads(tmp_path: Path) -> None:
    e = experiment(tmp_path, "rigid")
    conditions = table(e, 300)
    said: list[tuple[float, float]] = []
    one = many(e, conditions, OBSERVABLES, workers=1)
    two = many(
        e, conditions, OBSERVABLES, workers=4, progress=lambda d, t, note="": said.append((d, t))
    )
    assert one.equals(two)
    assert said[-1] == (300, 300)
    assert [done for done, _ in said] == sorted(done for done, _ in said)


def test_impossible_requests_are_refused_together(tmp_path: Path) -> None:
    e = experiment(tmp_path, "rigid")
    with pytest.raises(InputError) as caught:
        many(
            e,
            {"steps.two.k": [1.0]},
            [At("colour"), ReactionTime("D", 0.5), ReactionTime("A", 1.5)],
        )
    assert len(caught.value.problems) == 3
    with pytest.raises(InputError, match=r"vessel\.volume.*-1"):
        many(e, {"vessel.volume": [1.0, -1.0]}, [EndTime()])
    with pytest.raises(InputError, match="an unknown address"):
        many(e, {"vessel.colour": [1.0]}, [EndTime()])
    with pytest.raises(InputError, match=r"columns of \[2, 3\] values"):
        many(e, {"steps.two.k": [1.0, 2.0], "fill.at": [300.0] * 3}, [EndTime()])
    with pytest.raises(InputError, match="nan"):
        many(e, {"steps.two.k": [1.0, np.nan]}, [EndTime()])


@pytest.mark.parametrize(
    ("name", "gas", "times"),
    [
        ("azomethane-samples", "azomethane", (300.0, 1200.0, 3000.0, 7200.0)),
        ("lamp-on-off", "NO", (30.0, 300.0, 590.0, 800.0)),
    ],
)
def test_samples_flows_and_lamps_are_those_of_a_single_run(name, gas, times):
    """The kernel restarts at the same breaks and draws, leaks and switches alike."""
    case = load_case(Path(__file__).parents[2] / "cases" / f"{name}.toml").experiment
    run = integrate(case)
    asked = [At("partial pressure", gas, t) for t in times]
    asked += [At("total pressure", "", t) for t in times]
    frame = many(case, {"temperature.value": [case.temperature.initial] * 2}, asked)
    ours = frame.iloc[0, 1:-1].to_numpy(float)
    p = run.partial_pressures(times)
    single = np.concatenate([p[run.index(gas)], p.sum(axis=0)])
    # both at rtol 1e-8, which each reaches within ten tolerances
    assert ours == pytest.approx(single, rel=1e-7)


def test_volumes_drawn_from_a_piston_are_refused():
    from laboratory import experiment, si, step

    from meanfree.experiment.samples import Sample

    case = experiment([step("A -> B", 0.1)], {"A": 1.0}, holds="pressure", until=10.0)
    case = replace(case, samples=(Sample(si(5.0), volume=si(1e-5)),))
    with pytest.raises(InputError) as caught:
        many(case, {"temperature.value": [300.0]}, [EndTime()])
    assert str(caught.value) == (
        "samples: found a volume drawn from a piston; expected samples as fractions: "
        "what a volume takes of a piston differs from run to run"
    )


@pytest.mark.parametrize("name", ["rigid", "piston"])
def test_the_highest_pressure_is_that_of_the_dense_output(tmp_path: Path, name: str) -> None:
    """A -> 2 B raises it, 2 B -> C lowers it again; a piston holds it."""
    e = experiment(tmp_path, name, 3e4)
    frame = many(e, {"steps.two.k": [0.2, 20.0]}, [HighestPressure()], rtol=1e-10)
    for row, k in enumerate((0.2, 20.0)):
        run = integrate(with_inputs(e, {"steps.two.k": k}))
        highest = run.pressure(np.geomspace(0.1, 3e4, 4000)).max()
        # the grid of times misses the top by half a step of 0.3 %: 1e-5 of the way, squared
        assert frame["p_highest_Pa"][row] == pytest.approx(highest, rel=1e-6)


def test_the_highest_pressure_of_a_moving_temperature_is_refused(tmp_path: Path) -> None:
    e = experiment(tmp_path, "program")
    many(e, {"steps.two.k": [1.0]}, [HighestPressure()])  # the piston holds it
    rigid = replace(e, vessel=replace(e.vessel, holds="volume"))
    with pytest.raises(InputError, match="the highest pressure as T changes"):
        many(rigid, {"steps.two.k": [1.0]}, [HighestPressure()])
