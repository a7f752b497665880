"""Capture rate constants against published ones, and the harpoon estimate."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from encounters import meeting, molecule
from laboratory import si
from scipy import constants
from scipy.constants import N_A, e, k, pi, u
from validation import Checked

from meanfree.gases.gas import Gas
from meanfree.rates.capture import Capture
from meanfree.rates.collision import Collision
from meanfree.rates.long_range import capture_ratio

CM3 = 1e-6 * N_A
A3 = 1e-30
BOHR = constants.value("Bohr radius")
HARTREE = constants.value("Hartree energy")
DEBYE = 1e-21 / constants.c
ROTATION = constants.hbar**2 / 2 * N_A  # rotational constant times moment of inertia
H2 = molecule("H2")


def ion(first: Gas, second: Gas, alpha: float, **options: Any) -> Capture:
    neutral = second if first.charge else first
    kind = "ion and permanent dipole" if "dipole" in options else "ion and induced dipole"
    return Capture(kind, polarisability={neutral.name: si(alpha)}, **options)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("first", "published", "digits"),
    [("H2+", "2.08e-9", 0.015e-9), ("Ar+", "1.50e-9", 0.005e-9)],
)
def test_ions_with_hydrogen(first: str, published: str, digits: float, checked: Checked) -> None:
    """Gioumousis and Stevenson's tables (from memory), alpha(H2) = 0.787 A^3.

    For H2+ the published number rests on a slightly larger polarisability: 0.7 %.
    """
    charged = molecule(first)
    law = ion(charged, H2, 0.787 * A3)
    k_L = law.rate_constant(meeting(charged, H2), 300.0) / CM3
    source = "ion-molecule tables after Gioumousis and Stevenson (from memory)"
    checked(f"capture of H₂ by {first}", k_L, published, "cm³/s", source, within=digits)


def test_coefficient_of_the_induced_dipole(checked: Checked) -> None:
    """k_L = 2.342e-9 cm^3/s sqrt(alpha[A^3]/mu[u]) (Su and Chesnavich 1982, from memory)."""
    first, second = molecule("H+", 2e-3), molecule("H2", 2e-3)
    law = ion(first, second, 1 * A3)
    value = law.rate_constant(meeting(first, second), np.array([100.0, 900.0])) / CM3
    # mu is 1 u to the 4e-10 by which the molar mass constant is not 1 g/mol
    source = "Su and Chesnavich (1982, from memory)"
    checked("Langevin coefficient, 1 Å³, 1 u", value, "2.342e-9", "cm³/s", source)
    assert np.ndim(value) == 0  # the same at both temperatures


def test_ytterbium_and_its_ion(checked: Checked) -> None:
    """Grier et al., Phys. Rev. Lett. 102, 223201 (2009): half of Langevin's, 6e-10 cm^3/s.

    alpha = 143 a.u., mu = 87 u. The half is one of two electronic states, so a factor that is
    stated; Yb and Yb+ are unlike partners.
    """
    first, second = molecule("Yb+", 174e-3), molecule("Yb", 174e-3)
    law = ion(first, second, 143 * BOHR**3, electronic_factor=si(0.5))
    value = law.rate_constant(meeting(first, second), 0.01) / CM3
    source = "Grier et al., Phys. Rev. Lett. 102, 223201 (2009)"
    checked("charge exchange of Yb⁺ and Yb", value, "6e-10", "cm³/s", source)
    # 2 pi e sqrt(alpha/mu)/2 in electrostatic units, to six digits
    assert value == pytest.approx(5.77918e-10, rel=1e-5)


H3O, NH3 = molecule("H3O+"), molecule("NH3")
PROTON = {"dipole": si(1.4718 * DEBYE)}


def test_hydronium_and_ammonia(checked: Checked) -> None:
    """Su and Chesnavich 1982 (from memory): 2.6e-9 cm^3/s at 300 K; x = 3.526, K = 2.301."""
    law, where = ion(H3O, NH3, 2.103 * A3, **PROTON), meeting(H3O, NH3)
    assert law.reduced_dipole(where, 300.0) == pytest.approx(3.52624, rel=1e-5)
    assert law.enhancement(where, 300.0) == pytest.approx(2.30096, rel=1e-5)
    value = law.rate_constant(where, 300.0) / CM3
    source = "Su and Chesnavich, J. Chem. Phys. 76, 5183 (1982) (from memory)"
    checked("capture of NH₃ by H₃O⁺, 300 K", value, "2.6e-9", "cm³/s", source)
    assert value == pytest.approx(2.60696e-9, rel=2e-4)  # atomic masses to four digits


def test_the_two_branches_meet_at_two() -> None:
    """(2.509)^2/10.526 + 0.9754 = 1.57345 below, 2 * 0.4767 + 0.62 = 1.5734 from x = 2 on."""
    below, above = capture_ratio(np.nextafter(2.0, 0.0)), capture_ratio(2.0)
    assert below == pytest.approx(1.57345064, rel=1e-8)
    assert above == pytest.approx(1.5734, rel=1e-14)
    assert capture_ratio(1.0) == pytest.approx(1.509**2 / 10.526 + 0.9754, rel=1e-14)


def test_without_a_dipole_the_fit_nears_langevin() -> None:
    """(0.509)^2/10.526 + 0.9754 = 1.00001: the fit's own distance from 1."""
    law = ion(H3O, NH3, 2.103 * A3, dipole=si(0.0))
    bare = ion(H3O, NH3, 2.103 * A3)
    where = meeting(H3O, NH3)
    ratio = law.rate_constant(where, 300.0) / bare.rate_constant(where, 300.0)
    assert ratio == pytest.approx(1.0, abs=2e-5)


def test_dispersion_coefficient_of_eight_and_a_half(checked: Checked) -> None:
    """k = 8.553 C6^(1/3) mu^(-1/2) (kT)^(1/6) (Georgievskii and Klippenstein, from memory)."""
    first, second = molecule("Ar", 15e-3 * u * N_A * 1e3), molecule("Kr", 15e-3 * u * N_A * 1e3)
    law = Capture("dispersion", C6=si(50 * HARTREE * BOHR**6))
    value = law.rate_constant(meeting(first, second), 300.0) / N_A
    mu, C6, kT = 7.5 * u, 50 * HARTREE * BOHR**6, k * 300.0
    coefficient = value / (C6 ** (1 / 3) / mu**0.5 * kT ** (1 / 6))
    source = "Georgievskii and Klippenstein (2005, from memory)"
    checked("coefficient of capture by dispersion", coefficient, "8.553", "", source)
    assert value * 1e6 == pytest.approx(5.17619e-10, rel=2e-6)


def test_dispersion_is_the_average_over_its_cross_section() -> None:
    """By quadrature of sigma(E) = (3 pi/2)(2 C6/E)^(1/3), which follows from the barrier."""
    from scipy.integrate import quad

    where = meeting(molecule("Ar"), molecule("Kr"))
    T, C6 = 450.0, 3e-77
    mu = 1 / sum(1 / float(gas.molar_mass) for gas in where.partners) / N_A  # type: ignore[arg-type]
    kT = k * T

    def sigma(E: float) -> float:
        """pi b^2 where the top of E b^2/r^2 - C6/r^6 is as high as E."""
        b2 = 1.5 * (2 * C6 / E) ** (1 / 3)
        r4 = 3 * C6 / (E * b2)  # where the slope is zero
        assert E * b2 / math.sqrt(r4) - C6 / r4**1.5 == pytest.approx(E, rel=1e-12)
        return pi * b2

    speed = math.sqrt(8 * kT / (pi * mu))

    def integrand(w: float) -> float:
        """sigma u exp(-u) du with u = w^3, which takes the cube root out."""
        return sigma(w**3 * kT) * w**3 * math.exp(-(w**3)) * 3 * w**2

    mean = quad(integrand, 1e-9, 4.0, epsabs=0, epsrel=1e-12)[0]
    law = Capture("dispersion", C6=si(C6))
    assert law.rate_constant(where, T) == pytest.approx(N_A * speed * mean, rel=1e-9)


def test_london() -> None:
    """3/2 a1 a2 I1 I2/(I1 + I2): for two atoms of argon 3/4 a^2 I; and the half for like ones."""
    argon = molecule("Ar")
    law = Capture(
        "dispersion",
        polarisability={"Ar": si(1.64 * A3)},
        ionisation_energy={"Ar": si(15.76 * e * N_A)},
    )
    C6 = law.dispersion_coefficient(meeting(argon)) / e / 1e-60
    assert pytest.approx(31.79, rel=1e-3) == C6
    given = Capture("dispersion", C6=si(C6 * e * 1e-60))
    twin = replace(argon, name="twin")
    once = law.rate_constant(meeting(argon), 300.0)
    assert given.rate_constant(meeting(argon, twin), 300.0) == pytest.approx(2 * once, rel=1e-12)


K, BR2 = molecule("K"), molecule("Br2")
HARPOON = Capture(
    "electron jump",
    ionisation_energy={"K": si(420e3)},
    electron_affinity={"Br2": si(250e3)},
)


def test_potassium_and_bromine(checked: Checked) -> None:
    """Atkins: P of K + Br2 by the harpoon is about 5 (4.2 in the text, from memory); d = 400 pm.

    I = 420, EA = 250 kJ/mol give R = 817 pm and (R/d)^2 = 4.17; measured is 4.8 = 1.0e12/2.1e11.
    """
    where = meeting(K, BR2)
    assert HARPOON.jump_distance(where) == pytest.approx(817.267e-12, rel=1e-5)
    spheres = Collision(threshold=si(0.0), diameter=si(400e-12))
    T = np.array([300.0, 900.0])
    P = HARPOON.rate_constant(where, T) / spheres.rate_constant(where, T)
    assert pytest.approx(4.17454, rel=1e-5) == P
    source = "Atkins, Physical Chemistry (text: about 5)"
    checked("P of K + Br₂ by the harpoon law", P[0], "5", "", source, rel=0.2)
    assert 4.0 < P[0] < 1.0e12 / 2.1e11


def found(law: Capture, *gases: Gas) -> list[str]:
    return [str(problem) for problem in law.problems(meeting(*gases))]


def test_impossible_captures_are_refused_in_words() -> None:
    assert found(Capture("dispersion", electronic_factor=si(2.0)), K, BR2) == [
        "electronic_factor: found 2; expected a share above 0, at most 1",
        "polarisability.Br2: found nothing; expected one for each partner, or C6",
        "polarisability.K: found nothing; expected one for each partner, or C6",
        "ionisation_energy.Br2: found nothing; expected one for each partner, or C6",
        "ionisation_energy.K: found nothing; expected one for each partner, or C6",
    ]
    assert found(ion(H3O, NH3, 1e-30), K, BR2) == [
        "polarisability.NH3: found a gas that does not collide here; expected Br2 or K",
        "reaction: found charges +0 and +0; expected one ion and one neutral molecule",
    ]
    assert found(Capture("ion and permanent dipole"), H3O, NH3) == [
        "polarisability.NH3: found nothing; expected the polarisability of NH3, which is the "
        "neutral",
        'dipole: found nothing; expected the dipole of NH3, such as "1.5 D"',
    ]
    assert found(Capture("electron jump"), K, BR2) == [
        "ionisation_energy: found 0 gases; expected that of one partner: the other takes or gives "
        "the electron"
    ]
    assert found(replace(HARPOON, ionisation_energy={"K": si(2e5)}), K, BR2) == [
        "ionisation_energy.K: found an electron affinity of Br2 at or above that ionisation "
        "energy; expected an ionisation energy above it: else the electron jumps at any distance"
    ]


def test_what_a_step_leaves_out_is_taken_from_its_gases() -> None:
    """The same numbers with the gases as with the step, and the step's own before theirs."""
    argon = molecule("Ar")
    stated = Capture(
        "dispersion",
        polarisability={"Ar": si(1.64 * A3)},
        ionisation_energy={"Ar": si(15.76 * e * N_A)},
    )
    known = replace(
        argon, polarisability=si(1.64 * A3), ionisation_energy=si(15.76 * e * N_A), dipole=si(0.0)
    )
    bare = Capture("dispersion")
    assert found(bare, known) == []
    assert bare.numbers(meeting(known)) == stated.numbers(meeting(argon))
    twice = replace(bare, polarisability={"Ar": si(2 * 1.64 * A3)})
    ratio = twice.dispersion_coefficient(meeting(known)) / stated.dispersion_coefficient(
        meeting(argon)
    )
    assert ratio == pytest.approx(4.0, rel=1e-12)
    ammonia = replace(NH3, polarisability=si(2.103 * A3), dipole=si(1.4718 * DEBYE))
    polar = Capture("ion and permanent dipole")
    assert found(polar, H3O, ammonia) == []
    given = ion(H3O, NH3, 2.103 * A3, dipole=si(1.4718 * DEBYE))
    assert polar.numbers(meeting(H3O, ammonia)) == given.numbers(meeting(H3O, NH3))
    potassium = replace(K, ionisation_energy=si(420e3))
    jump = replace(HARPOON, ionisation_energy={})
    assert found(jump, potassium, BR2) == []
    assert jump.numbers(meeting(potassium, BR2)) == HARPOON.numbers(meeting(K, BR2))
    # The electron comes from the partner of the gas that takes it, whatever that one has.
    other = replace(BR2, ionisation_energy=si(1015e3))
    assert jump.numbers(meeting(potassium, other)) == HARPOON.numbers(meeting(K, BR2))
    assert found(jump, K, other) == [
        "ionisation_energy: found 0 gases; expected that of one partner: the other takes or gives "
        "the electron"
    ]


def test_the_range_of_the_trajectory_fit_is_said() -> None:
    where = meeting(H3O, NH3, temperatures=(0.5, 300.0))
    law = ion(H3O, NH3, 2.103 * A3, rotational_constant=si(ROTATION / 2.8e-47), **PROTON)
    assert list(law.cautions(where)) == [
        "at 0.5 K the reduced dipole x is 86.4, beyond the 60 up to which the fit of ion-dipole "
        "trajectories is commonly used.",
        "0.5 K is below the rotational constant of NH3 (14.4 K): the classical ion-dipole "
        "trajectories do not hold.",
    ]
    # mu_D/q 30.64 pm times 5e-45 kg m^2 over 2.103 A^3 times 8.985 u
    slow = replace(law, rotational_constant=si(ROTATION / 5e-45))
    assert list(slow.cautions(replace(where, temperatures=(300.0, 300.0)))) == [
        "the reduced moment of inertia is 4.88 at 300 K: NH3 turns too slowly for the fit of "
        "ion-dipole trajectories, which gives too much."
    ]
    assert list(law.cautions(replace(where, temperatures=(300.0, 300.0)))) == []
