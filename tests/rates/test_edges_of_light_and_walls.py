"""Light, long-range capture and walls at their limits, by hand.

As in test_edges: a number at the limit itself is tried, where a comparison could stand either way.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import pytest
from encounters import alone, meeting, molecule
from laboratory import si

from meanfree.gases.gas import Gas
from meanfree.rates.capture import Capture
from meanfree.rates.falloff import Centre, Falloff
from meanfree.rates.law import Interior, Law, Numbers, StepContext
from meanfree.rates.limits import PowerLaw, StrongCollisions
from meanfree.rates.long_range import FORMULAS
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.wall import Wall

R = 8.314462618
H2, I2 = molecule("H2", 2.016e-3, 2.9e-10), molecule("I2", 253.8e-3, 5.6e-10)
ION, NEUTRAL = molecule("H3O+", 19.023e-3), molecule("NH3", 17.031e-3)
PAIR = meeting(H2, I2, temperatures=(300.0, 300.0))


def keys(law: Law, where: StepContext) -> list[str]:
    return [problem.key for problem in law.problems(where)]


# Light


def lamp(on: tuple[float, ...] = (), off: tuple[float, ...] = (), **options: Any) -> Photolysis:
    return Photolysis(si(0.1), tuple(map(si, on)), tuple(map(si, off)), **options)


@pytest.mark.parametrize(
    ("law", "at", "lit"),
    [
        (lamp(), 0.0, True),
        (lamp((), (3.0,)), 2.0, True),
        (lamp((), (3.0,)), 3.0, False),
        (lamp((5.0,)), 4.0, False),
        (lamp((5.0,)), 5.0, True),
        (lamp((5.0,), (3.0,)), 1.0, True),
        (lamp((5.0,), (3.0,)), 4.0, False),
        (lamp((3.0,), (5.0,)), 1.0, False),
        (lamp((3.0,), (5.0,)), 6.0, False),
        (lamp((0.0, 8.0), (2.0,)), 9.0, True),
    ],
)
def test_when_the_lamp_is_on(law: Photolysis, at: float, lit: bool) -> None:
    assert law.is_on(at) is lit


def test_switching_on_and_off_at_once_is_no_switching() -> None:
    assert keys(lamp((3.0,), (3.0,)), alone(H2)) == ["on"]
    assert keys(lamp((3.0,), (5.0,)), alone(H2)) == []
    assert keys(lamp(), replace(alone(H2), order=2.0)) == ["reaction"]
    assert keys(lamp(absorption=si(1.0)), alone(H2)) == ["path"]
    assert keys(lamp(absorption=si(1.0), path=si(1.0)), alone(H2)) == []


def test_absorbance_of_a_filled_cell() -> None:
    """sigma n L, n = x p/(k_B T); at 298.15 K where the run does not say."""
    law = lamp(absorption=si(1e-22), path=si(0.2))
    density = 0.5 * 2e4 / (1.380649e-23 * 400.0)
    where = alone(H2, pressure=2e4, bath={"H2": 0.5}, temperatures=(400.0, 700.0))
    assert law.absorbance(where) == pytest.approx(1e-22 * 0.2 * density, rel=1e-9)
    cool = replace(where, temperatures=None)
    assert law.absorbance(cool) == pytest.approx(1e-22 * 0.2 * density * 400 / 298.15, rel=1e-9)
    assert law.absorbance(replace(where, bath=None)) == 0.0
    assert list(law.cautions(replace(where, bath=None))) == []
    for unknown in (replace(law, path=None), replace(law, absorption=None)):
        assert unknown.absorbance(where) is None
    assert law.absorbance(replace(where, pressure=0.0)) is None


@pytest.mark.parametrize(("depth", "said"), [(0.102, 0), (0.105, 1)])
def test_a_gas_is_thin_while_the_mean_light_is_within_a_twentieth(depth: float, said: int) -> None:
    """The mean over the path is (1 - exp(-d))/d, 0.95 at d = 0.1035."""
    where = alone(H2, pressure=1e4, bath={"H2": 1.0}, temperatures=(300.0, 300.0))
    area = depth * 1.380649e-23 * 300.0 / 1e4
    assert len(list(lamp(absorption=si(area), path=si(1.0)).cautions(where))) == said


# Capture and walls


@dataclass(frozen=True)
class Flask:
    """A vessel as a law sees it: a sphere of 3 cm radius."""

    interior: Interior | None = Interior("sphere", 0.03)  # noqa: RUF009 - it is frozen
    surface_to_volume: float | None = 100.0
    filling_volume: float = 1e-4
    is_rigid: bool = True


def test_the_charge_of_an_ion_counts_squared() -> None:
    """k_L = 2 pi q sqrt(alpha/mu): twice for two charges, and the share of surfaces counts once."""
    law = Capture("ion and induced dipole", polarisability={"NH3": si(2.1e-30)})
    doubly = Gas("X", replace(ION.formula, charge=2), molar_mass=ION.molar_mass)  # type: ignore[type-var]
    once = float(law.rate_constant(meeting(ION, NEUTRAL), 300.0))
    assert law.rate_constant(meeting(doubly, NEUTRAL), 300.0) == pytest.approx(2 * once, rel=1e-12)
    assert law.rate_constant(meeting(NEUTRAL, ION), 300.0) == once
    third = replace(law, electronic_factor=si(1 / 3))
    assert third.rate_constant(meeting(ION, NEUTRAL), 300.0) == pytest.approx(once / 3, rel=1e-12)


def test_an_electron_that_jumps_at_any_distance_is_refused() -> None:
    def harpoon(ionisation: float) -> Capture:
        return Capture(
            "electron jump",
            ionisation_energy={"H2": si(ionisation)},
            electron_affinity={"I2": si(3e5)},
        )

    assert keys(harpoon(3e5), PAIR) == ["ionisation_energy.H2"]
    assert keys(harpoon(3.01e5), PAIR) == []


def test_ion_captures_need_one_ion() -> None:
    law = Capture("ion and induced dipole", polarisability={"NH3": si(2e-30)})
    assert keys(law, meeting(ION, NEUTRAL)) == []
    assert keys(law, meeting(NEUTRAL, ION)) == []
    assert keys(law, meeting(NEUTRAL)) == ["reaction"]
    labels = Capture("dispersion", C6=si(1e-77))
    assert keys(labels, meeting(Gas.label("A"))) == ["law"]


def test_which_wall_form_suits_a_vessel() -> None:
    """The mean free path 3 D/v against the width, and nothing to diffuse through."""
    v = math.sqrt(8 * R * 300.0 / (math.pi * 2.016e-3))

    def law(path: float, **options: Any) -> Wall:
        return Wall(si(0.1), None, si(path * v / 3), si(300.0), si(100.0), **options)

    where = alone(H2, surroundings=Flask(), pressure=100.0, temperatures=(300.0, 300.0))
    assert law(0.01).mean_free_path(where) == pytest.approx(0.01, rel=1e-9)
    assert law(0.059).form_in_use(where) == "exact"
    assert law(0.061).form_in_use(where) == "uptake only"
    assert law(0.01, area=si(1.0)).form_in_use(where) == "uptake only"
    shapeless = replace(where, surroundings=Flask(interior=None))
    assert law(0.01).form_in_use(shapeless) == "uptake only"
    assert law(0.01).form_in_use(replace(where, pressure=None)) == "uptake only"
    # a fifth of the radius is said
    assert len(list(law(0.0059).cautions(where))) == 1
    assert len(list(law(0.0061).cautions(where))) == 2
    assert law(0.01, area=si(2e-2)).surface_to_volume(where) == pytest.approx(200.0)
    assert law(0.01).surface_to_volume(where) == 100.0
    assert law(0.01).surface_to_volume(replace(where, surroundings=None)) is None


def test_the_fit_of_the_dipole_is_written_over_the_namespace_it_is_given() -> None:
    """sympy's branches must be sympy's: the two pieces are joined by ``below`` of the namespace."""
    asked: list[float] = []

    class Asked(Numbers):
        @staticmethod
        def below(x: Any, limit: Any, then: Any, otherwise: Any) -> Any:
            asked.append(limit)
            return Numbers.below(x, limit, then, otherwise)

    formula = FORMULAS["ion and permanent dipole"]
    formula.coefficient(Asked(), 300.0, 0.0, 0.0, (1.0, 1e-26, 1e-57, 1e-20))
    assert asked == [2.0]


def test_a_rate_constant_asked_without_pressure_or_bath_is_that_in_an_empty_vessel() -> None:
    """No M: a falloff step does not run. No pressure: diffusion is no hindrance, h S/V is left."""
    falloff = Falloff(PowerLaw(si(2.0)), PowerLaw(si(3.0)))
    assert falloff.rate_constant(alone(H2, has_bath=True), 300.0) == 0.0
    where = alone(H2, surroundings=Flask(), pressure=100.0, temperatures=(300.0, 300.0))
    wall = Wall(si(0.1), "exact", si(1e-2), si(300.0), si(100.0))
    v = math.sqrt(8 * R * 300.0 / (math.pi * 2.016e-3))
    free = 0.1 * v / (2 * (2 - 0.1)) * 3 / 0.03
    assert wall.rate_constant(where, 300.0) == pytest.approx(free, rel=1e-9)


SECOND: dict[str, Any] = {"polarisability": {"NH3": si(2.1e-30)}, "dipole": si(4.9e-30)}
CAPTURES = [
    (Capture("dispersion", C6=si(1e-77)), PAIR),
    (
        Capture("ion and induced dipole", polarisability=SECOND["polarisability"]),
        meeting(ION, NEUTRAL),
    ),
    (Capture("ion and permanent dipole", **SECOND), meeting(ION, NEUTRAL)),
    (
        Capture(
            "electron jump", ionisation_energy={"H2": si(9e5)}, electron_affinity={"I2": si(2e5)}
        ),
        PAIR,
    ),
]


@pytest.mark.parametrize(
    ("law", "where"), CAPTURES, ids=lambda value: getattr(value, "attraction", "")
)
def test_every_attraction_takes_its_share_of_surfaces_and_names_its_numbers(
    law: Capture, where: StepContext
) -> None:
    whole = float(law.rate_constant(where, 400.0))
    third = replace(law, electronic_factor=si(1 / 3))
    assert third.rate_constant(where, 400.0) == pytest.approx(whole / 3, rel=1e-12)
    slots = law.template(where).slots
    assert len(slots) == len(set(slots)) == len(law.numbers(where))


@pytest.mark.parametrize(("factor", "said"), [(0.999, 0), (1.001, 1)])
def test_how_slowly_a_dipole_may_turn(factor: float, said: int) -> None:
    """I* = mu_D I/(alpha q mu) below (0.7 + x^2)/(2 + 0.6 x), at x of the coldest temperature.

    T. Su and W. J. Chesnavich, J. Chem. Phys. 76, 5183 (1982) (from memory); x^2 = mu_D^2/(2 alpha
    k_B T) with mu_D^2/(4 pi eps0), everything in SI; I = h/(8 pi^2 c B) of a rotational constant.
    """
    T, alpha, dipole = 300.0, 2.1e-30, 4.9e-30
    x = math.sqrt(dipole**2 / (4 * math.pi * 8.8541878128e-12) / (2 * alpha * 1.380649e-23 * T))
    mu = 19.023e-3 * 17.031e-3 / (19.023e-3 + 17.031e-3) / 6.02214076e23
    limit = (0.7 + x * x) / (2 + 0.6 * x)
    inertia = factor * limit * alpha * mu / (dipole / 1.602176634e-19)
    B = 6.62607015e-34**2 / (8 * math.pi**2 * inertia) * 6.02214076e23
    law = Capture("ion and permanent dipole", **SECOND, rotational_constant=si(B))
    where = meeting(ION, NEUTRAL, temperatures=(T, 900.0))
    assert law.reduced_dipole(where, T) == pytest.approx(x, rel=1e-8)
    # so heavy a rotor is far from quantum, and x is small: this is all there is to say
    assert len(list(law.cautions(where))) == said


def test_a_falloff_step_without_broadening_reads_no_centre() -> None:
    """And says what its estimated low-pressure limit rests on."""
    low = StrongCollisions(si(1e5), si(3.0), "H2")
    where = alone(H2, has_bath=True)
    law = Falloff(low, PowerLaw(si(3.0)), "none", Centre(si(0.5)))
    assert len(law.numbers(where)) == len(law.template(where).slots) == 8
    assert list(law.cautions(where)) == list(low.cautions(where))
    assert len(list(low.cautions(where))) == 1
    broad = replace(law, broadening="unit width")
    assert len(broad.numbers(where)) == len(broad.template(where).slots) == 9
