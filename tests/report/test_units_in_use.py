"""The units in which a case is shown: those in which its reader thinks of the whole."""

from __future__ import annotations

from pathlib import Path

from small_cases import load_text

from meanfree.report.wording import units_in_use

CASE = """
title = "Nitrosyl chloride"
[vessel]
holds = "volume"
volume = "1800 mL"
rated_pressure = "2 bar"
[temperature]
mode = "isothermal"
value = "480 K"
[fill]
@FILL@
[[steps]]
name = "decomposition"
reaction = "2 NOCl -> 2 NO + Cl2"
law = "arrhenius"
A = "9.4e9 L/mol/s"
Ea = "102 kJ/mol"
"""


def pressure_with(tmp_path: Path, fill: str, **replaced: str) -> str:
    text = CASE.replace("@FILL@", fill)
    for old, new in replaced.items():
        text = text.replace(f'{old} = "volume"', new)
    return units_in_use(load_text(tmp_path, text).experiment).pressure


def test_a_total_decides_before_its_parts(tmp_path: Path) -> None:
    mixed = 'total = "1.2 atm"\ngases = { NOCl = "50 torr", Ar = "balance" }'
    assert pressure_with(tmp_path, mixed) == "atm"
    assert pressure_with(tmp_path, 'total = "1.2 atm"\ngases = { NOCl = 0.1, Ar = 0.9 }') == "atm"


def test_the_gases_decide_before_the_vessel(tmp_path: Path) -> None:
    assert pressure_with(tmp_path, 'gases = { NOCl = "50 torr", Ar = "2 kPa" }') == "torr"
    assert pressure_with(tmp_path, 'gases = { NOCl = "1 mmol" }') == "bar"
    piston = {"holds": 'holds = "pressure"\npressure = "15 psi"'}
    assert pressure_with(tmp_path, 'gases = { NOCl = "1 mmol" }', **piston) == "psi"
