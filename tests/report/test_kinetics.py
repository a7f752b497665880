"""Rows of rate constants: units and counting come from the case, wherever its numbers stand."""

from __future__ import annotations

from pathlib import Path

import pytest
from scipy.constants import N_A
from small_cases import GOOD, LAW, load_edited

from meanfree.integrate.single import integrate
from meanfree.report.kinetics import RateConstant, rate_constants

TABLE = 'law = "table"\npoints = [["470 K", "3e-2 L/mol/min"], ["490 K", "6e-2 L/mol/min"]]\n'
FALLOFF = """law = "falloff"
k0 = { A = "2e-34 cm^6/s" }
kinf = { A = "6e-20 cm^3/s" }
broadening = "none"
"""


def row(folder: Path, *edits: tuple[str, str]) -> RateConstant:
    case = load_edited(folder, ('until = "auto"', 'until = "1 s"'), *edits, base=GOOD)
    return rate_constants(integrate(case.experiment))[0]


def test_a_table_keeps_its_unit_and_its_counting(tmp_path: Path) -> None:
    """Loss of two: at 480 K ln k is linear in 1/T between 0.03 and 0.06 L/mol/min."""
    found = row(tmp_path, (LAW, TABLE + 'k_counts = "loss of NOCl"\n'))
    share = (1 / 470 - 1 / 480) / (1 / 470 - 1 / 490)
    assert found.shown_unit == "L/mol/min"
    assert found.per == 2
    assert found.in_case == pytest.approx(0.03 * 2**share, rel=1e-12)
    assert found.k == pytest.approx(0.03 * 2**share * 1e-3 / 60 / 2, rel=1e-12)
    assert found.shown_as_counted.endswith("L/mol/min (loss of NOCl)")


def test_falloff_keeps_the_unit_of_its_limit(tmp_path: Path) -> None:
    edits = (("2 NOCl -> 2 NO + Cl2", "2 NOCl + M -> 2 NO + Cl2 + M"), (LAW, FALLOFF))
    found = row(tmp_path, *edits)
    M = 185 * 101325 / 760 / (1.380649e-23 * 296) * 1e-6  # molecules/cm^3, filled at 296 K
    low = 2e-34 * M
    assert found.shown_unit == "cm^3/molecule/s"
    assert found.in_case == pytest.approx(low / (1 + low / 6e-20), rel=1e-8)
    assert found.k == pytest.approx(found.in_case * 1e-6 * N_A, rel=1e-12)
