"""`collide`: published numbers through the command, what it refuses, what it leaves."""

from __future__ import annotations

import json
import shlex
import subprocess
import sys
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import pytest
from scipy import constants

from meanfree.cli.app import run

H2_I2 = ["H2", "I2", "--diameter", "H2=2.25 angstrom", "--diameter", "I2=559 pm"]


def summary(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict[str, Any]:
    """What `collide … --json` prints; it must print nothing else."""
    assert run(["collide", *arguments, "--json"]) == 0
    said = capsys.readouterr()
    assert said.err == ""
    found: dict[str, Any] = json.loads(said.out)
    return found


def refused(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    """The whole message of a command that must be refused."""
    assert run(["collide", *arguments]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    return said.err


# --- published numbers


def test_oxygen_with_itself(capsys: pytest.CaptureFixture[str]) -> None:
    # Duffey, Modern Physical Chemistry: A Molecular Approach, example 3.13, p. 59: O2 at
    # 298.15 K and 100 kPa, r = 1.805 angstrom: sigma 4.094e-19 m2, v_rel 628.13 m/s,
    # n 2.429e25 1/m3, Z_AA 7.588e34 1/(m3 s) with the half. He takes M = 31.998 g/mol, we
    # 31.9988, and older constants: 3e-5 on the speed. Printed to four digits: 1.5e-4.
    found = summary(capsys, "O2", "O2", "--diameter", "O2=3.61 angstrom", "--pressure", "100 kPa")
    assert found["cross_section_m2"] == pytest.approx(4.094e-19, rel=1.5e-4)
    assert found["mean_relative_speed_m_per_s"] == pytest.approx(628.13, rel=5e-5)
    assert found["collision_density_per_m3_s"] == pytest.approx(7.588e34, rel=1.5e-4)
    assert found["like_partners"] is True
    (oxygen,) = found["gases"]
    assert oxygen["number_density_per_m3"] == pytest.approx(2.429e25, rel=2e-4)
    assert oxygen["cas"] == "7782-44-7"


def test_hydrogen_and_iodine(capsys: pytest.CaptureFixture[str]) -> None:
    # Textbook problem of the Ball type with worked answer: H2 + I2 at 700 K, diameters 225 and
    # 559 pm, 167 kJ/mol in exp(-E/RT): 0.273 L/mol/s. With M = 2.01588 and
    # 253.8089 g/mol its formula gives 0.27349239; 2.016 for H2 would make it 0.273484.
    found = summary(capsys, *H2_I2, "--at", "700 K", "--threshold", "167 kJ/mol")
    assert found["k_L_per_mol_s"] == pytest.approx(0.27349239, rel=1e-7)
    assert found["k_L_per_mol_s"] == pytest.approx(0.273, abs=0.0005)
    assert found["like_partners"] is False
    RT = constants.R * 700.0
    assert found["Ea_J_per_mol"] == pytest.approx(167e3 + 0.5 * RT, rel=1e-12)
    assert found["k_m3_per_mol_s"] == pytest.approx(1e-3 * found["k_L_per_mol_s"], rel=1e-12)
    single = 1e3 * found["k_L_per_mol_s"] / constants.N_A
    assert found["k_cm3_per_molecule_s"] == pytest.approx(single, rel=1e-12)


def test_argon_alone(capsys: pytest.CaptureFixture[str]) -> None:
    # UC Davis CHE 107B, Solutions 2 (LibreTexts): Ar, 298 K, 1 atm, d = 3.62 angstrom:
    # 397.419 m/s, 2.46e25 1/m3, mean free path 6.982e-8 m; 6.974e-8 when its own formula is
    # worked out without the rounding of n, hence 1.2e-3 there.
    found = summary(
        capsys, "Ar", "Ar", "--at", "298 K", "--pressure", "1 atm", "--diameter", "Ar=362 pm"
    )
    (argon,) = found["gases"]
    assert argon["mean_speed_m_per_s"] == pytest.approx(397.419, rel=1e-5)
    assert argon["number_density_per_m3"] == pytest.approx(2.46e25, rel=2e-3)
    assert argon["mean_free_path_m"] == pytest.approx(6.982e-8, rel=1.2e-3)
    assert argon["mean_free_path_m"] == pytest.approx(6.9743e-8, rel=1e-5)


def test_the_threshold_that_goes_with_an_activation_energy(
    capsys: pytest.CaptureFixture[str],
) -> None:
    by_slope = summary(capsys, *H2_I2, "--at", "700 K", "--Ea", "167 kJ/mol")
    assert by_slope["E0_J_per_mol"] == pytest.approx(167e3 - 350.0 * constants.R, rel=1e-12)
    assert by_slope["Ea_J_per_mol"] == pytest.approx(167e3, rel=1e-12)
    flat = summary(capsys, *H2_I2, "--at", "700 K", "--Ea", "-2 kJ/mol")
    assert flat["Ea_below_half_RT"] is True
    assert flat["E0_J_per_mol"] == 0
    assert flat["k_L_per_mol_s"] == flat["Z_L_per_mol_s"]
    assert flat["cautions"] == [
        "Ea lies below RT/2, which no threshold along the line of centres can give; "
        "E0 is taken as 0, so k = Z."
    ]


# --- who is like whom


def test_equal_masses_are_not_one_gas(capsys: pytest.CaptureFixture[str]) -> None:
    """Isomers weigh the same to the last digit; Z of the two is twice that of one."""
    same_size = ("--diameter", "propene=4.7 angstrom", "--diameter", "cyclopropane=4.7 angstrom")
    pair = summary(capsys, "propene", "cyclopropane", *same_size)
    alone = summary(capsys, "propene", "propene", *same_size[:2])
    assert pair["like_partners"] is False
    assert alone["like_partners"] is True
    assert pair["mean_relative_speed_m_per_s"] == alone["mean_relative_speed_m_per_s"]
    assert pair["Z_L_per_mol_s"] == pytest.approx(2 * alone["Z_L_per_mol_s"], rel=1e-14)


def test_one_gas_under_two_names_is_one_gas(capsys: pytest.CaptureFixture[str]) -> None:
    twice = summary(capsys, "O2", "O2", "--diameter", "O2=3.61 angstrom")
    names = summary(capsys, "oxygen", "O2", "--diameter", "O2=3.61 angstrom")
    assert names["like_partners"] is True
    assert names["Z_L_per_mol_s"] == twice["Z_L_per_mol_s"]


# --- mixtures and the plane


def test_mixture_in_a_pure_limit(capsys: pytest.CaptureFixture[str]) -> None:
    mixed = summary(capsys, "Ar", "He", "--mole-fraction", "He=0", "--pressure", "1 torr")
    alone = summary(capsys, "Ar", "Ar", "--pressure", "1 torr")
    argon, helium = mixed["gases"]
    assert argon["mole_fraction"] == 1
    assert argon["mean_free_path_m"] == pytest.approx(alone["gases"][0]["mean_free_path_m"])
    assert argon["collisions_with_partner_per_s"] == 0
    assert helium["collisions_with_partner_per_s"] == helium["collisions_with_any_per_s"] > 0
    assert mixed["collision_density_per_m3_s"] == 0


def test_fractions_in_per_cent_of_either_gas(capsys: pytest.CaptureFixture[str]) -> None:
    one = summary(capsys, "Ar", "He", "--mole-fraction", "Ar=30 %")
    other = summary(capsys, "Ar", "He", "--mole-fraction", "He=0.7")
    both = summary(capsys, "Ar", "He", "--mole-fraction", "He=0.7", "--mole-fraction", "Ar=0.3")
    shares = [[gas["mole_fraction"] for gas in found["gases"]] for found in (one, other, both)]
    for found in shares:  # 1 - 0.7 is 0.3 to rounding
        assert found == pytest.approx([0.3, 0.7], rel=1e-15)


def test_discs_on_a_surface_by_hand(capsys: pytest.CaptureFixture[str]) -> None:
    # v_rel = sqrt(pi k T / 2 mu), width d1 + d2, worked out with single molecules.
    found = summary(
        capsys, "CO", "CO", "--plane", "--coverage", "1e12 1/cm^2", "--at", "150 K",
        "--diameter", "CO=3.7 angstrom",
    )  # fmt: skip
    mass = 28.0101e-3 / constants.N_A
    speed = (constants.pi * constants.k * 150.0 / mass) ** 0.5
    width = 7.4e-10
    assert found["swept_width_m"] == pytest.approx(width, rel=1e-13)
    assert found["mean_relative_speed_m_per_s"] == pytest.approx(speed, rel=1e-6)
    density = 0.5 * width * speed * 1e16**2
    assert found["collision_density_per_m2_s"] == pytest.approx(density, rel=1e-6)
    assert found["Z_cm2_per_molecule_s"] == pytest.approx(0.5e4 * width * speed, rel=1e-6)
    (gas,) = found["gases"]
    # 1 / (sqrt(2) n w) with w the swept width
    assert gas["mean_free_path_m"] == pytest.approx(1 / (2**0.5 * 1e16 * width), rel=1e-12)
    for key in ("pressure_Pa", "cross_section_m2", "Z_L_per_mol_s", "collision_density_per_m3_s"):
        assert found[key] is None, key
    bare = summary(capsys, "CO", "CO", "--plane")
    assert bare["coverage_mol_per_m2"] is None
    assert bare["gases"][0]["mean_free_path_m"] is None


# --- what is said


def test_the_answer_comes_first_and_every_number_has_its_source(
    capsys: pytest.CaptureFixture[str],
) -> None:
    assert run(["collide", *H2_I2, "--at", "700 K", "--threshold", "167 kJ/mol"]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert lines[0] == "H₂ + I₂ at 700 K"
    assert lines[2].startswith(
        "Ceiling Z        7.914 × 10¹¹ L/mol/s = 1.314 × 10⁻⁹ cm³/molecule/s"
    )
    assert lines[4].startswith("Rate constant k  0.2735 L/mol/s = 4.541 × 10⁻²² cm³/molecule/s")
    text = "\n".join(lines)
    assert "Unlike partners: no ½; −d[H₂]/dt = −d[I₂]/dt = k [H₂][I₂]." in text
    assert "1 bar  taken, for want of --pressure" in text
    assert "5.59 Å  as given on the command line" in text
    assert "CODATA, as scipy.constants has it" in text


def test_speeds_and_units_on_the_screen(capsys: pytest.CaptureFixture[str]) -> None:
    # Oxygen as in Duffey's example: sigma 0.4094 nm2, n 2.429e19 1/cm3, Z_AA 7.588e34; the
    # speeds from sqrt(8, 3 and 2 k T / (pi) m), worked out here.
    arguments = ["O2", "O2", "--diameter", "O2=3.61 angstrom", "--pressure", "100 kPa"]
    found = summary(capsys, *arguments)
    (gas,) = found["gases"]
    kT, mass = constants.k * 298.15, 31.9988e-3 / constants.N_A
    assert gas["mean_speed_m_per_s"] == pytest.approx((8 * kT / constants.pi / mass) ** 0.5)
    assert gas["root_mean_square_speed_m_per_s"] == pytest.approx((3 * kT / mass) ** 0.5)
    assert gas["most_probable_speed_m_per_s"] == pytest.approx((2 * kT / mass) ** 0.5)
    assert found["reduced_mass_kg"] == pytest.approx(mass / 2)
    assert run(["collide", *arguments]) == 0
    rows = [" ".join(line.split()) for line in capsys.readouterr().out.splitlines()]
    for row in (
        "Mean relative speed 628.1 m/s",
        "Reduced mass 15.999 g/mol 2.657 × 10⁻²⁶ kg",
        "Distance at contact 3.61 Å (d₁ + d₂)/2",
        "Cross-section σ 0.4094 nm² 4.094 × 10⁻¹⁹ m²",
        "Collision density 7.588 × 10³⁴ 1/m³/s 1.260 × 10¹¹ mol/m³/s",
        "Each gas, at 100 kPa",
        "Mean speed 444.2 m/s",
        "Root-mean-square speed 482.1 m/s",
        "Most probable speed 393.6 m/s",
        "Concentration 40.34 mol/m³",
        "Number density 2.429 × 10¹⁹ 1/cm³",
        "Collision frequency 6.247 × 10⁹ 1/s",
        "Mean free path 71.09 nm",
    ):
        assert row in rows, row


def test_sources_of_library_values(capsys: pytest.CaptureFixture[str]) -> None:
    found = summary(capsys, "CH3", "N2")
    radical, nitrogen = found["gases"]
    assert "no value found" in radical["diameter_source"]
    assert nitrogen["diameter_source"].startswith("Poling")
    assert found["T_source"] == "taken, for want of --at"
    assert found["T_K"] == 298.15
    assert found["pressure_Pa"] == 1e5
    assert found["E0_J_per_mol"] is None
    assert found["k_L_per_mol_s"] is None


def test_like_partners_are_told_what_the_half_means(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["collide", "NO2", "NO2", "--threshold", "100 kJ/mol"]) == 0
    text = " ".join(capsys.readouterr().out.split())
    assert (
        "Like partners: Z, k and the collision density carry the ½, so that each encounter "
        "counts once; −d[NO₂]/dt = 2 k [NO₂]²." in text
    )


def test_cautions(capsys: pytest.CaptureFixture[str]) -> None:
    iodine = summary(capsys, "H2", "I2")["cautions"]
    assert iodine == [
        "I₂ would condense: at 298.15 K its vapour pressure is below 50.0 kPa.",
    ]
    dense = summary(capsys, "Ar", "Ar", "--pressure", "100 bar", "--diameter", "Ar=3.4 angstrom")
    # n = 2.43e27 1/m3, times pi/6 (3.4e-10 m)^3 = 2.058e-29 m3: 5.0 %; 5/2 of it is 12.5 %.
    assert dense["cautions"] == [
        "The molecules fill 5 % of the volume: no longer a dilute gas. Encounters are more "
        "frequent than stated, by at least 12 %, and free paths shorter."
    ]
    ion = summary(capsys, "Na+", "Ar", "--diameter", "Na+=2 angstrom")["cautions"]
    assert ion == [
        "Na⁺ is an ion: its charge draws partners in from further than hard spheres touch, "
        "so Z is no ceiling here."
    ]


# --- what is refused


def test_every_problem_in_one_go(capsys: pytest.CaptureFixture[str]) -> None:
    said = refused(
        capsys, "H2", "NOCI", "--at", "300", "--pressure", "0 bar", "--coverage", "1e14 1/cm^2",
        "--threshold", "-4 kJ/mol", "--Ea", "3 m", "--diameter", "h2=4 angstrom",
        "--diameter", "H2 4", "--mole-fraction", "H2=1.5",
    )  # fmt: skip
    assert said == (
        "10 problems\n"
        "  --diameter\n"
        '    found     "h2", no gas of this command\n'
        '    expected  one of "H2", "NOCI" (did you mean "H2"?)\n'
        "  --diameter\n"
        '    found     "H2 4"\n'
        '    expected  GAS=VALUE, such as H2="2.83 angstrom"\n'
        "  GAS\n"
        '    found     "NOCI", which looks like NOCl\n'
        '    expected  NOCl, or formula = "NOCI" or a CAS number stated\n'
        "  --at\n"
        '    found     "300", which has no unit\n'
        '    expected  a temperature such as "480 K"\n'
        "  --pressure\n"
        '    found     "0 bar"\n'
        '    expected  a pressure such as "50 torr", above 0\n'
        "  --coverage\n"
        '    found     "1e14 1/cm^2" without --plane\n'
        "    expected  --plane for molecules on a surface, or --pressure for a gas\n"
        "  --threshold\n"
        '    found     "-4 kJ/mol"\n'
        '    expected  a molar energy such as "102 kJ/mol", at least 0; '
        "a negative Ea goes to --Ea\n"
        "  --Ea\n"
        '    found     "3 m", a length\n'
        '    expected  a molar energy such as "102 kJ/mol"\n'
        "  --Ea\n"
        "    found     --threshold beside it\n"
        "    expected  one of the two: E0 is Ea - RT/2\n"
        "  --mole-fraction\n"
        '    found     "1.5"\n'
        "    expected  a fraction of at most 1\n"
    )


@pytest.mark.parametrize(
    ("arguments", "key", "found", "expected"),
    [
        (
            ["ammonai", "H2"],
            "GAS",
            '"ammonai", which no list has',
            "a gas that is known (perhaps ammonia), or one with --formula ammonai=… and "
            "--cas ammonai=…",
        ),
        (
            ["C3H6", "H2"],
            "GAS",
            "C3H6: 2 compounds are C3H6",
            "--cas C3H6=… with one of: 75-19-4 cyclopropane; 115-07-1 propene; or none",
        ),
        (
            ["H2", "N2", "--cas", "N2=12-12-1"],
            "--cas",
            '"12-12-1"',
            'a CAS number with a right check digit, such as "7732-18-5", or "none"',
        ),
        (
            ["KBr", "Ar"],
            "--diameter",
            "no known diameter of KBr",
            'one, such as --diameter KBr="4.1 angstrom"',
        ),
        (
            ["O2", "oxygen", "--diameter", "O2=3.6 angstrom", "--diameter", "oxygen=3.5 angstrom"],
            "--diameter",
            "3.6 angstrom for O2 and 3.5 angstrom for oxygen",
            "one value: the two are one gas",
        ),
        (
            ["O2", "Ar", "--diameter", "O2=3.6 angstrom", "--diameter", "O2=3.5 angstrom"],
            "--diameter",
            "two values for O2",
            "one",
        ),
        (
            ["H2", "I2", "--plane", "--pressure", "1 bar"],
            "--pressure",
            '"1 bar" with --plane, where there is no pressure',
            '--coverage with a surface concentration such as "1e14 1/cm^2"',
        ),
        (
            ["H2", "I2", "--plane", "--mole-fraction", "H2=0.2"],
            "--mole-fraction",
            '"H2=0.2" without --coverage',
            "both, or none",
        ),
        (
            ["H2", "H2", "--mole-fraction", "H2=0.2"],
            "--mole-fraction",
            '"H2=0.2"',
            "none: the two are one gas, pure",
        ),
        (
            ["H2", "I2", "--mole-fraction", "H2=0.2", "--mole-fraction", "I2=0.7"],
            "--mole-fraction",
            "0.2 and 0.7",
            "two fractions that add up to 1, or one of them",
        ),
        (
            ["Ar", "Ar", "--pressure", "1e5 bar", "--diameter", "Ar=3.4 angstrom"],
            "--pressure",
            "100 000 bar, at which the molecules would need 5 000 % of the volume",
            "a dilute gas, in which molecules fill next to nothing",
        ),
        (
            ["Ar", "Ar", "--at", "1e-3 K", "--diameter", "Ar=3.4 angstrom"],
            "--pressure",
            "1 bar (taken, for want of --pressure), at which the molecules would need "
            "14 900 % of the volume",
            "a dilute gas, in which molecules fill next to nothing",
        ),
        (
            ["CO", "CO", "--plane", "--coverage", "1e15 1/cm^2"],
            "--coverage",
            "1 × 10¹⁵ molecule/cm², at which the molecules would need 107 % of the surface",
            "a dilute gas, in which molecules fill next to nothing",
        ),
        (["H2"], "meanfree collide", "no GAS", "meanfree collide GAS GAS"),
        (
            ["H2", "I2", "O2"],
            "meanfree collide",
            "too many arguments: O2",
            'what "meanfree collide --help" lists',
        ),
        (
            ["H2", "I2", "--treshold", "3 kJ/mol"],
            "meanfree collide",
            "an unknown option --treshold",
            'what "meanfree collide --help" lists (did you mean "--threshold"?)',
        ),
    ],
)
def test_wrong_usage(
    capsys: pytest.CaptureFixture[str], arguments: list[str], key: str, found: str, expected: str
) -> None:
    said = refused(capsys, *arguments)
    assert said == f"1 problem\n  {key}\n    found     {found}\n    expected  {expected}\n"


def test_problems_for_a_program(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["collide", "H2", "I2", "--at", "300", "--json"]) == 2
    assert json.loads(capsys.readouterr().out) == {
        "errors": [
            {
                "file": "",
                "key": "--at",
                "found": '"300", which has no unit',
                "expected": 'a temperature such as "480 K"',
            }
        ]
    }


# --- what is left


def test_the_folder_and_how_to_repeat_it(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    folder = tmp_path / "pair"
    asked = [*H2_I2, "--at", "700 K", "--threshold", "167 kJ/mol"]
    assert run(["collide", *asked, "--out", str(folder), "--quiet"]) == 0
    names = ["report.html", "summary.json", "arrhenius.png", "arrhenius.svg", "manifest.json"]
    assert capsys.readouterr().out.splitlines() == [str(folder / name) for name in names]
    assert sorted(path.name for path in folder.iterdir()) == sorted(names)
    page = (folder / "report.html").read_text(encoding="utf-8")
    for part in ("0.2735 L/mol/s", "<svg", "Unlike partners", "5.59 Å", "CODATA"):
        assert part in page, part
    assert "http://" not in page.replace("http://www.w3.org/", "")
    stored = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    assert stored["schema"] == "meanfree-collide-1"
    manifest = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    words = shlex.split(manifest["command"])
    assert words[:2] == ["meanfree", "collide"]
    again = summary(capsys, *words[2:])
    # The default of the pressure is written out, so that its source changes, and nothing else.
    assert again.pop("pressure_source") == "as given on the command line"
    assert stored.pop("pressure_source") == "taken, for want of --pressure"
    assert again == stored


def test_without_out_nothing_is_written(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert run(["collide", "H2", "I2"]) == 0
    assert run(["collide", "H2", "I2", "--quiet"]) == 0
    assert list(tmp_path.iterdir()) == []
    assert capsys.readouterr().err == ""


def test_another_pair_needs_replace(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    folder = tmp_path / "pair"
    assert run(["collide", "H2", "I2", "--out", str(folder), "--quiet"]) == 0
    assert run(["collide", "H2", "I2", "--at", "500 K", "--out", str(folder), "--quiet"]) == 0
    capsys.readouterr()
    assert refused(capsys, "CO", "CO", "--out", str(folder)) == (
        "1 problem\n"
        "  --out\n"
        f"    found     {folder}, which holds the results of collide H2 I2, not of collide CO CO\n"
        "    expected  --replace to give those up, or another folder named with --out\n"
    )
    assert run(["collide", "CO", "CO", "--out", str(folder), "--replace", "--quiet"]) == 0


@pytest.mark.parametrize(
    "extra",
    [
        ["--threshold", "1e5 kJ/mol"],  # exp(-E0/RT) is zero to a computer
        ["--threshold", "500 kJ/mol", "--at", "60 K", "--pressure", "1e-6 torr"],
        ["--at", "1e6 K"],
        ["--at", "1 K", "--pressure", "1e-9 torr"],
        ["--plane", "--threshold", "0 kJ/mol"],
    ],
)
def test_figures_of_extremes(tmp_path: Path, extra: list[str]) -> None:
    """Warnings are errors here: a logarithm of nothing or labels without room would show."""
    folder = tmp_path / "pair"
    assert run(["collide", "H2", "I2", *extra, "--out", str(folder), "--quiet"]) == 0
    assert (folder / "arrhenius.png").stat().st_size > 5000


def test_what_is_loaded() -> None:
    """Pinned gases need no large table; the figure, and matplotlib, only come with --out."""
    slow = ["sympy", "pandas", "numba", "chemicals", "matplotlib", "scipy.integrate"]
    if find_spec("dask") is None:  # pint looks at dask where that is installed, and dask at jinja2
        slow.append("jinja2")
    code = (
        "import sys\nfrom meanfree.cli.app import run\n"
        "status = run(['collide', 'H2', 'I2', '--threshold', '167 kJ/mol'])\n"
        f"print(status, [m for m in {slow!r} if m in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stderr.strip() == "0 []"
