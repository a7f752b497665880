"""Cross-sections against tables of diameters and of measured gas-kinetic cross-sections."""

from __future__ import annotations

import math

import pytest
from validation import Checked

from meanfree.collisions.encounters import cross_section_from_diameters

# B. M. Smirnov, Fundamentals of Ionized Gases, Table 4.5: gas-kinetic cross-sections at room
# temperature [1e-15 cm^2 = 0.1 nm^2], from transport; each row starts with the like pair.
GASES = ("He", "Ne", "Ar", "Kr", "Xe", "H2", "N2", "O2", "CO", "CO2")
SMIRNOV = (
    (1.3, 1.5, 2.1, 2.4, 2.7, 1.7, 2.3, 2.2, 2.2, 2.7),
    (1.8, 2.6, 3.0, 3.3, 2.0, 2.4, 2.5, 2.7, 3.1),
    (3.7, 4.2, 5.0, 2.7, 3.8, 3.9, 4.0, 4.4),
    (4.8, 5.7, 3.2, 4.4, 4.3, 4.4, 4.9),
    (6.8, 3.7, 5.0, 5.2, 5.0, 6.1),
    (2.0, 2.8, 2.7, 2.9, 3.4),
    (3.9, 3.8, 3.7, 4.9),
    (3.8, 3.7, 4.4),
    (4.0, 4.9),
    (7.5,),
)


def test_mean_diameters_against_measured_unlike_pairs() -> None:
    # The rule of the mean diameter is an approximation: against the 45 unlike entries it is
    # right to 14 % (root mean square), and worst, 39 % high, for helium with carbon dioxide.
    # The figures were worked out independently; the entries have two digits.
    like = {gas: row[0] * 1e-19 for gas, row in zip(GASES, SMIRNOV, strict=True)}
    diameter = {gas: math.sqrt(area / math.pi) for gas, area in like.items()}
    deviations = {}
    for i, row in enumerate(SMIRNOV):
        for j, entry in enumerate(row[1:], start=i + 1):
            pair = (GASES[i], GASES[j])
            ours = float(cross_section_from_diameters(diameter[pair[0]], diameter[pair[1]]))
            deviations[pair] = ours / (entry * 1e-19) - 1.0
    assert len(deviations) == 45
    rms = math.sqrt(sum(d**2 for d in deviations.values()) / 45)
    assert rms == pytest.approx(0.136624782555, rel=1e-9, abs=0.0)  # the same arithmetic: rounding
    worst = max(deviations, key=lambda pair: abs(deviations[pair]))
    assert worst == ("He", "CO2")
    assert deviations[worst] == pytest.approx(0.393055370222, rel=1e-9, abs=0.0)
    for gas in GASES:
        ours = float(cross_section_from_diameters(diameter[gas], diameter[gas]))
        assert ours == pytest.approx(like[gas], rel=1e-14, abs=0.0)


@pytest.mark.parametrize(
    ("gas", "picometre", "measured", "within"),
    [
        # Breck, Zeolite Molecular Sieves (1974): kinetic diameters, against the table above.
        # They are what passes a sieve, not gas-kinetic diameters: near for round molecules,
        # far too small for long ones, too large for the lightest, whose transport is soft.
        ("Ar", 340.0, 0.37, 0.02),
        ("O2", 346.0, 0.38, 0.02),
        ("N2", 364.0, 0.39, 0.07),
        ("H2", 289.0, 0.20, 0.32),
        ("He", 260.0, 0.13, 0.64),
        ("CO2", 330.0, 0.75, 0.55),
    ],
)
def test_sieve_diameters_against_measured_cross_sections(
    gas: str, picometre: float, measured: float, within: float
) -> None:
    ours = 1e18 * float(cross_section_from_diameters(picometre * 1e-12, picometre * 1e-12))
    assert abs(ours / measured - 1.0) < within, gas
    # and no nearer than that by more than the two printed digits explain
    assert abs(ours / measured - 1.0) > within - 0.03, gas


@pytest.mark.parametrize(
    ("picometre", "square_nanometre"),
    [
        # Atkins, Physical Chemistry, data section: collision cross-sections [nm^2]; He and Ar
        # with Breck's diameters, N2 (from memory) with 370 pm.
        (260.0, "0.21"),
        (340.0, "0.36"),
        (370.0, "0.43"),
    ],
)
def test_collision_cross_sections_of_atkins(
    picometre: float, square_nanometre: str, checked: Checked
) -> None:
    ours = 1e18 * float(cross_section_from_diameters(picometre * 1e-12, picometre * 1e-12))
    source = "Atkins, Physical Chemistry, data section (N₂ from memory)"
    checked("cross-sections of He, Ar, N₂", ours, square_nanometre, "nm²", source)
