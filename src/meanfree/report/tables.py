"""The CSV files that a run leaves: SI, units in the headers, safe to open in a spreadsheet."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence

import numpy as np

from meanfree.equations.system import Floats
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.kinetics import RateConstant
from meanfree.report.run_models import RunSummary
from meanfree.report.sampling import table_times
from meanfree.sourced import Sourced

Cell = str | float | int | None

_FORMULA = ("=", "+", "-", "@", "\t", "\r")
DIGITS = 10
"""Significant digits of a number in a table: one more than the integrators reach."""


def text_cell(text: object) -> str:
    """Text that no spreadsheet takes for a formula, without control characters.

    >>> text_cell("=cmd()"), text_cell("NOCl"), text_cell("-x")
    ("'=cmd()", 'NOCl', "'-x")
    """
    plain = wording.clean(text)
    return f"'{plain}" if plain.lstrip().startswith(_FORMULA) else plain


def _cell(value: Cell) -> str:
    if value is None:
        return ""
    if isinstance(value, str):
        return text_cell(value)
    return f"{float(value):.{DIGITS}g}"


def to_csv(header: Sequence[str], rows: Iterable[Sequence[Cell]]) -> str:
    """A table as CSV (RFC 4180 but for line feeds alone); None is an empty cell."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([text_cell(name) for name in header])
    writer.writerows([[_cell(value) for value in row] for row in rows])
    return out.getvalue()


def tables(run: Run, summary: RunSummary, rows: Sequence[RateConstant]) -> dict[str, str]:
    """Every table of a run: file name to text."""
    return {
        "profiles.csv": profiles(run, table_times(run, summary)),
        "half_lives.csv": half_lives(run),
        "conversions.csv": conversions(summary),
        "rate_constants.csv": constants(rows),
        "gases.csv": gases(run),
    }


def profiles(run: Run, times: Floats) -> str:
    """Concentrations, partial pressures, pressure, temperature, volume and rates against time."""
    names, steps = run.system.gases, run.system.steps
    header = ["time_s"]
    header += [f"c_{name}_mol_per_m3" for name in names]
    header += [f"p_{name}_Pa" for name in names]
    header += ["p_total_Pa", "T_K", "V_m3"]
    header += [f"r_{name}_mol_per_m3_s" for name in steps]
    partial = run.partial_pressures(times)
    block = [
        times[None, :],
        run.concentrations(times),
        partial,
        partial.sum(axis=0)[None, :],
        run.temperature(times)[None, :],
        run.volume(times)[None, :],
    ]
    if steps:
        block.append(run.rates(times))
    return to_csv(header, np.vstack(block).T.tolist())


def half_lives(run: Run) -> str:
    """Successive half-lives of every filled gas that is consumed; empty: not reached."""
    found = [half for gas in run.consumed for half in run.half_lives(gas)]
    return to_csv(
        ("gas", "ordinal", "start_s", "duration_s"),
        [(half.gas, half.ordinal, half.start, half.duration) for half in found],
    )


def conversions(summary: RunSummary) -> str:
    """Times to stated conversions; empty: not reached."""
    return to_csv(
        ("gas", "conversion", "time_s"),
        [
            (answer.gas, entry.conversion, entry.time_s)
            for answer in summary.gases
            for entry in answer.reaction_times
        ],
    )


def constants(rows: Sequence[RateConstant]) -> str:
    """Rate constants against their collision limit, SI, per event whatever the case counts."""
    header = "step,reaction,law,counts,T_K,k,unit,Z,steric_factor,A_over_Z,verdict,source"
    return to_csv(
        header.split(","),
        [
            (
                row.step,
                row.reaction,
                row.law,
                "events",
                row.temperature,
                row.k,
                row.unit,
                None if row.ceiling is None else row.ceiling.Z,
                None if row.judgement is None else row.judgement.steric,
                None if row.judgement is None else row.judgement.A_over_Z,
                row.verdict,
                row.source,
            )
            for row in rows
        ],
    )


def gases(run: Run) -> str:
    """What is known of every gas and of how much there is, each value followed by its source."""
    header = [
        *("gas", "formula", "cas", "filled_mol"),
        *("molar_mass_kg_per_mol", "molar_mass_source"),
        *("diameter_m", "diameter_source"),
        *("enthalpy_298_J_per_mol", "enthalpy_source"),
        *("entropy_298_J_per_mol_K", "entropy_source"),
        *("heat_capacity_298_J_per_mol_K", "heat_capacity_source"),
    ]
    rows: list[list[Cell]] = []
    for gas in run.experiment.gases:
        thermo = gas.thermochemistry
        row: list[Cell] = [gas.name, None if gas.formula is None else str(gas.formula), gas.cas]
        row.append(float(run.experiment.moles[gas.name]))
        row += _with_source(gas.molar_mass) + _with_source(gas.diameter)
        if thermo is None:
            row += [None] * 6
        else:
            row += _with_source(thermo.enthalpy_298) + _with_source(thermo.entropy_298)
            row += [float(thermo.heat_capacity(298.15)), thermo.heat_capacity_source]
        rows.append(row)
    return to_csv(header, rows)


def _with_source(value: Sourced | None) -> list[Cell]:
    return [None, None] if value is None else [value.value, value.source or "the case file"]
