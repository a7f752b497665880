"""Which attraction two gases have, and what is said where that is not known."""

from __future__ import annotations

from dataclasses import replace

import pytest

from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.attraction import Attraction, attraction_of
from meanfree.rates.ceiling import Standing, against_capture
from meanfree.sourced import Sourced

DEBYE = 3.33564e-30  # C m


def gas(name: str, mass: float) -> Gas:
    return Gas(name, parse_formula(name), molar_mass=Sourced(mass * 1e-3))


AMMONIA = replace(gas("NH3", 17.031), polarisability=Sourced(2.103e-30))
HYDRONIUM = gas("H3O+", 19.023)


def test_an_ion_and_a_permanent_dipole() -> None:
    """H3O+ + NH3 at 300 K: 2.6e-9 cm^3/s; T. Su and W. J. Chesnavich, J. Chem. Phys. 76, 5183.

    Polarisability 2.103 angstrom^3 and dipole 1.4718 D (from memory); recomputed 2.60696e-9.
    """
    found = attraction_of((HYDRONIUM, replace(AMMONIA, dipole=Sourced(1.4718 * DEBYE))))
    assert isinstance(found, Attraction)
    assert found.word == "ion and permanent dipole"
    assert found.rate_constant(300.0) / 6.02214076e23 * 1e6 == pytest.approx(2.60696e-9, rel=1e-4)


def test_without_a_dipole_the_induced_one_is_taken_and_said() -> None:
    for dipole in (None, Sourced(0.0)):
        found = attraction_of((replace(AMMONIA, dipole=dipole), HYDRONIUM))
        assert isinstance(found, Attraction)
        assert found.word == "ion and induced dipole"
        assert "a permanent dipole, where there is one, adds to it" in found.basis


@pytest.mark.parametrize(
    ("partners", "said"),
    [
        ((), "no encounter of two molecules"),
        ((Gas.label("A"), Gas.label("B")), "no masses known"),
        ((HYDRONIUM, HYDRONIUM), "two ions: no capture rate constant for those"),
        ((HYDRONIUM, gas("H2O", 18.015)), "polarisability of H2O not known"),
        ((AMMONIA, AMMONIA), "ionisation energy of NH3 not known"),
        (
            (AMMONIA, gas("H2O", 18.015)),
            "polarisability of H2O not known; ionisation energy of NH3 and H2O not known",
        ),
    ],
)
def test_what_lacks_is_named(partners: tuple[Gas, ...], said: str) -> None:
    assert attraction_of(partners) == said
    assert attraction_of(partners, Arrhenius(Sourced(1.0), Sourced(0.0))) == said


def test_capture_takes_no_negative_rate_constant() -> None:
    with pytest.raises(ValueError) as caught:
        against_capture(-1.0, 1.0)
    assert str(caught.value) == "k: found -1; expected at least 0"
    assert against_capture(0.0, 1.0) is Standing.NONE


def test_every_standing_says_whether_it_may_be_wrong() -> None:
    wrong = {one for one in Standing if one.may_be_wrong}
    assert wrong == {one for one in Standing if "suspect" in one.value}
    assert {one for one in Standing if one.is_above} == wrong | {Standing.LONG_RANGE}
