"""Hazard data and vapour pressures: what is known, and that the rest is "not known"."""

from __future__ import annotations

from dataclasses import fields
from itertools import pairwise

import numpy as np
import pytest
from scipy.constants import atm
from validation import Checked

from meanfree.gases.condensation import (
    SOURCES,
    condenses,
    library_vapour,
    saturation,
    vapour_of,
    vapour_pressure,
)
from meanfree.gases.gas import Gas
from meanfree.gases.hazards import Hazards, hazards_of, library_hazards
from meanfree.gases.identity import find_gas
from meanfree.gases.pinned import pinned_gases


def test_flammability_against_standards(checked: Checked) -> None:
    """NFPA 497 and IEC 60079-20-1: hydrogen 4 to 77 %, methane 4.4 to 17 %, CO 10.9 to 74 %."""
    for name, low, high in (("H2", 0.04, 0.77), ("CH4", 0.044, 0.17), ("CO", 0.109, 0.74)):
        found = hazards_of(find_gas(name))
        assert found.lower_flammable is not None
        assert found.upper_flammable is not None
        for limit, value in ((found.lower_flammable, low), (found.upper_flammable, high)):
            name = "flammability limits of H₂, CH₄, CO"
            checked(name, limit.value, f"{value}", "", "IEC 60079-20-1 (2010)", rel=1e-12)
        assert found.lower_flammable.source == "IEC 60079-20-1 (2010)"
    ignition = hazards_of(find_gas("H2")).autoignition
    assert ignition is not None
    assert ignition.value == pytest.approx(273.15 + 560.0)  # IEC: 560 C


def test_exposure_limits_are_mole_fractions() -> None:
    """Ontario: chlorine 0.5 ppm over 8 h, 1 ppm over 15 min."""
    found = hazards_of(find_gas("Cl2"))
    assert found.time_weighted is not None
    assert found.short_term is not None
    assert found.time_weighted.value == pytest.approx(0.5e-6, rel=1e-12)
    assert found.short_term.value == pytest.approx(1e-6, rel=1e-12)
    assert found.time_weighted.unit == "ppm"
    assert found.ceiling is None
    ceiling = hazards_of(find_gas("HCl")).ceiling
    assert ceiling is not None
    assert ceiling.value == pytest.approx(2e-6, rel=1e-12)


def test_not_known_is_none_and_not_zero() -> None:
    assert hazards_of(find_gas("Ar")) == Hazards()
    assert not hazards_of(find_gas("Ar")).anything_known
    assert hazards_of(Gas.label("A")) == Hazards()
    assert hazards_of(find_gas("H3O+")) == Hazards()
    assert hazards_of(find_gas("CO")).anything_known
    assert hazards_of(find_gas("OH")).lower_flammable is None


@pytest.mark.parametrize(
    ("name", "boiling"),
    # Normal boiling points, CRC Handbook (from memory)
    [
        ("H2O", 373.12),
        ("benzene", 353.24),
        ("Br2", 331.9),
        ("Cl2", 239.11),
        ("NH3", 239.82),
        ("CH3CHO", 293.9),
        ("acetone", 329.20),
        ("NOCl", 267.6),
        ("n-pentane", 309.21),
        ("SO2", 263.10),
        ("HF", 292.67),
        ("N2O4", 294.3),
        ("NF3", 144.1),
        ("O3", 161.8),
    ],
)
def test_boiling_points(name: str, boiling: float, checked: Checked) -> None:
    """Vapour pressure 1 atm: 1 % covers 0.3 K in the boiling point and the fit's own error."""
    found = vapour_pressure(find_gas(name), boiling)
    assert found is not None
    quantity = "vapour pressure of 14 gases where they boil"
    source = "boiling points, CRC Handbook (from memory)"
    checked(quantity, found.value / atm, "1", "atm", source, rel=0.012)
    assert found.source in SOURCES.values()


@pytest.mark.parametrize(
    ("name", "boiling"), [("HF", 292.67), ("CHCl3", 334.3), ("benzene", 353.24)]
)
def test_every_form_of_correlation_boils_where_it_should(name: str, boiling: float) -> None:
    """Five sources, three forms, one boiling point (CRC Handbook, from memory): 1.5 % is 0.4 K."""
    tables = vapour_of(find_gas(name).cas or "").tables
    covering = [table for table in tables if table.low <= boiling <= table.high]
    assert {"perry", "mcgarry", "vdi"} <= {table.kind for table in covering}
    for table in covering:
        assert table.pressure(boiling) == pytest.approx(atm, rel=0.015), table.kind


def test_iodine_is_a_solid_at_room_temperature(checked: Checked) -> None:
    """Sublimation pressure of iodine 41 Pa at 298.15 K (CRC Handbook, from memory)."""
    iodine = find_gas("I2")
    found = vapour_pressure(iodine, 298.15)
    assert found is not None
    source = "CRC Handbook (from memory)"
    checked("vapour pressure of solid I₂, 298 K", found.value, "41", "Pa", source, rel=0.03)
    assert "solid" in found.source
    assert condenses(iodine, 298.15, 100.0) is True
    assert condenses(iodine, 298.15, 30.0) is False


def test_nothing_condenses_above_its_critical_temperature() -> None:
    assert condenses(find_gas("N2"), 298.15, 1e8) is False
    assert condenses(find_gas("H2O"), 700.0, 1e8) is False
    assert condenses(find_gas("H2O"), 298.15, 3000.0) is False
    assert condenses(find_gas("H2O"), 298.15, 3300.0) is True  # 3169 Pa


def test_not_known_or_out_of_range_is_none() -> None:
    assert vapour_pressure(find_gas("OH"), 298.15) is None
    assert condenses(find_gas("OH"), 298.15, 1e5) is None
    assert condenses(Gas.label("A"), 298.15, 1e5) is None
    assert vapour_pressure(find_gas("H2O"), 10.0) is None
    assert condenses(find_gas("H3O+"), 298.15, 1e5) is None


def test_what_rises_with_temperature_settles_it_outside_the_tables() -> None:
    """Water freezes at 273.16 K with 611.66 Pa (the triple point, IAPWS); below, it has less."""
    water = find_gas("H2O")
    coldest = min(table.low for table in vapour_of(water.cas or "").tables)
    cold = coldest - 5.0
    assert vapour_pressure(water, cold) is None
    assert condenses(water, cold, 1000.0) is True
    assert condenses(water, cold, 1e-9) is None
    settles = saturation(water, cold, 1000.0)
    assert settles is not None
    # correlations begin within 0.05 K of the triple point, where 0.05 K is 0.4 %
    assert settles.value == pytest.approx(611.66, rel=0.005)
    assert settles.source.endswith(f" K: less at {cold:.5g} K")
    # just below the critical temperature, where the correlations end (all but one of the gases)
    for gas in pinned_gases():
        vapour = vapour_of(gas.cas)
        if vapour.critical_temperature is None or not vapour.tables:
            continue
        hottest = max(vapour.tables, key=lambda table: table.high)
        T = 0.5 * (hottest.high + vapour.critical_temperature.value)
        if hottest.high < T < vapour.critical_temperature.value:
            highest = max(table.pressure(table.high) for table in vapour.tables if table.high < T)
            found = find_gas(gas.name)
            assert condenses(found, T, 0.999 * highest) is False, gas.name
            assert condenses(found, T, 1.001 * highest) is None, gas.name


def test_every_correlation_rises_within_its_range() -> None:
    for gas in pinned_gases():
        for table in vapour_of(gas.cas).tables:
            t = np.linspace(table.low, table.high, 30)
            p = [table.pressure(float(x)) for x in t]
            assert all(b > a > 0 for a, b in pairwise(p)), (gas.name, table.kind)


def test_pinned_vapour_pressures_are_those_of_the_library() -> None:
    for gas in pinned_gases():
        pinned, library = vapour_of(gas.cas), library_vapour(gas.cas)
        mine_critical, critical = pinned.critical_temperature, library.critical_temperature
        assert (mine_critical is None) == (critical is None)
        if mine_critical is not None and critical is not None:
            assert mine_critical.value == pytest.approx(critical.value, rel=1e-11)
            assert mine_critical.source == critical.source
        assert [t.kind for t in pinned.tables] == [t.kind for t in library.tables]
        for mine, theirs in zip(pinned.tables, library.tables, strict=True):
            # twelve digits are kept
            np.testing.assert_allclose(
                (mine.low, mine.high, *mine.numbers),
                (theirs.low, theirs.high, *theirs.numbers),
                rtol=1e-11,
            )


def test_a_compound_that_is_not_pinned() -> None:
    """Styrene boils at 418.3 K (CRC Handbook, from memory)."""
    found = vapour_pressure(find_gas("styrene"), 418.3)
    assert found is not None
    assert found.value == pytest.approx(atm, rel=0.02)


def test_pinned_hazards_are_those_of_the_library() -> None:
    for gas in pinned_gases():
        pinned, library = hazards_of(find_gas(gas.name)), library_hazards(gas.cas)
        for field in fields(Hazards):
            mine, theirs = getattr(pinned, field.name), getattr(library, field.name)
            assert (mine is None) == (theirs is None), (gas.name, field.name)
            if mine is not None:
                # ten digits are kept
                assert mine.value == pytest.approx(theirs.value, rel=1e-9)
                assert (mine.unit, mine.source) == (theirs.unit, theirs.source)
