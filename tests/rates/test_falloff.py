"""Falloff: its limits, its two broadenings, published values, and the strong-collision k0."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from encounters import alone, molecule
from hypothesis import given
from hypothesis import strategies as st
from laboratory import si
from scipy.constants import N_A, R, k, pi
from validation import Checked

from meanfree.gases.gas import Gas
from meanfree.rates.falloff import Broadening, Centre, CentreTerm, Falloff
from meanfree.rates.law import StepContext
from meanfree.rates.limits import PowerLaw, StrongCollisions
from meanfree.rates.termolecular import Termolecular

CM3, CM6 = 1e-6 * N_A, 1e-12 * N_A**2  # cm^3 and cm^6 per molecule and second, in SI with mol
TWO = (Gas.label("A"), Gas.label("B"))


def context(T: float = 300.0, **options: Any) -> StepContext:
    options = {"has_bath": True, "reactants": TWO, **options}
    return StepContext((), 2.0, temperatures=(T, T), **options)


def at_pressure(T: float, bar: float) -> float:
    return bar * 1e5 / (R * T)


def power_law(A: float, n: float, T_ref: float = 300.0, Ea: float = 0.0) -> PowerLaw:
    return PowerLaw(si(A), si(n), si(T_ref), si(Ea))


LINDEMANN = Falloff(power_law(2e3, -2.0, Ea=8e3), power_law(5e5, 0.5, Ea=2e3))


def broadened(kind: Broadening, Fc: float) -> Falloff:
    return replace(LINDEMANN, broadening=kind, Fc=Centre(si(Fc)))


def limits(law: Falloff, T: float) -> tuple[float, float]:
    """k0 and kinf at T, from their definition."""
    low, high = (
        part.A.value  # type: ignore[attr-defined]
        * (T / part.T_ref.value) ** part.n.value  # type: ignore[attr-defined]
        * math.exp(-part.Ea.value / (R * T))  # type: ignore[attr-defined]
        for part in (law.k0, law.kinf)
    )
    return low, high


@pytest.mark.parametrize("T", [200.0, 300.0, 1500.0])
def test_lindemann_limits(T: float) -> None:
    """1e-12: at Pr = 1e-14 and 1e14 the limit is off by 1e-14, the rest is rounding."""
    k0, kinf = limits(LINDEMANN, T)
    for exponent in (-14, 14):
        M = 10.0**exponent * kinf / k0
        limit = k0 * M if exponent < 0 else kinf
        assert LINDEMANN.rate_constant(context(), T, M=M) == pytest.approx(limit, rel=1e-12)
    half = LINDEMANN.rate_constant(context(), T, M=kinf / k0)
    assert half == pytest.approx(kinf / 2, rel=1e-12)


def test_two_pressures_of_lindemann_hinshelwood(checked: Checked) -> None:
    """Atkins' exercise (from memory): k = 2.50e-4 1/s at 1.30 kPa and 2.10e-5 at 12 Pa.

    They give k_a = 1.9e-6 1/(Pa s); put back in as k0, the law must return both k.
    """
    k1, p1, k2, p2 = 2.5e-4, 1300.0, 2.1e-5, 12.0
    k_a = (1 / p2 - 1 / p1) / (1 / k2 - 1 / k1)
    source = "Atkins, Physical Chemistry, exercise (from memory)"
    checked("activation of Lindemann and Hinshelwood", k_a, "1.9e-6", "Pa⁻¹ s⁻¹", source)
    kinf = 1 / (1 / k1 - 1 / (k_a * p1))
    T = 500.0
    law = Falloff(PowerLaw(si(k_a * R * T)), PowerLaw(si(kinf)))
    for p, expected in ((p1, k1), (p2, k2)):
        assert law.rate_constant(context(), T, M=p / (R * T)) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("kind", ["unit width", "width from Fc"])
@pytest.mark.parametrize("decades", [-40, -12, -3, 3, 12, 40])
def test_broadened_within_its_bound_of_the_limits(kind: Broadening, decades: int) -> None:
    """|ln F| = |ln Fc|/(1 + (log Pr/N)^2): the form nears its limits that slowly and no slower."""
    T, Fc = 300.0, 0.4
    k0, kinf = limits(LINDEMANN, T)
    M = 10.0**decades * kinf / k0
    value = float(broadened(kind, Fc).rate_constant(context(), T, M=M))
    N = 1.0 if kind == "unit width" else 0.75 - 1.27 * math.log10(Fc)
    bound = abs(math.log(Fc)) / (1 + (decades / N) ** 2)
    lindemann = float(LINDEMANN.rate_constant(context(), T, M=M))
    assert -math.log(value / lindemann) == pytest.approx(bound, rel=1e-9)
    limit = k0 * M if decades < 0 else kinf
    assert value < limit
    # ln(1 + Pr) or ln(1 + 1/Pr) is Lindemann's own distance from the limit
    assert math.log(limit / value) <= bound + 10.0 ** -abs(decades) + 1e-12


@pytest.mark.parametrize("kind", ["unit width", "width from Fc"])
def test_the_centre_is_at_unit_reduced_pressure(kind: Broadening) -> None:
    k0, kinf = limits(LINDEMANN, 300.0)
    value = broadened(kind, 0.4).rate_constant(context(), 300.0, M=kinf / k0)
    assert value == pytest.approx(0.4 * kinf / 2, rel=1e-12)


def test_the_two_widths_are_told_apart() -> None:
    """A decade from the centre, Fc = 0.4: log F is log Fc/2, or log Fc/(1 + 1/1.2554^2)."""
    k0, kinf = limits(LINDEMANN, 300.0)
    M = 10 * kinf / k0
    lindemann = LINDEMANN.rate_constant(context(), 300.0, M=M)
    for kind, share in (("unit width", 0.5), ("width from Fc", 0.611800)):
        F = broadened(kind, 0.4).rate_constant(context(), 300.0, M=M) / lindemann  # type: ignore[arg-type]
        # the share is given to six digits
        assert math.log(F) / math.log(0.4) == pytest.approx(share, rel=2e-6)


@given(
    st.sampled_from(["none", "unit width", "width from Fc"]),
    st.floats(0.1, 1.0),
    st.floats(150.0, 2500.0),
    st.floats(-12.0, 12.0),
    st.floats(1e-3, 3.0),
)
def test_k_rises_with_M(
    kind: Broadening, Fc: float, T: float, decades: float, further: float
) -> None:
    """d ln k/d ln Pr is above zero for all Fc of at least 0.1 in either form."""
    law = LINDEMANN if kind == "none" else broadened(kind, Fc)
    M = np.array([10**decades, 10 ** (decades + further)])
    low, high = law.rate_constant(context(), T, M=M)
    # Far above the high-pressure limit k may stand still to rounding.
    assert high > low * (1 - 1e-14)
    if decades + further < 3:
        assert high > low


def test_no_bath_and_a_bath_a_rounding_below_zero_are_no_trouble() -> None:
    """An empty vessel; and the integrator may try a concentration of -1e-25."""
    law = broadened("width from Fc", 0.4)
    assert float(law.rate_constant(context(), 300.0, M=0.0)) == 0.0
    slightly = float(law.rate_constant(context(), 300.0, M=-1e-25))
    assert slightly == pytest.approx(-1e-25 * limits(law, 300.0)[0], rel=1e-2)


ORLANDO = Falloff(
    power_law(2.8e-30 * CM6, -3.5),
    power_law(1.66e-12 * CM3, -0.2),
    "width from Fc",
    Centre(terms=(CentreTerm(si(2.5), si(1950.0), rises=True), CentreTerm(si(0.9), si(430.0)))),
)


def test_nitrate_radical_and_nitrogen_dioxide(checked: Checked) -> None:
    """NO3 + NO2 + N2, discharge flow, 236 to 358 K: k(298 K, 1 bar) = 1.2e-12 cm^3/s.

    k0 = 2.8e-30 (T/300)^-3.5, kinf = 1.66e-12 (T/300)^-0.2, Fc = 2.5 exp(-1950/T)
    + 0.9 exp(-T/430); the published value has two digits.
    """
    k298 = ORLANDO.rate_constant(context(), 298.0, M=at_pressure(298.0, 1.0)) / CM3
    source = "discharge flow, 236 to 358 K (abstract)"
    checked("k of NO₃ + NO₂ + N₂, 298 K, 1 bar", k298, "1.2e-12", "cm³/s", source)
    # the formula evaluated by hand with six digits: Fc(300), and k at the ends of the range
    assert ORLANDO.Fc is not None
    assert ORLANDO.Fc(300.0) == pytest.approx(0.451726, abs=1e-6)
    for T, expected in ((236.0, 1.490207e-12), (358.0, 9.750890e-13)):
        value = ORLANDO.rate_constant(context(), T, M=at_pressure(T, 1.0)) / CM3
        assert value == pytest.approx(expected, rel=1e-6)


def test_hydroxyl_and_ethene_centre(checked: Checked) -> None:
    """Fulle et al. (1997), cited by IUPAC: Fc = 0.21 exp(-220/T) + exp(-T/305), 0.47 at 300 K."""
    centre = Centre(terms=(CentreTerm(si(0.21), si(220.0), True), CentreTerm(si(1.0), si(305.0))))
    source = "Fulle et al. (1997), cited by IUPAC"
    checked("F_c of HO + C₂H₄, 300 K", centre(300.0), "0.47", "", source)


def test_hydroxyl_and_nitrogen_dioxide(checked: Checked) -> None:
    """IUPAC 2017 (from memory): 3.2e-30 (T/300)^-4.5, 3e-11, Fc 0.41: 9.8e-12 at 298 K, 1 bar."""
    law = Falloff(
        power_law(3.2e-30 * CM6, -4.5),
        power_law(3e-11 * CM3, 0.0),
        "width from Fc",
        Centre(si(0.41)),
    )
    value = law.rate_constant(context(), 298.0, M=at_pressure(298.0, 1.0)) / CM3
    source = "IUPAC (2017, from memory)"
    checked("k of OH + NO₂ + M, 298 K, 1 bar", value, "9.8e-12", "cm³/s", source)


C3H6 = molecule("C3H6", 42.08e-3, 4.5e-10)
AR = molecule("Ar", 39.948e-3, 3.4e-10)


def strong(partner: str, **options: Any) -> StrongCollisions:
    return StrongCollisions(si(274e3), si(12.5), partner, **options)


@pytest.mark.parametrize("partner", [C3H6, AR], ids=["itself", "argon"])
def test_strong_collisions_carry_no_half(partner: Gas) -> None:
    """beta Z (E0/RT)^(s-1)/(s-1)! exp(-E0/RT) written out, Z without the half even with itself."""
    T, s, E0 = 800.0, 12.5, 274e3
    where = alone(C3H6, has_bath=True, gases={"C3H6": C3H6, "Ar": AR})
    law = Falloff(strong(partner.name, collision_efficiency=si(0.3)), power_law(1e60, 0.0))
    m1, m2 = (float(g.molar_mass) / N_A for g in (C3H6, partner))  # type: ignore[arg-type]
    d = 0.5 * (float(C3H6.diameter) + float(partner.diameter))  # type: ignore[arg-type]
    Z = pi * d**2 * math.sqrt(8 * k * T * (m1 + m2) / (pi * m1 * m2)) * N_A
    expected = 0.3 * Z * (E0 / (R * T)) ** (s - 1) / math.gamma(s) * math.exp(-E0 / (R * T))
    assert law.rate_constant(where, T, M=1.0) == pytest.approx(expected, rel=1e-12)


def problems(law: Falloff, where: StepContext) -> list[str]:
    return [str(problem) for problem in law.problems(where)]


def test_impossible_falloffs_are_refused_in_words() -> None:
    assert problems(replace(LINDEMANN, Fc=Centre(si(0.6))), context(has_bath=False)) == [
        'reaction: found falloff without M; expected a step with "+ M": falloff is a matter of '
        "collisions with the bath",
        'Fc: found Fc without broadening; expected broadening = "unit width" or "width from Fc", '
        "or no Fc",
    ]
    assert problems(replace(LINDEMANN, broadening="unit width"), context()) == [
        "Fc: found nothing; expected Fc, which broadening = 'unit width' needs"
    ]
    assert problems(broadened("unit width", 0.05), context()) == [
        "Fc: found Fc = 0.05 at 300 K; expected 0.1 to 1 wherever the run goes: the broadened "
        "form holds there"
    ]
    cold = replace(ORLANDO, Fc=Centre(terms=(CentreTerm(si(0.9), si(100.0)),)))
    assert problems(cold, replace(context(), temperatures=(100.0, 400.0))) == [
        "Fc: found Fc = 0.0165 at 400 K; expected 0.1 to 1 wherever the run goes: the broadened "
        "form holds there"
    ]
    nothing = replace(LINDEMANN, k0=PowerLaw(si(-1.0), si(1.0)), kinf=power_law(0.0, 0.0))
    assert problems(nothing, context()) == [
        "k0.A: found -1; expected a factor of at least 0",
        'k0.T_ref: found nothing, though n is not 0; expected T_ref = "298 K" or "1 K", say',
        "kinf.A: found 0; expected a limit above 0",
    ]


def test_impossible_estimates_are_refused_in_words() -> None:
    bad = StrongCollisions(si(-1.0), si(0.5), "Ar", si(2.0))
    where = alone(replace(C3H6, diameter=None), has_bath=True, gases={"Ar": AR})
    assert [str(p) for p in bad.problems("k0", where)] == [
        "k0.diameter: found no known diameter of C3H6; expected a diameter under [gases.C3H6], "
        "or one here",
        "k0.threshold: found -1 J/mol; expected one above 0",
        "k0.oscillators: found 0.5; expected a number of oscillators of at least 1",
        "k0.collision_efficiency: found 2; expected a fraction above 0, at most 1",
    ]
    assert [str(p) for p in strong("Xe").problems("k0", where)] == [
        'k0.partner: found "Xe"; expected a gas of the case'
    ]
    assert [str(p) for p in strong("Ar").problems("k0", context())] == [
        "reaction: found 2 molecules on the left; expected one molecule that is energised by M"
    ]
    assert list(strong("Ar").cautions(where)) == [
        "k0 is estimated from 12.5 classical oscillators that every collision with Ar empties "
        "with probability 1: good to an order of magnitude at best."
    ]


def test_termolecular_is_three_bodies() -> None:
    law = Termolecular(si(5.0))
    assert list(law.problems(context())) == []
    assert law.rate_constant(context(), 400.0) == 5.0
    assert [str(p) for p in law.problems(context(has_bath=False))] == [
        "reaction: found 2 bodies on the left; expected three, such as H + O2 + M or 2 NO + O2"
    ]
