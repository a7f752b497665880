"""The ceiling table against published steric factors, capture limits, and roots that are known."""

from __future__ import annotations

import math
from pathlib import Path

import pytest
from scipy.constants import N_A, R, k, pi
from small_cases import load_text

from meanfree.planning.ceiling import CeilingTable, Level, StepCeiling, ceiling_table
from meanfree.rates.attraction import Attraction
from meanfree.rates.ceiling import Standing

HEAD = """title = "A pair"

[vessel]
holds = "volume"
volume = "1 L"

[temperature]
mode = "isothermal"
value = "{T:.12g} K"

[fill]
gases = {{ {fill} }}
"""


def case(
    tmp_path: Path,
    reaction: str,
    law: str,
    T: float = 600.0,
    gases: str = "",
    between: tuple[float, float] | None = None,
) -> CeilingTable:
    """The ceiling table of one step between the gases on its left."""
    left = dict.fromkeys(reaction.split(" -> ")[0].removeprefix("2 ").split(" + "))
    fill = ", ".join(f'{name if name.isalnum() else repr(name)} = "1 torr"' for name in left)
    step = f'\n[[steps]]\nname = "d"\nreaction = "{reaction}"\n{law}\n'
    text = HEAD.format(T=T, fill=fill) + gases + step
    return ceiling_table(load_text(tmp_path, text).experiment, between)


def only(table: CeilingTable) -> tuple[StepCeiling, Level]:
    (one,) = table.steps
    return one, one.at_run


def arrhenius(A: float, Ea: float) -> str:
    return f'law = "arrhenius"\nA = "{A:.12g} L/mol/s"\nEa = "{Ea:.12g} J/mol"'


def diameters(sizes: dict[str, float]) -> str:
    return "".join(f'[gases.{name}]\ndiameter = "{d:.12g} m"\n' for name, d in sizes.items())


@pytest.mark.parametrize(
    ("reaction", "masses", "A", "theory", "published", "Ea", "standing"),
    [
        ("2 NOCl -> 2 NO + Cl2", (65.459, 65.459), 9.4e9, 5.9e10, 0.16, 102e3, Standing.BOTH),
        ("2 ClO -> Cl2 + O2", (51.452, 51.452), 6.3e7, 2.5e10, 2.5e-3, 0.0, Standing.HINDERED),
        ("H2 + C2H4 -> C2H6", (2.01588, 28.054), 1.24e6, 7.3e11, 1.7e-6, 180e3, Standing.BOTH),
        ("K + Br2 -> KBr + Br", (39.098, 159.808), 1.0e12, 2.1e11, 4.8, 0.0, Standing.ABOVE),
    ],
)
def test_tabulated_steric_factors(
    tmp_path: Path,
    reaction: str,
    masses: tuple[float, float],
    A: float,
    theory: float,
    published: float,
    Ea: float,
    standing: Standing,
) -> None:
    """Atkins, Physical Chemistry, table of Arrhenius parameters: P = A/A_theory, two digits.

    The table gives neither sigma nor T: the spheres are as large as its A_theory asks at 600 K.
    """
    T = 600.0
    half = 0.5 if reaction.startswith("2 ") else 1.0
    mu = 1e-3 / (1 / masses[0] + 1 / masses[1]) / N_A
    d = math.sqrt(theory * 1e-3 / (half * pi * math.sqrt(8 * k * T / (pi * mu)) * N_A))
    names = reaction.split(" -> ")[0].removeprefix("2 ").split(" + ")
    table = case(tmp_path, reaction, arrhenius(A, Ea), T, diameters(dict.fromkeys(names, d)))
    one, level = only(table)
    assert level.is_run
    assert level.temperature == T
    judged = level.judgement
    assert judged is not None
    digits = 0.5 * 10 ** (math.floor(math.log10(published)) - 1)
    assert judged.A_over_Z == pytest.approx(published, abs=digits)
    # atomic weights of three decimals: Z, as mu^-1/2, to 1e-5
    assert pytest.approx(theory * 1e-3, rel=2e-5) == judged.Z
    assert judged.below_half_rt == (Ea < R * T / 2)
    assert level.standing is standing
    assert one.span == pytest.approx((T / 1.25, T * 1.25))


def test_oxygen_atoms_and_benzene_of_stated_radii(tmp_path: Path) -> None:
    """A university tutorial with its key: radii 78 and 265 pm, Ea 16641.3 J/mol, A 1.11645e10.

    At 340 K p = 0.0681188 (A over Z), 0.0413161 with the threshold Ea - RT/2; masses 16 and 78.
    """
    gases = diameters({"O": 156e-12, "C6H6": 530e-12}) + 'cas = "71-43-2"\n'
    table = case(
        tmp_path,
        "O + C6H6 -> C6H5OH",
        arrhenius(1.11645e10, 16641.3),
        340.0,
        gases + ('[gases.C6H5OH]\ncas = "108-95-2"\nformula = "C6H6O"\n'),
    )
    _, level = only(table)
    judged = level.judgement
    assert judged is not None
    # the key's masses are whole numbers: 1/sqrt(mu) differs by 7e-5
    assert judged.A_over_Z == pytest.approx(0.0681188, rel=2e-4)
    assert judged.steric == pytest.approx(0.0413161, rel=2e-4)
    assert judged.threshold == pytest.approx(16641.3 - R * 340 / 2, rel=1e-8)
    assert level.standing is Standing.BOTH


def test_where_k_crosses_the_ceiling(tmp_path: Path) -> None:
    """For A exp(-Ea/RT) = Z(T) with Z = z sqrt(T) the root satisfies T = Ea/(R ln(A/Z(T)))."""
    A, Ea, d = 5e11, 6e3, 3e-10
    table = case(
        *(tmp_path, "2 ClO -> Cl2 + O2", arrhenius(A, Ea), 600.0, diameters({"ClO": d})),
        between=(300.0, 1000.0),
    )
    one, _ = only(table)
    first = one.crossings[0]
    mu = 0.5 * 51.452e-3 / N_A
    T = first.temperature
    Z = 0.5 * pi * d**2 * math.sqrt(8 * k * T / (pi * mu)) * N_A
    assert pytest.approx(Ea / (R * math.log(A * 1e-3 / Z)), rel=1e-4) == T
    assert first.rising
    assert first.inside == (300 <= T <= 1000)
    assert first.ceiling == "hard spheres"
    assert one.span == (300.0, 1000.0)
    assert one.span_basis == "as asked"


def test_the_stated_range_is_the_one_looked_at(tmp_path: Path) -> None:
    law = arrhenius(1e10, 5e4) + '\nvalid = ["300 K", "450 K"]'
    one, level = only(case(tmp_path, "2 ClO -> Cl2 + O2", law, 500.0))
    assert one.span == (300.0, 450.0)
    assert [level.temperature for level in one.levels] == [300.0, 375.0, 450.0]
    assert not any(level.is_run or level.outside for level in one.levels)
    assert level.temperature == 375.0
    wide, _ = only(case(tmp_path, "2 ClO -> Cl2 + O2", law, 500.0, between=(250.0, 450.0)))
    assert [level.outside for level in wide.levels] == [True, False, False]


def test_london_gives_two_neutral_gases_a_long_range_ceiling(tmp_path: Path) -> None:
    """Two argon-like atoms: C6 = 3/2 a^2 I/2, k = 8.553 C6^(1/3) mu^-1/2 (kT)^1/6, halved.

    The coefficient 8.553: Georgievskii and Klippenstein, J. Chem. Phys. 122, 194103 (2005) (from
    memory). ClO stands in as the gas, with made-up numbers.
    """
    gases = (
        '[gases.ClO]\ndiameter = "2 angstrom"\npolarisability = "3 angstrom^3"\n'
        'ionisation_energy = "11 eV"\n'
    )
    one, level = only(case(tmp_path, "2 ClO -> Cl2 + O2", arrhenius(1e11, 0.0), 300.0, gases))
    assert isinstance(one.attraction, Attraction)
    assert one.attraction.word == "dispersion"
    C6 = 1.5 * (3e-30) ** 2 * 11 * 1.602176634e-19 / 2
    mu = 0.5 * 51.452e-3 / N_A
    expected = 0.5 * 8.553 * N_A * C6 ** (1 / 3) / math.sqrt(mu) * (k * 300) ** (1 / 6)
    # 8.553 has four digits
    assert level.long_range == pytest.approx(expected, rel=1e-4)
    assert level.limit is not None
    assert level.limit.Z < level.k < level.long_range
    assert level.standing is Standing.LONG_RANGE


def test_what_lacks_for_a_long_range_ceiling_is_named(tmp_path: Path) -> None:
    gases = '[gases.K]\ndiameter = "4.6 angstrom"\npolarisability = "43 angstrom^3"\n'
    one, level = only(case(tmp_path, "K + Br2 -> KBr + Br", arrhenius(1e9, 0.0), 600.0, gases))
    assert one.attraction == (
        "polarisability of Br2 not known; ionisation energy of K and Br2 not known"
    )
    assert level.long_range is None


def test_an_ion_without_a_diameter_is_held_against_its_capture(tmp_path: Path) -> None:
    """H2+ + H2: the Langevin rate constant is 2.08e-9 cm^3/s (ion-molecule tables, from memory).

    2.069e-9 with polarisability 0.787 angstrom^3 (recomputed from 2 pi e sqrt(alpha/mu)).
    """
    gases = '[gases.H2]\npolarisability = "0.787 angstrom^3"\n'
    gases += '[gases."H2+"]\nformula = "H2+"\ncas = "none"\n'
    gases += '[gases."H3+"]\nformula = "H3+"\ncas = "none"\n'
    for factor, standing in (
        (0.99, Standing.CAPTURED),
        (0.01, Standing.BELOW_CAPTURE),
        (1.01, Standing.OVER_CAPTURE),
    ):
        law = f'law = "fixed"\nk = "{factor * 2.06945716585e-9:.12g} cm^3/s"'
        one, level = only(case(tmp_path, "H2+ + H2 -> H3+ + H", law, 300.0, gases))
        assert level.limit is None
        assert level.long_range is not None
        assert level.long_range / N_A * 1e6 == pytest.approx(2.06945716585e-9, rel=1e-5)
        assert level.standing is standing
        assert one.crossings == ()


def test_a_capture_step_is_its_own_ceiling_but_for_the_electronic_share(tmp_path: Path) -> None:
    law = 'law = "capture"\nattraction = "dispersion"\nC6 = "300 hartree*bohr^6"\n'
    plain, level = only(case(tmp_path, "2 ClO -> Cl2 + O2", law, 300.0))
    assert level.k == level.long_range
    assert plain.crossings == () or all(c.ceiling == "hard spheres" for c in plain.crossings)
    _, shared = only(case(tmp_path, "2 ClO -> Cl2 + O2", law + "electronic_factor = 0.25", 300.0))
    assert shared.long_range == level.long_range
    assert shared.k == pytest.approx(level.k / 4, rel=1e-14)


def test_a_reverse_above_its_ceiling_exposes_a_barrier_below_the_heat(tmp_path: Path) -> None:
    """Br + HBr -> H + Br2 takes up 174 kJ/mol: with 140 the reverse exceeds every encounter."""
    law = arrhenius(1e11, 140e3) + '\nreverse = "thermochemistry"'
    forward, back = case(tmp_path, "Br + HBr -> H + Br2", law, 500.0).steps
    assert not forward.at_run.standing.is_above
    assert back.back
    assert back.name == "d (reverse)"
    assert back.at_run.standing is Standing.ABOVE
    assert back.at_run.k > 100 * back.at_run.ceiling
    honest = arrhenius(1e11, 178e3) + '\nreverse = "thermochemistry"'
    _, back = case(tmp_path, "Br + HBr -> H + Br2", honest, 500.0).steps
    assert not back.at_run.standing.is_above


@pytest.mark.parametrize(
    ("law", "standing"),
    [
        (arrhenius(1e5, 0.0), Standing.HINDERED),
        (arrhenius(5e10, 0.0), Standing.LIMITED),
        (arrhenius(5e10, 6e4), Standing.ACTIVATED),
        (arrhenius(1e5, 6e4), Standing.BOTH),
        (arrhenius(9e11, 6e4), Standing.STEEP),
        (arrhenius(9e13, 0.0), Standing.ABOVE),
        (arrhenius(0.0, 0.0), Standing.NONE),
        ('law = "fixed"\nk = "1e5 L/mol/s"', Standing.UNKNOWN),
        ('law = "fixed"\nk = "8e10 L/mol/s"', Standing.LIMITED),
    ],
)
def test_every_verdict_of_hard_spheres(tmp_path: Path, law: str, standing: Standing) -> None:
    # Z of ClO at 600 K with 4 angstrom: 1.06e11 L/mol/s
    size = diameters({"ClO": 4e-10})
    _, level = only(case(tmp_path, "2 ClO -> Cl2 + O2", law, 600.0, size))
    assert level.standing is standing


def test_nothing_explains_what_is_above_both(tmp_path: Path) -> None:
    gases = (
        '[gases.ClO]\ndiameter = "4 angstrom"\npolarisability = "3 angstrom^3"\n'
        'ionisation_energy = "11 eV"\n'
    )
    _, level = only(case(tmp_path, "2 ClO -> Cl2 + O2", arrhenius(9e13, 0.0), 600.0, gases))
    assert level.standing is Standing.SUSPECT


def test_steps_that_are_no_encounter_are_named(tmp_path: Path) -> None:
    law = 'law = "arrhenius"\nA = "1e13 1/s"\nEa = "200 kJ/mol"\nreverse = "thermochemistry"'
    table = case(tmp_path, "Cl2 -> 2 Cl", law, 600.0)
    assert [(out.name, out.why) for out in table.left_out] == [
        ("d", "no encounter of two molecules")
    ]
    (back,) = table.steps
    assert back.back
    assert [gas.name for gas in back.partners] == ["Cl", "Cl"]
    assert back.levels[0].limit is not None
    assert back.levels[0].limit.like


def test_a_gas_of_unknown_size_is_named(tmp_path: Path) -> None:
    table = case(tmp_path, "KBr + Br -> K + Br2", arrhenius(1e9, 0.0))
    assert table.steps == ()
    (out,) = table.left_out
    assert out.why.startswith("diameter of KBr not known; polarisability of KBr and Br not known")


def test_a_table_of_k_is_not_left(tmp_path: Path) -> None:
    law = (
        'law = "table"\npoints = [["500 K", "1e3 L/mol/s"], ["600 K", "1e4 L/mol/s"],'
        ' ["640 K", "2e4 L/mol/s"]]'
    )
    one, _ = only(case(tmp_path, "2 ClO -> Cl2 + O2", law, 600.0, between=(300.0, 1000.0)))
    # a table is continued by 5 K at most
    assert one.span == pytest.approx((495.0, 645.0), abs=2e-3)
    assert one.searched == pytest.approx((495.0, 645.0), abs=2e-3)
    assert one.span_basis == "as asked, as far as k is known"
