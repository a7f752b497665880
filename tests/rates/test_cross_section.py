"""Cross-section against energy: the averages against quadrature and against hard spheres."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from encounters import meeting, molecule
from laboratory import si
from scipy.constants import N_A, R, k, pi
from scipy.integrate import quad

from meanfree.gases.gas import Gas
from meanfree.rates.collision import Collision
from meanfree.rates.cross_section import Beyond, CrossSection, EnergyPoint
from meanfree.rates.energy_integrals import piece
from meanfree.rates.law import NUMBERS

H2 = molecule("H2", diameter=2.7e-10)
I2 = molecule("I2", diameter=5.0e-10)


def points(energies: object, areas: object, beyond: Beyond) -> CrossSection:
    pairs = zip(energies, areas, strict=True)  # type: ignore[call-overload]
    table = tuple(EnergyPoint(si(float(E)), si(float(a))) for E, a in pairs)
    return CrossSection("points", points=table, beyond=beyond)


@pytest.mark.parametrize("second", [I2, None], ids=["unlike", "like"])
def test_line_of_centres_is_the_collision_law(second: Gas | None) -> None:
    """The same closed form by two routes: rounding of a dozen operations, so 1e-12 is generous."""
    context = meeting(H2, second)
    sigma = pi * (2.7e-10 if second is None else 3.85e-10) ** 2
    T = np.linspace(200, 3000, 57)
    law = CrossSection("line of centres", si(sigma), si(1.5e5))
    spheres = Collision(threshold=si(1.5e5))
    ratio = law.rate_constant(context, T) / spheres.rate_constant(context, T)
    assert np.max(np.abs(ratio - 1)) < 1e-12


def sigma_between(law: CrossSection, energy: float) -> float:
    """The cross-section of a table at an energy, from its definition."""
    E = [p.energy.value for p in law.points]
    a = [p.cross_section.value for p in law.points]
    if energy < E[0]:
        return 0.0
    if energy <= E[-1]:
        return float(np.interp(energy, E, a))
    slope = (a[-1] - a[-2]) / (E[-1] - E[-2])
    return {
        "constant": a[-1],
        "zero": 0.0,
        "linear": a[-1] + slope * (energy - E[-1]),
        "falling as 1/E": a[-1] * E[-1] / energy,
    }[str(law.beyond)]


def by_quadrature(law: CrossSection, T: float, mu: float) -> float:
    """N_A sqrt(8/(pi mu (kT)^3)) times the integral, panel by panel, per molecule."""
    kT = R * T
    edges = [p.energy.value for p in law.points]
    # the tail is worked out to 60 RT beyond the last point: what is left is below 1e-24 of it
    panels = [*itertools.pairwise(edges), (edges[-1], edges[-1] + 60 * kT)]
    total = 0.0
    for low, high in panels:
        cuts = np.linspace(low, high, 2 + int((high - low) / (5 * kT)))
        for a, b in itertools.pairwise(cuts):
            # strictly inside, so that the jump at the last point is on neither side
            f = lambda u, a=a, b=b: sigma_between(law, u * kT) * u * math.exp(-u)  # noqa: E731
            total += quad(f, a / kT * (1 + 1e-15), b / kT, epsabs=0, epsrel=1e-13)[0]
    return N_A * math.sqrt(8 * k * T / (pi * mu)) * total


@pytest.mark.parametrize("beyond", ["constant", "zero", "linear", "falling as 1/E"])
@pytest.mark.parametrize("seed", range(4))
def test_random_tables_against_quadrature(beyond: Beyond, seed: int) -> None:
    """1e-10: quadrature is asked for 1e-13 a panel, and some dozens of panels add."""
    rng = np.random.default_rng(seed)
    E = np.cumsum(10 ** rng.uniform(1.5, 4.5, rng.integers(2, 9)))
    areas = rng.uniform(0.1, 5, len(E)) * 1e-20
    areas[-2:] = np.sort(areas[-2:])
    law = points(E, areas, beyond)
    mu = float(H2.molar_mass) * float(I2.molar_mass) / (float(H2.molar_mass) + float(I2.molar_mass))  # type: ignore[arg-type]
    for T in (150.0, 600.0, 3000.0):
        expected = by_quadrature(law, T, mu / N_A)
        assert law.rate_constant(meeting(H2, I2), T) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("seed", range(3))
def test_no_digits_are_lost_for_any_energy(seed: int) -> None:
    """E/RT from 1e-6 to 1e6 against 60 digits: 1e-13, for exp(-u) alone has u/2 ulp.

    An absolute floor of 1e-290 covers what lies under the smallest double.
    """
    import mpmath as mp

    rng = np.random.default_rng(seed)
    with mp.workdps(60):
        for _ in range(300):
            a = 10 ** rng.uniform(-6, 6)
            b = a + 10 ** rng.uniform(-6, 6)
            low, high = rng.uniform(0, 1, 2)
            A, B = mp.mpf(a), mp.mpf(b)
            slope = (mp.mpf(high) - mp.mpf(low)) / (B - A)

            def primitive(u, low=low, slope=slope, A=A):  # type: ignore[no-untyped-def]
                return -mp.exp(-u) * ((low - slope * A) * (u + 1) + slope * (u * u + 2 * u + 2))

            # b - a is rounded in doubles: the width that is integrated is known to b's last digit
            tolerance = 1e-13 + 2e-16 * b / (b - a)
            exact = float(primitive(B) - primitive(A))
            got = float(piece(NUMBERS, a, b, low, high))
            assert got == pytest.approx(exact, rel=tolerance, abs=1e-290)


def test_a_narrow_table_in_a_hot_gas_keeps_its_digits() -> None:
    """All energies 1e-6 of RT: exp(-E/RT) is 1 - 1e-6, so the integral is that of sigma E."""
    RT = R * 1000.0
    law = points([0.0, 1e-6 * RT, 2e-6 * RT], [0.0, 1e-20, 0.0], "zero")
    # int sigma u du over the triangle of height 1 from 0 to 2h, h = 1e-6, is h^2; the next term
    # of exp(-u) is 1e-6 of that: -(int sigma u^2 du) = -(7/6) h^3
    h = 1e-6
    mu = float(H2.molar_mass) / 2 / N_A  # type: ignore[arg-type]
    speed = math.sqrt(8 * k * 1000.0 / (pi * mu))
    expected = 0.5 * N_A * speed * 1e-20 * h**2 * (1 - 7 / 6 * h)
    # the term after that is of the order h^2
    assert law.rate_constant(meeting(H2), 1000.0) == pytest.approx(expected, rel=5e-12)


def test_a_constant_above_threshold_is_the_limit_of_points() -> None:
    """A table flat from the threshold, continued as constant, is that shape exactly."""
    context, T = meeting(H2, I2), np.array([250.0, 700.0, 2500.0])
    shape = CrossSection("constant above threshold", si(2e-20), si(4e4))
    table = points([4e4, 5e4], [2e-20, 2e-20], "constant")
    ratio = table.rate_constant(context, T) / shape.rate_constant(context, T)
    assert np.max(np.abs(ratio - 1)) < 1e-13


def test_like_partners_are_counted_once() -> None:
    """The half, told by a twin of H2 that has another name."""
    twin = replace(H2, name="twin")
    law = CrossSection("constant above threshold", si(2e-20), si(4e4))
    once, twice = (law.rate_constant(meeting(H2, other), 500.0) for other in (None, twin))
    assert twice == pytest.approx(2 * once, rel=1e-15)


def found(law: CrossSection, *gases: Gas) -> list[str]:
    return [str(problem) for problem in law.problems(meeting(*gases))]


def test_impossible_tables_are_refused_in_words() -> None:
    law = points([1e4, 1e4, 5e3], [2e-20, 1e-20, -1e-20], "linear")
    assert found(law, H2, I2) == [
        "points.1: found 10000 J/mol after 10000 J/mol; expected energies in rising order, "
        "each once",
        "points.2: found 5000 J/mol after 10000 J/mol; expected energies in rising order, "
        "each once",
        "points.2: found a number below 0; expected energies and areas of at least 0",
        'beyond: found "linear" after a last piece that falls; expected another word: a line '
        "that falls goes below zero",
    ]
    assert found(replace(law, points=law.points[:1]), H2, I2) == [
        "points: found 1 points; expected two or more points [energy, cross-section]"
    ]
    assert found(CrossSection("points", points=law.points[1::-1], beyond=None), H2, I2)[-1] == (
        'beyond: found nothing; expected what sigma does after the last point: "constant", '
        '"zero", "linear" or "falling as 1/E"'
    )
    assert found(CrossSection("line of centres", threshold=si(-1.0)), Gas.label("A"), H2) == [
        "law: found the label A, which has no mass; expected a law that needs no mass, such as "
        "arrhenius",
        'cross_section: found nothing; expected cross_section = "0.4 nm^2", say',
        "threshold: found an energy below 0; expected a threshold of at least 0 J/mol",
    ]


def test_energies_beyond_the_table_are_said() -> None:
    # (1 + u2) exp(-u2) over (1 + u1) exp(-u1), u = 0.2406 and 0.4811 at 500 K: 0.939
    law = points([1e3, 2e3], [1e-20, 1e-20], "constant")
    assert list(law.cautions(meeting(H2, I2, temperatures=(500.0, 500.0)))) == [
        "at 500 K 94% of k comes from energies beyond the last point of the cross-section, where "
        "it is taken as constant."
    ]
    assert list(replace(law, beyond="zero").cautions(meeting(H2, temperatures=(5e2, 5e2)))) == []
