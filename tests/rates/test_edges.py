"""What laws take where a number is left out, and on which side of each limit a number falls.

The limits stand in the messages and docstrings ("above 0, at most 1"): a number at the limit itself
is tried, for there a comparison written the other way round would show.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import pytest
from encounters import alone, meeting, molecule
from laboratory import si

from meanfree.gases.gas import Gas
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.capture import Capture
from meanfree.rates.collision import Collision
from meanfree.rates.cross_section import CrossSection, EnergyPoint
from meanfree.rates.falloff import Centre, CentreTerm, Falloff
from meanfree.rates.fixed import Fixed
from meanfree.rates.law import Interior, Law, StepContext
from meanfree.rates.limits import PowerLaw, StrongCollisions
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.source import Source
from meanfree.rates.table import Table, TablePoint
from meanfree.rates.termolecular import Termolecular
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced

R = 8.314462618
H2, I2 = molecule("H2", 2.016e-3, 2.9e-10), molecule("I2", 253.8e-3, 5.6e-10)
ION, NEUTRAL = molecule("H3O+", 19.023e-3), molecule("NH3", 17.031e-3)
PAIR = meeting(H2, I2, temperatures=(300.0, 300.0))


@dataclass(frozen=True)
class Flask:
    """A vessel as a law sees it: a sphere of 3 cm radius."""

    interior: Interior | None = Interior("sphere", 0.03)  # noqa: RUF009 - it is frozen
    surface_to_volume: float | None = 100.0
    filling_volume: float = 1e-4
    is_rigid: bool = True


def keys(law: Law, where: StepContext) -> list[str]:
    return [problem.key for problem in law.problems(where)]


# What is left out

NO_POWER = Sourced(0.0, default=True)
ONE_KELVIN = Sourced(1.0, "K", "", "temperature", default=True)
NO_BARRIER = Sourced(0.0, "J/mol", "", "molar energy", default=True)
ONE = Sourced(1.0, default=True)


@pytest.mark.parametrize(
    ("law", "defaults"),
    [
        (Arrhenius(si(1.0), si(2.0)), {"n": NO_POWER, "T_ref": ONE_KELVIN}),
        (Termolecular(si(1.0)), {"n": NO_POWER, "T_ref": ONE_KELVIN, "Ea": NO_BARRIER}),
        (
            Falloff(PowerLaw(si(1.0)), PowerLaw(si(2.0)), Fc=Centre()),
            {
                f"{part}.{key}": value
                for part in ("k0", "kinf")
                for key, value in (("n", NO_POWER), ("T_ref", ONE_KELVIN), ("Ea", NO_BARRIER))
            }
            | {"Fc.constant": NO_POWER},
        ),
        (
            Falloff(StrongCollisions(si(1.0), si(3.0), "Ar"), PowerLaw(si(2.0), *[si(0.0)] * 3)),
            {"k0.collision_efficiency": ONE},
        ),
        (Capture("dispersion"), {"electronic_factor": ONE}),
        # Fuller, Schettler and Giddings, Ind. Eng. Chem. 58 (5), 18 (1966): D as T^1.75
        (Wall(si(1.0)), {"diffusion_power": Sourced(1.75, default=True)}),
        (Collision(), {}),
        (Fixed(si(1.0)), {}),
    ],
    ids=lambda value: type(value).__name__,
)
def test_what_is_left_out_is_marked_so(law: Law, defaults: dict[str, Sourced]) -> None:
    assert {key: one for key, one in law.inputs().items() if one.default} == defaults


def test_words_and_what_follows_the_counting_of_k() -> None:
    """The words of the case file, and the number that "loss of A" divides."""
    kinds: dict[type[Law], tuple[str, str, bool, bool]] = {
        Fixed: ("fixed", "k", False, False),
        Arrhenius: ("arrhenius", "A", False, False),
        Termolecular: ("termolecular", "A", False, False),
        Collision: ("collision", "", False, True),
        CrossSection: ("cross-section", "", False, True),
        Capture: ("capture", "", False, True),
        Table: ("table", "points.0.k", False, False),
        Falloff: ("falloff", "kinf.A", True, False),
        Photolysis: ("photolysis", "J", False, False),
        Source: ("source", "rate", False, False),
        Wall: ("wall", "", False, False),
    }
    for kind, expected in kinds.items():
        found = (kind.word, kind.counted, kind.bath_inside, kind.pair_needed)
        assert found == expected, kind


# Energies and steric factors of a collision


def test_a_collision_step_without_numbers_reacts_at_every_encounter() -> None:
    """P = 1, E0 = 0: k = sigma v_rel N_A, here with the kinetic theory written out."""
    mu = 2.016e-3 * 253.8e-3 / (2.016e-3 + 253.8e-3)
    Z = math.pi * 4.25e-10**2 * math.sqrt(8 * R * 300.0 / (math.pi * mu)) * 6.02214076e23
    assert Collision().rate_constant(PAIR, 300.0) == pytest.approx(Z, rel=1e-8)
    wide = Collision(diameter=si(8.5e-10))
    assert wide.rate_constant(PAIR, 300.0) == pytest.approx(4 * Z, rel=1e-8)


def test_threshold_and_steric_factor_of_a_stated_activation_energy() -> None:
    """E0 = Ea - RT/2 and P = (A/Z) exp(-1/2) where Ea exceeds RT/2; else E0 = 0."""
    where = replace(PAIR, temperature=400.0)
    for at, T in ((None, 400.0), (si(600.0), 600.0)):
        law = Collision(Ea=si(50e3), Ea_at=at, A_over_Z=si(0.2))
        assert law.threshold_energy(where) == pytest.approx(50e3 - R * T / 2, rel=1e-9)
        assert law.steric_factor(where) == pytest.approx(0.2 * math.exp(-0.5), rel=1e-9)
    shallow = Collision(Ea=si(500.0), A_over_Z=si(0.2))
    assert shallow.threshold_energy(where) == 0.0
    expected = 0.2 * math.exp(-500.0 / (R * 400.0))
    assert shallow.steric_factor(where) == pytest.approx(expected, rel=1e-8)
    threshold = Collision(threshold=si(50e3), A_over_Z=si(0.2))
    assert threshold.steric_factor(where) == pytest.approx(0.2 * math.exp(-0.5), rel=1e-12)
    assert Collision(steric=si(0.03)).steric_factor(where) == 0.03


# Limits that may be touched, and those that may not


@pytest.mark.parametrize(("factor", "wrong"), [(0.0, True), (1.0, False), (1.0001, True)])
def test_shares_lie_above_zero_and_reach_one(factor: float, wrong: bool) -> None:
    capture = Capture("dispersion", C6=si(1e-77), electronic_factor=si(factor))
    assert keys(capture, PAIR) == (["electronic_factor"] if wrong else [])
    flask = alone(H2, surroundings=Flask(), pressure=100.0, temperatures=(300.0, 300.0))
    assert keys(Wall(si(factor)), flask) == (["uptake"] if wrong else [])
    strong = StrongCollisions(si(1e5), si(1.0), "H2", si(factor))
    where = alone(H2, has_bath=True)
    found = [problem.key for problem in strong.problems("k0", where)]
    assert found == (["k0.collision_efficiency"] if wrong else [])


def test_limits_of_a_power_law() -> None:
    def found(law: PowerLaw) -> list[str]:
        return [problem.key for problem in law.problems("k0", PAIR)]

    assert found(PowerLaw(si(0.0))) == []
    assert found(PowerLaw(si(-1e-9))) == ["k0.A"]
    assert found(PowerLaw(si(1.0), si(-1.0), si(300.0))) == []
    assert found(PowerLaw(si(1.0), si(0.0))) == []
    falloff = Falloff(PowerLaw(si(1.0)), PowerLaw(si(0.0)))
    assert keys(falloff, alone(H2, has_bath=True)) == ["kinf.A"]
    small = replace(falloff, kinf=PowerLaw(si(1e-9)))
    assert keys(small, alone(H2, has_bath=True)) == []


def test_limits_of_strong_collisions() -> None:
    def found(threshold: float, oscillators: float) -> list[str]:
        law = StrongCollisions(si(threshold), si(oscillators), "H2")
        return [problem.key for problem in law.problems("k0", alone(H2))]

    assert found(0.0, 1.0) == ["k0.threshold"]
    assert found(1e-3, 0.999) == ["k0.oscillators"]
    assert found(1e-3, 1.0) == []


@pytest.mark.parametrize(
    ("Fc", "wrong"), [(0.1, False), (1.0, False), (0.0999, True), (1.01, True)]
)
def test_the_centre_holds_from_a_tenth_to_one(Fc: float, wrong: bool) -> None:
    law = Falloff(PowerLaw(si(1.0)), PowerLaw(si(1.0)), "unit width", Centre(si(Fc)))
    where = alone(H2, has_bath=True, temperatures=(200.0, 400.0))
    assert keys(law, where) == (["Fc"] if wrong else [])
    assert [error for _, error in law.strains(200.0, 400.0)] == ([True] if wrong else [])
    assert list(replace(law, broadening="none", Fc=None).strains(200.0, 400.0)) == []


def test_a_scale_of_zero_kelvin_is_refused_first() -> None:
    term = CentreTerm(si(0.5), si(0.0))
    law = Falloff(PowerLaw(si(1.0)), PowerLaw(si(1.0)), "unit width", Centre(terms=(term,)))
    assert keys(law, alone(H2, has_bath=True)) == ["Fc.0"]


def test_a_centre_of_rising_and_falling_terms() -> None:
    """Fc = c + a exp(-T/T1) + b exp(-T2/T), in whichever order the terms are given."""
    rising, falling = CentreTerm(si(0.3), si(900.0), rises=True), CentreTerm(si(0.4), si(250.0))
    expected = 0.1 + 0.4 * math.exp(-300 / 250) + 0.3 * math.exp(-900 / 300)
    for terms in ((rising, falling), (falling, rising)):
        centre = Centre(si(0.1), terms)
        assert centre(300.0) == pytest.approx(expected, rel=1e-14)
        assert (centre.n_rising, centre.ordered) == (1, (falling, rising))


def points(*pairs: tuple[float, float], **options: Any) -> CrossSection:
    made = tuple(EnergyPoint(si(energy), si(area)) for energy, area in pairs)
    return CrossSection("points", points=made, **{"beyond": "constant", **options})


def test_limits_of_cross_sections() -> None:
    assert keys(points((0.0, 0.0), (1e3, 1e-20)), PAIR) == []
    assert keys(points((0.0, -1e-30), (1e3, 1e-20)), PAIR) == ["points.0"]
    assert keys(points((-1.0, 0.0), (1e3, 1e-20)), PAIR) == ["points.0"]
    level = points((0.0, 1e-20), (1e3, 1e-20), beyond="linear")
    assert keys(level, PAIR) == []
    plain = CrossSection("line of centres", si(1e-19))
    assert keys(replace(plain, threshold=si(0.0)), PAIR) == []
    assert keys(plain, PAIR) == []
    # no threshold is a threshold of zero
    zero = float(replace(plain, threshold=si(0.0)).rate_constant(PAIR, 300.0))
    assert plain.rate_constant(PAIR, 300.0) == zero


def test_a_twentieth_of_k_beyond_the_table_is_not_said() -> None:
    """(1 + u) exp(-u) of k lies beyond u = E/RT for a constant cross-section from 0."""

    def cautions(u: float) -> int:
        law = points((0.0, 1e-20), (u * R * 300.0, 1e-20))
        return len(list(law.cautions(PAIR)))

    # (1 + u) exp(-u) = 0.05 at u = 4.7439
    assert cautions(4.75) == 0
    assert cautions(4.73) == 1
    unknown = replace(PAIR, temperatures=None)
    assert list(points((0.0, 1e-20), (1.0, 1e-20)).cautions(unknown)) == []


def table(**options: Any) -> Table:
    return Table((TablePoint(si(500.0), si(1.0)), TablePoint(si(600.0), si(2.0))), **options)


@pytest.mark.parametrize(
    ("low", "high", "said", "error"),
    [
        (500.0, 600.0, False, False),
        (495.0, 600.0, True, False),
        (500.0, 605.0, True, False),
        (494.9, 600.0, True, True),
        (500.0, 605.1, True, True),
    ],
)
def test_five_kelvin_outside_a_table_are_allowed(
    low: float, high: float, said: bool, error: bool
) -> None:
    where = replace(PAIR, temperatures=(low, high))
    assert keys(table(), where) == (["points"] if error else [])
    assert [one for _, one in table().strains(low, high)] == ([error] if said else [])
    assert len(list(table().cautions(where))) == said
    assert keys(table(extrapolate=True), where) == []
    assert [one for _, one in table(extrapolate=True).strains(low, high)] == [False] * said
    assert keys(table(), replace(PAIR, temperatures=None)) == []


def test_a_table_between_its_points_is_an_arrhenius_line() -> None:
    """ln k is straight in 1/T: at the middle of 1/T k is the geometric mean."""
    middle = 2 / (1 / 500.0 + 1 / 600.0)
    assert table().rate_constant(PAIR, middle) == pytest.approx(math.sqrt(2.0), rel=1e-13)
    # at k = 0 there is no logarithm
    none = Table((TablePoint(si(500.0), si(0.0)), TablePoint(si(600.0), si(2.0))))
    assert keys(none, replace(PAIR, temperatures=(550.0,) * 2)) == ["points.0"]
    same = Table((TablePoint(si(500.0), si(1.0)), TablePoint(si(500.0), si(2.0))))
    assert keys(same, replace(PAIR, temperatures=(500.0,) * 2)) == ["points.1"]


def test_small_cross_sections_are_judged_like_large_ones() -> None:
    """What lies beyond the table is a share, whatever the size; of nothing there is no share."""
    tiny = points((1e3, 1e-40), (2e3, 1e-40))
    assert len(list(tiny.cautions(PAIR))) == 1
    assert list(points((1e3, 0.0), (2e3, 0.0)).cautions(PAIR)) == []


def test_labels_and_gases_without_a_size_have_no_strong_collisions() -> None:
    label = Gas.label("A")

    def found(where: StepContext, **options: Any) -> list[str]:
        law = StrongCollisions(si(1e5), si(3.0), "H2", **options)
        return [str(problem) for problem in law.problems("k0", where)]

    where = StepContext((), 1.0, reactants=(label,), gases={"A": label, "H2": H2})
    no_mass = "k0: found the label A, which has no mass; expected a k0 of its own, with A and Ea"
    assert found(where) == [no_mass]
    bare = replace(H2, diameter=None)
    assert found(alone(bare), diameter=si(3e-10)) == []
    assert len(found(alone(bare))) == 1
    assert len(found(replace(alone(H2), gases=None))) == 1
