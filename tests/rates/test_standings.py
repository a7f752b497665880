"""Where a rate constant stands to its ceilings, case by case, and what these are worked from.

With Z = 1e8 m^3/mol/s at 500 K. The limits (a tenth of all encounters, above 1 beyond rounding) are
the module's own words; on which side of them a number falls is counted here by hand.
"""

from __future__ import annotations

import math

import pytest
from encounters import alone, meeting, molecule

from meanfree.gases.gas import Gas
from meanfree.rates.attraction import Attraction, attraction_of
from meanfree.rates.capture import Capture
from meanfree.rates.ceiling import Ceiling, Judgement, Standing, against_capture, ceiling, judge
from meanfree.sourced import Sourced

R = 8.314462618
N_A = 6.02214076e23
HALF = 0.5 * R * 500.0

LIMIT = Ceiling(1e8, 4e-10, math.pi * 16e-20, 600.0, False, 500.0)


def standing(share: float, threshold: float | None, long_range: float | None = None) -> Standing:
    """Of k = share Z exp(-threshold/RT), so that ``share`` is the steric factor."""
    if threshold is None:
        return judge(share * 1e8, None, LIMIT).standing(long_range)
    k = share * 1e8 * math.exp(-threshold / (R * 500.0))
    return judge(k, threshold + HALF, LIMIT).standing(long_range)


# exp(-30 kJ/mol/RT) is 7e-4 at 500 K, exp(-5 kJ/mol/RT) is 0.30.
@pytest.mark.parametrize(
    ("share", "threshold", "expected"),
    [
        (2.0, 0.0, Standing.ABOVE),
        (2.0, 30e3, Standing.STEEP),
        (2.0, None, Standing.ABOVE),
        (1.0, 0.0, Standing.LIMITED),
        (0.3, None, Standing.LIMITED),
        (0.1, None, Standing.LIMITED),
        (0.099, None, Standing.UNKNOWN),
        (0.8, 5e3, Standing.LIMITED),
        (0.5, 30e3, Standing.ACTIVATED),
        (1e-4, 5e3, Standing.HINDERED),
        (0.01, 30e3, Standing.BOTH),
        (0.2, 5e3, Standing.HINDERED),
        (0.15, 30e3, Standing.ACTIVATED),
        (0.0, None, Standing.NONE),
    ],
)
def test_against_hard_spheres(share: float, threshold: float | None, expected: Standing) -> None:
    assert standing(share, threshold) is expected


@pytest.mark.parametrize(
    ("share", "threshold", "long_range", "expected"),
    [
        (2.0, 0.0, 3e8, Standing.LONG_RANGE),
        (2.0, 0.0, 1.5e8, Standing.SUSPECT),
        # what counts with a barrier is what all encounters above it would have to be
        (2.0, 30e3, 3e8, Standing.LONG_RANGE),
        (2.0, 30e3, 1.5e8, Standing.SUSPECT),
        (2.0, None, 3e8, Standing.LONG_RANGE),
        (0.5, 30e3, 1.0, Standing.ACTIVATED),
    ],
)
def test_against_long_range_capture_too(
    share: float, threshold: float | None, long_range: float, expected: Standing
) -> None:
    assert standing(share, threshold, long_range) is expected


def test_the_ceiling_itself_is_no_excess() -> None:
    """A rounding above 1 does not count; a millionth does."""
    assert not Judgement(1e8 * (1 + 1e-12), 1e8, None, None, None, None, False).is_suspect
    assert Judgement(1e8 * (1 + 1e-6), 1e8, None, None, None, None, False).exceeds_ceiling
    assert not Judgement(1.0, 1e8, 0.0, 0.0, 1 + 1e-12, 1.0, False).is_suspect
    assert Judgement(1.0, 1e8, 0.0, 0.0, 1 + 1e-6, 1.0, False).exceeds_barrier


@pytest.mark.parametrize(
    ("share", "expected"),
    [
        (1.01, Standing.OVER_CAPTURE),
        (1 + 1e-12, Standing.CAPTURED),
        (1.0, Standing.CAPTURED),
        (0.1, Standing.CAPTURED),
        (0.0999, Standing.BELOW_CAPTURE),
    ],
)
def test_against_capture_alone(share: float, expected: Standing) -> None:
    assert against_capture(share * 8.0, 8.0) is expected


def test_a_judgement_without_barrier_or_reaction_has_no_steric_factor() -> None:
    for judged in (judge(0.0, 1e3, LIMIT), judge(5.0, None, LIMIT)):
        assert (judged.threshold, judged.steric, judged.A_over_Z) == (None, None, None)
        assert not judged.below_half_rt
    flat = judge(2e7, HALF / 2, LIMIT)
    assert (flat.threshold, flat.below_half_rt) == (0.0, True)
    assert flat.steric == pytest.approx(0.2, rel=1e-12)
    assert flat.A_over_Z == pytest.approx(0.2 * math.exp(0.25), rel=1e-8)


@pytest.mark.parametrize(
    ("k", "Ea", "verdict"),
    [
        (1.5e5 * 1e8, None, "above the collision limit: 1.50 × 10⁵ times Z, so suspect"),
        (1.5e4 * 1e8, None, "above the collision limit: 15000 times Z, so suspect"),
        (1e8, 0.0, "at the collision limit: all encounters react; Ea is below RT/2, so E0 = 0"),
        (
            0.04e8,
            0.0,
            "below the collision limit: one in 25 encounters reacts; Ea is below RT/2, so E0 = 0",
        ),
        (
            0.2e8,
            None,
            "below the collision limit: a share of 0.2 of the encounters reacts; "
            "no activation energy is stated, so no steric factor",
        ),
    ],
)
def test_verdicts_say_how_much(k: float, Ea: float | None, verdict: str) -> None:
    assert judge(k, Ea, LIMIT).verdict == verdict


def test_only_two_gases_of_known_mass_and_size_have_a_ceiling() -> None:
    argon, bare = molecule("Ar", diameter=3.4e-10), molecule("He")
    label = Gas("A", diameter=Sourced(3e-10))
    assert ceiling((argon,), 300.0) is None
    assert ceiling((argon,) * 3, 300.0) is None
    for other in (bare, label):
        assert ceiling((argon, other), 300.0) is None
        assert ceiling((other, argon), 300.0) is None
    given = ceiling((argon, bare), 300.0, 3e-10)
    assert given is not None
    assert (given.pair_diameter, given.like, given.temperature) == (3e-10, False, 300.0)
    assert given.cross_section == pytest.approx(math.pi * 9e-20, rel=1e-12)


def test_two_neutral_molecules_attract_by_dispersion() -> None:
    """London: C6 = 3/2 a1 a2 I1 I2/(I1 + I2), and k of the capture law with that C6.

    Argon and krypton: 1.64 and 2.48 angstrom^3, 15.76 and 14.00 eV (from memory).
    """
    eV = 96485.332
    first, second = (
        Gas(name, molar_mass=Sourced(mass), polarisability=Sourced(a), ionisation_energy=Sourced(I))
        for name, mass, a, I in (
            ("Ar", 0.039948, 1.64e-30, 15.76 * eV),
            ("Kr", 0.083798, 2.48e-30, 14.00 * eV),
        )
    )
    found = attraction_of((first, second))
    assert isinstance(found, Attraction)
    assert (found.word, found.basis) == ("dispersion", "estimated by London's formula")
    assert found.partners == (first, second)
    C6 = 1.5 * 1.64e-30 * 2.48e-30 * (15.76 * 14.0 / 29.76) * eV / N_A
    plain = Capture("dispersion", C6=Sourced(C6)).rate_constant(meeting(first, second), 300.0)
    assert found.rate_constant(300.0) == pytest.approx(float(plain), rel=1e-9)
    # of one gas I1 I2/(I1 + I2) is I/2, and the rate constant carries the half on both sides
    like = attraction_of((first, first))
    assert isinstance(like, Attraction)
    own = Capture("dispersion", C6=Sourced(0.75 * 1.64e-30**2 * 15.76 * eV / N_A))
    assert like.rate_constant(300.0) == pytest.approx(
        float(own.rate_constant(meeting(first), 300.0)), rel=1e-9
    )


def test_a_capture_step_gives_its_own_attraction_without_the_share_of_surfaces() -> None:
    argon, krypton = molecule("Ar"), molecule("Kr")
    law = Capture("dispersion", C6=Sourced(1e-77), electronic_factor=Sourced(0.25))
    found = attraction_of((argon, krypton), law)
    assert isinstance(found, Attraction)
    assert found.basis == "as the step gives it"
    quarter = float(law.rate_constant(meeting(argon, krypton), 300.0))
    assert found.rate_constant(300.0) == pytest.approx(4 * quarter, rel=1e-12)
    assert attraction_of((argon,), law) == "no encounter of two molecules"


def test_what_a_step_of_one_molecule_lacks_for_an_encounter() -> None:
    law = Capture("dispersion", C6=Sourced(1e-77))
    (problem, *_) = law.problems(alone(molecule("Ar")))
    assert (problem.key, problem.found) == ("reaction", "Ar")
    assert list(law.problems(meeting(molecule("Ar"), molecule("Kr")))) == []
