"""The CSV files: read back what the run holds, and nothing in them is a formula."""

from __future__ import annotations

import csv
import io
from itertools import pairwise

import numpy as np
import pytest
from small_runs import dimerisation

from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.report.kinetics import rate_constants
from meanfree.report.summary import summarise
from meanfree.report.tables import tables, text_cell

# Ten significant digits are written.
DIGITS = 1e-9


def tables_of(run: Run) -> dict[str, list[dict[str, str]]]:
    summary = summarise(run, case="case.toml", case_sha256="0", version="0")
    texts = tables(run, summary, rate_constants(run))
    return {name: list(csv.DictReader(io.StringIO(text))) for name, text in texts.items()}


def test_profiles_read_back_as_the_run(nocl_run: Run) -> None:
    rows = tables_of(nocl_run)["profiles.csv"]
    assert list(rows[0]) == [
        "time_s",
        *(f"c_{gas}_mol_per_m3" for gas in ("NOCl", "Ar", "NO", "Cl2")),
        *(f"p_{gas}_Pa" for gas in ("NOCl", "Ar", "NO", "Cl2")),
        "p_total_Pa",
        "T_K",
        "V_m3",
        "r_decomposition_mol_per_m3_s",
        "r_decomposition (reverse)_mol_per_m3_s",
    ]
    times = np.array([float(row["time_s"]) for row in rows])
    assert times[0] == 0
    assert times[-1] == pytest.approx(nocl_run.end, rel=DIGITS)
    assert np.all(np.diff(times) > 0)
    c = np.array([float(row["c_NO_mol_per_m3"]) for row in rows])
    exact = nocl_run.concentrations(np.minimum(times, nocl_run.end))[nocl_run.index("NO")]
    # the times themselves are rounded to ten digits
    assert c == pytest.approx(exact, rel=1e-8, abs=1e-12)
    p = np.array([[float(row[f"p_{gas}_Pa"]) for gas in nocl_run.system.gases] for row in rows])
    total = np.array([float(row["p_total_Pa"]) for row in rows])
    assert p.sum(axis=1) == pytest.approx(total, rel=DIGITS)


def test_profiles_hold_the_times_that_the_answers_name(dimer_run: Run) -> None:
    found = tables_of(dimer_run)
    times = {row["time_s"] for row in found["profiles.csv"]}
    assert {row["time_s"] for row in found["conversions.csv"]} <= times


def test_half_lives_follow_each_other_and_the_last_is_empty(dimer_run: Run) -> None:
    rows = tables_of(dimer_run)["half_lives.csv"]
    assert [row["ordinal"] for row in rows] == [str(n) for n in range(1, 11)]
    for before, after in pairwise(rows):
        end = float(before["start_s"]) + float(before["duration_s"])
        assert float(after["start_s"]) == pytest.approx(end, rel=DIGITS)
    assert rows[-1]["duration_s"] == ""


def test_rate_constants_are_per_event_with_their_ceiling(nocl_run: Run, dimer_run: Run) -> None:
    forward, reverse = tables_of(nocl_run)["rate_constants.csv"]
    names = "step,reaction,law,counts,T_K,k,unit,Z,steric_factor,A_over_Z,verdict,source"
    assert list(forward) == names.split(",")
    assert (forward["counts"], forward["unit"]) == ("events", "m^3/mol/s")
    # P and A over Z differ by exp(1/2) above the threshold
    ratio = float(forward["A_over_Z"]) / float(forward["steric_factor"])
    assert ratio == pytest.approx(1.6487212707, rel=DIGITS)
    assert reverse["unit"] == "m^6/mol^2/s"
    assert (reverse["Z"], reverse["steric_factor"]) == ("", "")
    (labels,) = tables_of(dimer_run)["rate_constants.csv"]
    assert labels["counts"] == "events"
    assert labels["verdict"] == "no ceiling: a mass or a diameter is not known"


def test_gases_name_a_source_for_each_value(nocl_run: Run) -> None:
    for row in tables_of(nocl_run)["gases.csv"]:
        for key, value in row.items():
            if key.endswith("_source"):
                assert value


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", " =1", "\r=1"])
def test_text_that_a_spreadsheet_would_run_is_disarmed(text: str) -> None:
    assert text_cell(text).startswith("'")


def test_hostile_names_stay_names() -> None:
    run = integrate(dimerisation(names=("=cmd()", "\x1b[31m,red")))
    found = tables_of(run)
    assert found["half_lives.csv"][0]["gas"] == "'=cmd()"
    assert "c_\\u001b[31m,red_mol_per_m3" in found["profiles.csv"][0]
