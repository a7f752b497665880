"""The collision ceiling of two partners, and rate constants judged against it."""

from __future__ import annotations

import math

import pytest

from meanfree.constants import N_A, R, k_B
from meanfree.gases.gas import Gas
from meanfree.gases.identity import find_gas
from meanfree.rates.ceiling import Ceiling, activation_energy, ceiling, judge


def made_up(Z: float, T: float) -> Ceiling:
    return Ceiling(Z, 4e-10, 5e-19, 500.0, True, T)


def test_z_of_like_partners_carries_the_half() -> None:
    # Z_AA = 1/2 sigma v_rel N_A, v_rel = sqrt(2) mean speed: Atkins and de Paula, 8th ed., 24.1.
    gas = find_gas("O2")
    limit = ceiling((gas, gas), 298.15)
    assert limit is not None
    assert gas.molar_mass is not None
    assert gas.diameter is not None
    mass, d = gas.molar_mass.value / N_A, gas.diameter.value
    speed = math.sqrt(2) * math.sqrt(8 * k_B * 298.15 / (math.pi * mass))
    assert limit.like
    # closed form on both sides: only rounding differs
    assert pytest.approx(0.5 * math.pi * d**2 * speed * N_A, rel=1e-13) == limit.Z


def test_unlike_partners_have_no_half_and_the_order_does_not_matter() -> None:
    a, b = find_gas("H2"), find_gas("C2H4")
    one, other = ceiling((a, b), 628.0), ceiling((b, a), 628.0)
    assert one is not None
    assert other is not None
    assert not one.like
    assert pytest.approx(other.Z, rel=1e-14) == one.Z
    assert a.molar_mass is not None
    assert b.molar_mass is not None
    mu = 1 / (1 / a.molar_mass.value + 1 / b.molar_mass.value)
    expected = math.pi * one.pair_diameter**2 * math.sqrt(8 * R * 628.0 / (math.pi * mu)) * N_A
    assert pytest.approx(expected, rel=1e-13) == one.Z


def test_a_diameter_of_the_step_overrides_those_of_the_gases() -> None:
    gas = find_gas("NOCl")
    limit = ceiling((gas, gas), 480.0, 5e-10)
    assert limit is not None
    assert limit.cross_section == pytest.approx(math.pi * 25e-20, rel=1e-14)


@pytest.mark.parametrize("partners", [(), (Gas.label("A"),), (Gas.label("A"), Gas.label("B"))])
def test_no_ceiling_where_nothing_is_known(partners: tuple[Gas, ...]) -> None:
    assert ceiling(partners, 300.0) is None


def test_activation_energy_of_known_laws() -> None:
    # Ea = E + nRT for A T^n exp(-E/RT); E0 + RT/2 on the line of centres (n = 1/2).
    E, T = 102e3, 480.0
    for n in (0.0, 0.5, -2.3, 4.0):
        found = activation_energy(lambda t, n=n: 1e7 * t**n * math.exp(-E / (R * t)), T)
        # five points are exact to fourth order in a step of 0.1 %; rounding leaves about 1e-5 J/mol
        assert found == pytest.approx(E + n * R * T, abs=1e-4)


def test_activation_energy_refuses_a_rate_constant_of_zero() -> None:
    with pytest.raises(ValueError) as caught:
        activation_energy(lambda _: 0.0, 300.0)
    assert str(caught.value) == "rate_constant: found 0 near 300 K; expected above 0"


def test_tabulated_steric_factor_of_nitrosyl_chloride() -> None:
    # Atkins, table of Arrhenius parameters: 2 NOCl, A 9.4e9 against 5.9e10 L/mol/s, P = 0.16.
    T, Ea = 480.0, 102e3
    judged = judge(9.4e6 * math.exp(-Ea / (R * T)), Ea, made_up(5.9e7, T))
    assert judged.A_over_Z == pytest.approx(0.16, abs=0.005)  # two digits are printed
    assert judged.steric == pytest.approx(9.4 / 59 * math.exp(-0.5), rel=1e-12)
    assert judged.threshold == pytest.approx(Ea - R * T / 2, rel=1e-14)
    assert not judged.is_suspect
    assert judged.verdict == (
        "below the collision limit: one in 10.3 encounters with the energy reacts"
    )


@pytest.mark.parametrize(
    ("k", "Ea", "verdict"),
    [
        (2e8, 1e3, "above the collision limit: 2 times Z, so suspect"),
        (
            1e8 * math.exp(-100e3 / (R * 500.0) + 0.5) * 3,
            100e3,
            "above the limit for its barrier: 3 times the encounters that have the energy, "
            "so suspect",
        ),
        (
            1e8 * math.exp(-100e3 / (R * 500.0) + 0.5),
            100e3,
            "at the collision limit: all encounters with the energy react",
        ),
        (
            5e7,
            0.0,
            "below the collision limit: a share of 0.5 of the encounters reacts; "
            "Ea is below RT/2, so E0 = 0",
        ),
        (
            1e-5,
            None,
            "below the collision limit: one in 1.00 × 10¹³ encounters reacts; "
            "no activation energy is stated, so no steric factor",
        ),
        (0.0, 1e3, "no reaction"),
    ],
)
def test_verdicts(k: float, Ea: float | None, verdict: str) -> None:
    assert judge(k, Ea, made_up(1e8, 500.0)).verdict == verdict


def test_a_negative_rate_constant_is_refused() -> None:
    with pytest.raises(ValueError) as caught:
        judge(-1.0, 1e3, made_up(1e8, 500.0))
    assert str(caught.value) == "k: found -1; expected at least 0"
