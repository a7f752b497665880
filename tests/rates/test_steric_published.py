"""Published steric factors, and what the two conventions of them are to each other."""

from __future__ import annotations

import math

import numpy as np
import pytest
from encounters import meeting, molecule
from laboratory import si
from scipy.constants import N_A, R, k, pi
from validation import Checked

from meanfree.gases.gas import Gas
from meanfree.rates import ceiling
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.collision import Collision

LITRE = 1e-3


@pytest.mark.parametrize(
    ("A", "theory", "published", "Ea", "pair"),
    [
        (9.4e9, 5.9e10, "0.16", 102e3, ("NOCl", None)),
        (6.3e7, 2.5e10, "2.5e-3", 0.0, ("ClO", None)),
        (1.24e6, 7.3e11, "1.7e-6", 180e3, ("H2", "C2H4")),
        (1.0e12, 2.1e11, "4.8", 0.0, ("K", "Br2")),
    ],
)
def test_ratios_of_arrhenius_factors(
    A: float,
    theory: float,
    published: str,
    Ea: float,
    pair: tuple[str, str | None],
    checked: Checked,
) -> None:
    """Atkins, Physical Chemistry, Arrhenius parameters: P = A/A_theory, to the digits printed.

    The table gives neither sigma nor T, so the spheres are made as large as A_theory asks for:
    then A over Z of the Arrhenius law is the table's ratio, and the collision law with it gives
    the Arrhenius k back at that temperature.
    """
    T = 600.0
    first, second = molecule(pair[0]), None if pair[1] is None else molecule(pair[1])
    context = meeting(first, second, temperature=T)
    other = first if second is None else second
    mu = 1 / (1 / float(first.molar_mass) + 1 / float(other.molar_mass)) / N_A  # type: ignore[arg-type]
    half = 0.5 if second is None else 1.0
    speed = math.sqrt(8 * k * T / (pi * mu))
    d = math.sqrt(theory * LITRE / (half * pi * speed * N_A))
    law = Arrhenius(si(A * LITRE), si(Ea))
    limit = ceiling.ceiling((first, other), T, d)
    assert limit is not None
    judged = ceiling.judge(float(law.rate_constant(context, T)), Ea, limit)
    assert judged.A_over_Z is not None
    source = "Atkins, Physical Chemistry, table of Arrhenius parameters"
    checked("A over Z of four Arrhenius laws", judged.A_over_Z, published, "", source)
    spheres = Collision(Ea=si(Ea), A_over_Z=si(judged.A_over_Z), diameter=si(d))
    assert spheres.rate_constant(context, T) == pytest.approx(
        float(law.rate_constant(context, T)), rel=1e-12
    )
    # Below RT/2 there is no threshold to give, and the two factors are one: K + Br2, ClO.
    if Ea < R * T / 2:
        assert judged.below_half_rt
        assert judged.steric == pytest.approx(judged.A_over_Z, rel=1e-12)
    else:
        assert judged.steric == pytest.approx(judged.A_over_Z * math.exp(-0.5), rel=1e-12)


OXYGEN, BENZENE = molecule("O", 16e-3), molecule("C6H6", 78e-3)
KELVINS = np.array([300.0, 341.0, 392.0])
MEASURED = np.array([1.44e7, 3.03e7, 6.90e7]) * LITRE


def test_oxygen_atoms_and_benzene(checked: Checked) -> None:
    """A university tutorial with its key: k at 300, 341, 392 K; radii 78 and 265 pm.

    Ea 16641 J/mol and A 1.116e10 L/mol/s from a straight line (published with 0.01 %); at 340 K
    sigma* = 2.518e-20 m^2, p = 0.0681; with the threshold Ea - RT/2 0.0413.
    """
    slope, intercept = np.polyfit(1 / KELVINS, np.log(MEASURED), 1)
    Ea, A = -R * slope, math.exp(intercept)
    source = "a university tutorial with its key"
    checked("Ea of O + C₆H₆ from three k", Ea, "16641.3", "J/mol", source, rel=1e-4)
    checked("A of O + C₆H₆ from three k", A / LITRE, "1.11645e10", "L/mol/s", source, rel=3e-4)
    # onwards with the key's own two numbers, as it does
    Ea, A = 16641.3, 1.11645e10 * LITRE
    T, d = 340.0, 343e-12
    limit = ceiling.ceiling((OXYGEN, BENZENE), T, d)
    assert limit is not None
    judged = ceiling.judge(A * math.exp(-Ea / (R * T)), Ea, limit)
    assert judged.A_over_Z == pytest.approx(0.0681188, rel=1e-5)
    assert judged.steric == pytest.approx(0.0413161, rel=1e-5)
    assert judged.A_over_Z is not None
    assert judged.A_over_Z * pi * d**2 == pytest.approx(2.51771e-20, rel=1e-5)
    # the collision law takes either number, and means the same by both
    context = meeting(OXYGEN, BENZENE)
    named = {"Ea": si(Ea), "Ea_at": si(T), "diameter": si(d)}
    by_ratio = Collision(A_over_Z=si(judged.A_over_Z), **named)
    by_steric = Collision(steric=si(float(judged.steric or 0.0)), **named)
    for T in KELVINS:
        first, second = (float(law.rate_constant(context, T)) for law in (by_ratio, by_steric))
        assert first == pytest.approx(second, rel=1e-12)


def test_hydrogen_and_iodine(checked: Checked) -> None:
    """A worked problem: diameters 225 and 559 pm, Ea 167 kJ/mol used as threshold, 700 K.

    k = 0.273 L/mol/s, three digits.
    """
    first: Gas = molecule("H2", diameter=225e-12)
    second: Gas = molecule("I2", diameter=559e-12)
    law = Collision(threshold=si(167e3))
    value = law.rate_constant(meeting(first, second), 700.0) / LITRE
    source = "a worked problem"
    checked("k of H₂ + I₂ by the collision law, 700 K", value, "0.273", "L/mol/s", source)
