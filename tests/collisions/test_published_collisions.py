"""Speeds, collision rates and free paths against worked examples and standards in print."""

from __future__ import annotations

import math

import pytest
from scipy import constants
from validation import Checked

from meanfree.collisions import encounters, line_of_centres, speeds, walls

N_A, R = constants.N_A, constants.R


# ISO 2533:1975 Standard Atmosphere, tables: geometric altitude [m], T [K], p [Pa], then n [m^-3],
# mean particle speed [m/s], collision frequency [1/s], mean free path [m] as printed.
ISO_2533 = [
    (-2500, 304.406, 135205.0, "3.2173e25", "471.71", "8.9830e9", "5.2512e-8"),
    (0, 288.15, 101325.0, "2.5471e25", "458.94", "6.9193e9", "6.6328e-8"),
    (2000, 275.154, 79501.4, "2.0929e25", "448.48", "5.5558e9", "8.0723e-8"),
    (11000, 216.774, 22699.9, "7.5853e24", "398.07", "1.7872e9", "2.2273e-7"),
    (20000, 216.65, 5529.29, "1.8487e24", "397.95", "4.3546e8", "9.1387e-7"),
    (25000, 221.552, 2549.21, "8.3346e23", "402.43", "1.9853e8", "2.0270e-6"),
    (47350, 270.65, 110.906, "2.9683e22", "444.79", "7.8146e6", "5.6918e-5"),
    (61591, 242.65, 17.6605, "5.2720e21", "421.15", "1.3142e6", "3.2046e-4"),
]
ISO = "ISO 2533:1975 Standard Atmosphere"
ISO_MASS, ISO_DIAMETER, ISO_R, ISO_N_A = 28.96442e-3, 0.365e-9, 8.31432, 6.02257e23


@pytest.mark.parametrize("row", ISO_2533, ids=lambda row: f"{row[0]} m")
def test_standard_atmosphere_with_its_own_constants(
    row: tuple[int, float, float, str, str, str, str], checked: Checked
) -> None:
    # The standard has R = 8.31432 J/mol/K and N_A = 6.02257e23; the temperature and the
    # concentration are scaled so that R T and the number density are those of the standard.
    # The slack is the rounding of the printed temperature (0.0005 K) and pressure (6 digits).
    _, kelvin, pascal, density, speed, frequency, path = row
    slack = 0.0005 / kelvin + 5e-6
    scaled = kelvin * ISO_R / R
    number = pascal * ISO_N_A / (ISO_R * kelvin)
    concentration = number / N_A
    sigma = encounters.cross_section_from_diameters(ISO_DIAMETER, ISO_DIAMETER)
    relative = speeds.mean_relative_speed(ISO_MASS, ISO_MASS, scaled)
    checked("number density of air", number, density, "m⁻³", ISO, slack=slack)
    mean = speeds.mean_speed(ISO_MASS, scaled)
    checked("mean speed in air", mean, speed, "m/s", ISO, slack=slack)
    seen = encounters.collision_frequency(sigma, relative, concentration)
    checked("collision frequency in air", seen, frequency, "s⁻¹", ISO, slack=slack)
    free = encounters.mean_free_path(sigma, concentration)
    checked("mean free path in air", free, path, "m", ISO, slack=slack)


@pytest.mark.parametrize("row", ISO_2533, ids=lambda row: f"{row[0]} m")
def test_standard_atmosphere_with_constants_of_today(
    row: tuple[int, float, float, str, str, str, str], checked: Checked
) -> None:
    # R is 1.7e-5 higher and N_A 7.1e-5 lower today, so speeds rise by 8.6e-6, number densities
    # fall and free paths rise by 8.9e-5, collision frequencies fall by 8.0e-5.
    _, kelvin, pascal, _, speed, frequency, path = row
    slack = 0.0005 / kelvin + 5e-6
    concentration = pascal / (R * kelvin)
    sigma = encounters.cross_section_from_diameters(ISO_DIAMETER, ISO_DIAMETER)
    relative = speeds.mean_relative_speed(ISO_MASS, ISO_MASS, kelvin)
    today = ISO + ", with today's constants"
    mean = speeds.mean_speed(ISO_MASS, kelvin)
    checked("mean speed in air", mean, speed, "m/s", today, slack=slack + 8.6e-6)
    seen = encounters.collision_frequency(sigma, relative, concentration)
    checked("collision frequency in air", seen, frequency, "s⁻¹", today, slack=slack + 8.0e-5)
    free = encounters.mean_free_path(sigma, concentration)
    checked("mean free path in air", free, path, "m", today, slack=slack + 8.9e-5)


def test_us_standard_atmosphere_at_sea_level(checked: Checked) -> None:
    # US Standard Atmosphere 1976 (NOAA, NASA, USAF), section 1.3, sea level (from memory):
    # R = 8.31432 J/mol/K, N_A = 6.022169e23, M = 28.9644 g/mol, d = 0.365 nm; n = 2.547e25,
    # mean speed 458.94 m/s, collision frequency 6.9189e9 1/s, free path 6.6332e-8 m.
    gas_constant, avogadro, mass, kelvin = 8.31432, 6.022169e23, 28.9644e-3, 288.15
    scaled = kelvin * gas_constant / R
    number = 101325.0 * avogadro / (gas_constant * kelvin)
    sigma = encounters.cross_section_from_diameters(0.365e-9, 0.365e-9)
    relative = speeds.mean_relative_speed(mass, mass, scaled)
    source = "US Standard Atmosphere 1976 (from memory)"
    checked("number density of air, sea level", number, "2.547e25", "m⁻³", source)
    mean = speeds.mean_speed(mass, scaled)
    checked("mean speed in air, sea level", mean, "458.94", "m/s", source)
    frequency = encounters.collision_frequency(sigma, relative, number / N_A)
    checked("collision frequency in air, sea level", frequency, "6.9189e9", "s⁻¹", source)
    free = encounters.mean_free_path(sigma, number / N_A)
    checked("mean free path in air, sea level", free, "6.6332e-8", "m", source)


def test_argon_at_one_atmosphere(checked: Checked) -> None:
    # UC Davis CHE 107B, Solutions 2 (LibreTexts): Ar, 298 K, 1 atm, d = 3.62 angstrom:
    # n = 2.46e25 m^-3, mean speed 397.419 m/s, free path 6.982e-8 m (from n as rounded there).
    number = 101325.0 * N_A / (R * 298.0)
    source = "UC Davis CHE 107B, Solutions 2 (LibreTexts)"
    checked("number density of Ar, 298 K, 1 atm", number, "2.46e25", "m⁻³", source)
    # Constants of six figures or fewer there: 3e-6 is what R = 8.3145 moves a speed by.
    mean = speeds.mean_speed(39.948e-3, 298.0)
    checked("mean speed of Ar, 298 K", mean, "397.419", "m/s", source, slack=3e-6)
    sigma = encounters.cross_section_from_diameters(3.62e-10, 3.62e-10)
    free = encounters.mean_free_path(sigma, 2.46e25 / N_A)
    checked("mean free path of Ar, 298 K, 1 atm", free, "6.982e-8", "m", source)


def test_oxygen_collision_density(checked: Checked) -> None:
    # Duffey, Modern Physical Chemistry: A Molecular Approach, example 3.13: O2, 298.15 K,
    # 1 bar, r = 1.805 angstrom; sigma 4.094e-19 m^2, v_rel 628.13 m/s, n 2.429e25 m^-3,
    # Z_AA 7.588e34 m^-3 s^-1 with the half.
    sigma = encounters.cross_section_from_radii(1.805e-10, 1.805e-10)
    relative = speeds.mean_relative_speed(31.998e-3, 31.998e-3, 298.15)
    concentration = 1e5 / (R * 298.15)
    source = "Duffey, Modern Physical Chemistry, Ex. 3.13"
    checked("cross-section of O₂ + O₂", sigma, "4.094e-19", "m²", source)
    # R = 8.314 J/mol/K, as such books have it, lowers a speed by 2.8e-5.
    checked("mean relative speed of O₂", relative, "628.13", "m/s", source, slack=2.8e-5)
    checked("number density of O₂, 298 K, 1 bar", concentration * N_A, "2.429e25", "m⁻³", source)
    density = float(encounters.collision_density_like(sigma, relative, concentration)) * N_A
    # 7.5885 is on the edge of the printed 7.588, and R enters with -1.5 powers: 8.4e-5.
    name = "collision density of O₂ + O₂, with the half"
    checked(name, density, "7.588e34", "m⁻³ s⁻¹", source, slack=8.4e-5)


def test_nitrogen_in_a_vacuum_line(checked: Checked) -> None:
    # Worked problem (general chemistry): N2, 298.15 K, 1e-3 mmHg, d = 314 pm; n 3.24e19 m^-3,
    # mean speed 474.8 m/s (which takes M = 28.0 g/mol), free path 7.05 cm, Z1 6739.4 1/s,
    # Z11 1.09e23 m^-3 s^-1 with the half.
    number = 1e-3 * constants.mmHg * N_A / (R * 298.15)
    source = "a worked problem of general chemistry"
    checked("number density of N₂, 1e-3 mmHg", number, "3.24e19", "m⁻³", source)
    checked("mean speed of N₂, 298 K", speeds.mean_speed(28.0e-3, 298.15), "474.8", "m/s", source)
    sigma = encounters.cross_section_from_diameters(3.14e-10, 3.14e-10)
    free = 100.0 * float(encounters.mean_free_path(sigma, number / N_A))
    checked("mean free path of N₂, 1e-3 mmHg", free, "7.05", "cm", source)
    relative = speeds.mean_relative_speed(28.0e-3, 28.0e-3, 298.15)
    # Z1 there uses n as rounded. d is printed to three figures, which alone leaves 3e-3 open;
    # 1e-4 is what is left with 3.24e19.
    frequency = float(encounters.collision_frequency(sigma, relative, 3.24e19 / N_A))
    name = "collisions of a molecule of N₂, 1e-3 mmHg"
    checked(name, frequency, "6739.4", "s⁻¹", source, rel=1e-4)
    density = float(encounters.collision_density_like(sigma, relative, number / N_A)) * N_A
    name = "collision density of N₂ + N₂, with the half"
    checked(name, density, "1.09e23", "m⁻³ s⁻¹", source)


def test_hydrogen_and_iodine_hard_sphere_rate_constant(checked: Checked) -> None:
    # Textbook problem with a worked answer: H2 + I2, 700 K, d = 225 and 559 pm, the barrier of
    # 167 kJ/mol used as threshold: k = 0.273 L/mol/s.
    sigma = encounters.cross_section_from_diameters(225e-12, 559e-12)
    relative = speeds.mean_relative_speed(2.016e-3, 253.809e-3, 700.0)
    ceiling = encounters.collision_rate_constant(sigma, relative, like=False)
    k = 1000.0 * float(line_of_centres.rate_constant(ceiling, 167e3, 700.0))
    source = "a textbook problem with a worked answer"
    checked("k of H₂ + I₂, hard spheres, 700 K", k, "0.273", "L/mol/s", source)


def test_oxygen_atoms_and_benzene() -> None:
    # University tutorial with answer key: radii 78 and 265 pm, M 16 and 78 g/mol, Arrhenius
    # line Ea = 16641.3 J/mol, A = 1.11645e10 L/mol/s; the reactive cross-section at 340 K is
    # k exp(Ea/RT) / (v_rel N_A), the steric factor its ratio to pi (r_A + r_B)^2, here worked
    # by hand from these numbers (the key prints the line only).
    kelvin, Ea, A = 340.0, 16641.3, 1.11645e7
    v_rel = math.sqrt(8.0 * R * kelvin * (1 / 0.016 + 1 / 0.078) / math.pi)
    by_hand = A / (v_rel * N_A) / (math.pi * 343e-12**2)
    assert by_hand == pytest.approx(0.0681, abs=5e-5)
    sigma = encounters.cross_section_from_radii(78e-12, 265e-12)
    relative = speeds.mean_relative_speed(16e-3, 78e-3, kelvin)
    ceiling = encounters.collision_rate_constant(sigma, relative, like=False)
    constant = A * math.exp(-Ea / (R * kelvin))
    both = line_of_centres.steric_factors(constant, ceiling, Ea, kelvin)
    # The same arithmetic in another order: rounding, times Ea/RT in the exponent.
    assert both.a_over_z == pytest.approx(by_hand, rel=1e-13, abs=0.0)
    assert both.steric == pytest.approx(by_hand / math.sqrt(math.e), rel=1e-13, abs=0.0)
    assert not both.threshold.below_half_rt


# Atkins, Physical Chemistry, table of Arrhenius parameters for gas-phase reactions: A measured
# and A of collision theory [L/mol/s], Ea [kJ/mol], P as printed there.
ATKINS_TABLE = "Atkins, Physical Chemistry, table of Arrhenius parameters"
ATKINS = [
    ("2NOCl -> 2NO + Cl2", 9.4e9, 5.9e10, 102.0, "0.16"),
    ("2ClO -> Cl2 + O2", 6.3e7, 2.5e10, 0.0, "0.0025"),
    ("H2 + C2H4 -> C2H6", 1.24e6, 7.3e11, 180.0, "1.7e-6"),
    ("K + Br2 -> KBr + Br", 1.0e12, 2.1e11, 0.0, "4.8"),
]


@pytest.mark.parametrize("row", ATKINS, ids=lambda row: row[0])
def test_tabulated_steric_factors_are_a_over_z(
    row: tuple[str, float, float, float, str], checked: Checked
) -> None:
    # The table prints no temperature; the ratio of A to A is free of it.
    _, measured, theory, kilojoule, printed = row
    for kelvin in (300.0, 700.0):
        constant = 1e-3 * measured * math.exp(-1e3 * kilojoule / (R * kelvin))
        both = line_of_centres.steric_factors(constant, 1e-3 * theory, 1e3 * kilojoule, kelvin)
        checked("A over Z of four reactions", both.a_over_z, printed, "", ATKINS_TABLE)
        gap = 1.0 if kilojoule == 0.0 else math.exp(0.5)
        assert both.a_over_z == pytest.approx(gap * float(both.steric), rel=1e-12, abs=0.0)
        assert both.threshold.below_half_rt is (kilojoule == 0.0)


def test_harpoon_cross_section_of_potassium_and_bromine(checked: Checked) -> None:
    # Harpoon estimate as in Atkins, Physical Chemistry: ionisation energy of K 420 kJ/mol,
    # electron affinity of Br2 250 kJ/mol, d = 400 pm: P = (R*/d)^2 = 4.2 (value from memory).
    distance = constants.e**2 * N_A / (4.0 * math.pi * constants.epsilon_0 * 170e3)
    reactive = float(encounters.cross_section_from_diameters(distance, distance))
    collision = float(encounters.cross_section_from_diameters(400e-12, 400e-12))
    source = "Atkins, Physical Chemistry (from memory)"
    checked("P of K + Br₂ by the harpoon", reactive / collision, "4.2", "", source)


def test_impingement_of_nitrogen(checked: Checked) -> None:
    # Semiconductor-process calculator, 3.5e22 p/sqrt(M T) with p in torr: N2 at 1e-6 torr,
    # 298 K: 3.833e14 cm^-2 s^-1, and 2.6089 s for 1e15 sites per cm^2 at sticking 1. The
    # coefficient, 3.513 rounded to two figures, makes that flux 0.37 % low.
    concentration = 1e-6 * constants.torr / (R * 298.0)
    flux = walls.impingement_flux(concentration, speeds.mean_speed(28e-3, 298.0))
    per_area = float(walls.wall_collisions(flux, 1e-4))
    source = "a calculator of semiconductor processes, its coefficient rounded"
    name = "impingement of N₂, 1e-6 torr, 298 K"
    checked(name, per_area, "3.833e14", "cm⁻² s⁻¹", source, rel=3.7e-3)
    name = "time to a monolayer of N₂, 1e-6 torr"
    checked(name, 1e15 / per_area, "2.6089", "s", source, rel=3.7e-3)
    # Atkins, Physical Chemistry, collision flux (from memory): N2, 1 bar, 300 K, 2.87e27 /m^2/s.
    flux = walls.impingement_flux(1e5 / (R * 300.0), speeds.mean_speed(28.0134e-3, 300.0))
    found = walls.wall_collisions(flux, 1.0)
    source = "Atkins, Physical Chemistry (from memory)"
    checked("impingement of N₂, 1 bar, 300 K", found, "2.87e27", "m⁻² s⁻¹", source)
