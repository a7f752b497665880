"""Every rate law as a case file writes it: the numbers that come out, and what is refused."""

from __future__ import annotations

import json
import math
from pathlib import Path

import pytest
from scipy import constants
from scipy.constants import N_A, R
from small_cases import load_text

from meanfree.case.json_schema import case_schema
from meanfree.case.laws.registry import LAW_SHAPES
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs, with_inputs
from meanfree.integrate.single import integrate
from meanfree.rates.registry import LAWS

HEAD = """title = "One step"
{labels}
[vessel]
holds = "volume"
volume = "1 L"
{vessel}
[temperature]
mode = "isothermal"
value = "{T} K"

[fill]
gases = {{ {fill} }}

[run]
until = "1 s"

[[steps]]
name = "s"
reaction = "{reaction}"
"""


def case(
    folder: Path, reaction: str, law: str, fill: str, T: float = 300, **more: str
) -> Experiment:
    head = {"labels": "", "vessel": "", **more}
    text = HEAD.format(reaction=reaction, fill=fill, T=T, **head) + law
    return load_text(folder, text).experiment


def k_of(experiment: Experiment, T: float = 300.0, p: float = 1e5, M: float = 1.0) -> float:
    step = experiment.steps[0]
    return float(step.law.rate_constant(experiment.context(step), T, p, M))


def refused(folder: Path, reaction: str, law: str, fill: str, **more: str) -> list[str]:
    with pytest.raises(InputError) as error:
        case(folder, reaction, law, fill, **more)
    return [f"{p.key}: found {p.found}; expected {p.expected}" for p in error.value.problems]


NOCL = 'NOCl = "50 torr"'
CM3, CM6 = 1e-6 * N_A, 1e-12 * N_A**2
TABLE = 'law = "table"\npoints = [["290 K", "2e3 L/mol/s"], ["330 K", "6e3 L/mol/s"]]\n'


def test_a_table_is_read_with_its_counting(tmp_path: Path) -> None:
    """ln k linear in 1/T between 1e0 and 3e0 m^3/mol/s: half of 2e3 and 6e3 L, loss of two."""
    read = case(tmp_path, "2 NOCl -> 2 NO + Cl2", TABLE + 'k_counts = "loss of NOCl"\n', NOCL)
    share = (1 / 290 - 1 / 300) / (1 / 290 - 1 / 330)
    assert k_of(read) == pytest.approx(3**share, rel=1e-12)
    assert inputs(read)["steps.s.points.1.k"].value == pytest.approx(6e3, rel=1e-12)
    changed = with_inputs(read, {"steps.s.points.1.k": 12e3})
    assert k_of(changed) == pytest.approx(6**share, rel=1e-12)


def test_a_run_outside_a_table_is_refused(tmp_path: Path) -> None:
    assert refused(tmp_path, "2 NOCl -> 2 NO + Cl2", TABLE, NOCL, T="400") == [  # type: ignore[arg-type]
        "steps.s.points: found a run at 400 K; expected a run within 290 to 330 K, or "
        "extrapolate = true"
    ]
    allowed = case(tmp_path, "2 NOCl -> 2 NO + Cl2", TABLE + "extrapolate = true\n", NOCL, T=400)
    assert allowed.notes == (
        "steps.s: the table of k covers 290 to 330 K and the run 400 K: outside it the outer "
        "Arrhenius lines are continued.",
    )


def test_a_cross_section_by_points(tmp_path: Path) -> None:
    """Constant from zero energy on: N_A sigma v, the collision rate constant."""
    law = """law = "cross-section"
shape = "points"
points = [["0 kJ/mol", "0.2 nm^2"], ["50 kJ/mol", "0.2 nm^2"]]
beyond = "constant"
"""
    read = case(tmp_path, "H + Cl2 -> HCl + Cl", law, 'H = "1 Pa", Cl2 = "1 torr"')
    m1, m2 = (float(read.gas_named[g].molar_mass) for g in ("H", "Cl2"))  # type: ignore[arg-type]
    speed = math.sqrt(8 * R * 300 * (m1 + m2) / (math.pi * m1 * m2))
    assert k_of(read) == pytest.approx(N_A * 0.2e-18 * speed, rel=1e-12)
    assert "steps.s.points.0.cross_section" in inputs(read)


def test_cross_sections_that_mix_shapes_are_refused(tmp_path: Path) -> None:
    law = 'law = "cross-section"\nshape = "points"\nthreshold = "1 kJ/mol"\npoints = []\n'
    assert refused(tmp_path, "H + Cl2 -> HCl + Cl", law, 'H = "1 Pa", Cl2 = "1 torr"') == [
        'steps.s.threshold: found threshold with shape = "points"; expected what this shape takes, '
        "or another shape"
    ]


def test_an_ion_with_a_dipole(tmp_path: Path) -> None:
    """Langevin's coefficient: 2.342e-9 cm^3/s sqrt(alpha/mu), at Ar+ and H2 1.50e-9."""
    law = """law = "capture"
attraction = "ion and induced dipole"
polarisability = { H2 = "0.787 angstrom^3" }
"""
    read = case(tmp_path, "Ar+ + H2 -> ArH+ + H", law, '"Ar+" = "1e8 1/cm^3", H2 = "1 torr"',
                vessel='shape = { form = "sphere" }\n')  # fmt: skip
    assert k_of(read) / CM3 == pytest.approx(1.50e-9, abs=0.005e-9)


def test_a_harpoon(tmp_path: Path) -> None:
    law = """law = "capture"
attraction = "electron jump"
ionisation_energy = { K = "420 kJ/mol" }
electron_affinity = { Br2 = "250 kJ/mol" }
"""
    read = case(tmp_path, "K + Br2 -> KBr + Br", law, 'K = "1 Pa", Br2 = "1 Pa"')
    e, eps0 = constants.e, constants.epsilon_0
    jump = e**2 * N_A / (4 * math.pi * eps0 * 170e3)
    m1, m2 = (float(read.gas_named[g].molar_mass) for g in ("K", "Br2"))  # type: ignore[arg-type]
    speed = math.sqrt(8 * R * 300 * (m1 + m2) / (math.pi * m1 * m2))
    assert k_of(read) == pytest.approx(N_A * math.pi * jump**2 * speed, rel=1e-9)
    assert inputs(read)["steps.s.ionisation_energy.K"].value == pytest.approx(420)


FALLOFF = """law = "falloff"
k0 = { A = "2.8e-30 cm^6/s", n = -3.5, T_ref = "300 K" }
kinf = { A = "1.66e-12 cm^3/s", n = -0.2, T_ref = "300 K" }
broadening = "width from Fc"
Fc = { rising = [[2.5, "1950 K"]], falling = [[0.9, "430 K"]] }
partners = { Ar = 0.5 }
"""
ASSOCIATION = "NO3 + NO2 + M -> N2O5 + M"
MIXED = 'NO3 = "1 Pa", NO2 = "1 Pa", Ar = "1000 Pa", N2 = "1000 Pa"'


def test_falloff(tmp_path: Path) -> None:
    """NO3 + NO2: 1.2e-12 cm^3/s at 298 K and 1 bar, as in the test of the law; and its bath."""
    read = case(tmp_path, ASSOCIATION, FALLOFF, MIXED, T=298)
    M = 1e5 / (R * 298)
    assert k_of(read, 298.0, M=M) / CM3 == pytest.approx(1.23280530e-12, rel=1e-7)
    assert read.steps[0].bath is not None
    assert [read.steps[0].bath.efficiency(gas) for gas in ("Ar", "N2")] == [0.5, 1.0]
    addresses = inputs(read)
    assert addresses["steps.s.k0.A"].value == pytest.approx(2.8e-30, rel=1e-12)
    assert addresses["steps.s.Fc.terms.1.weight"].value == 2.5
    tenfold = with_inputs(read, {"steps.s.k0.A": 2.8e-29})
    assert tenfold.steps[0].law.k0.A.value == pytest.approx(2.8e-29 * CM6)  # type: ignore[attr-defined]


def test_strong_collisions(tmp_path: Path) -> None:
    """k0 written out; cyclopropane with itself, Z without the half."""
    law = """law = "falloff"
k0 = { threshold = "274 kJ/mol", oscillators = 12.5, partner = "Ar", diameter = "4 angstrom" }
kinf = { A = "1.6e15 1/s", Ea = "274 kJ/mol" }
broadening = "none"
"""
    more = {"labels": ""}
    read = case(
        tmp_path, "N2O5 + M -> NO2 + NO3 + M", law, 'N2O5 = "1 Pa", Ar = "1 bar"', T=800, **more
    )
    m1, m2 = (float(read.gas_named[g].molar_mass) for g in ("N2O5", "Ar"))  # type: ignore[arg-type]
    Z = N_A * math.pi * 16e-20 * math.sqrt(8 * R * 800 * (m1 + m2) / (math.pi * m1 * m2))
    reduced = 274e3 / (R * 800)
    k0 = Z * reduced**11.5 / math.gamma(12.5) * math.exp(-reduced)
    # M so small that the high-pressure limit is out of sight
    assert k_of(read, 800.0, M=1e-9) == pytest.approx(1e-9 * k0, rel=1e-6)
    assert read.notes == (
        "steps.s: k0 is estimated from 12.5 classical oscillators that every collision with Ar "
        "empties with probability 1: good to an order of magnitude at best.",
    )


def test_wrong_falloffs_are_refused(tmp_path: Path) -> None:
    wrong = FALLOFF.replace("2.8e-30 cm^6/s", "2.8e-30 cm^3/s").replace("[[2.5", '[["x"')
    assert refused(tmp_path, ASSOCIATION, wrong, MIXED) == [
        'steps.s.k0.A: found "2.8e-30 cm^3/s", whose unit is cm^3/s; expected a '
        'rate constant of order 3 such as "1e3 L^2/mol^2/s"',
        'steps.s.Fc.rising.0.0: found "x", which does not begin with a number; expected a number '
        "of at least -10 and at most 10",
    ]
    thin = FALLOFF.replace('{ rising = [[2.5, "1950 K"]], falling = [[0.9, "430 K"]] }', "0.05")
    assert refused(tmp_path, ASSOCIATION, thin, MIXED) == [
        "steps.s.Fc: found Fc = 0.05 at 300 K; expected 0.1 to 1 wherever the run goes: the "
        "broadened form holds there"
    ]


def test_termolecular(tmp_path: Path) -> None:
    law = 'law = "termolecular"\nA = "6e-34 cm^6/s"\nn = -2.4\nT_ref = "300 K"\n'
    read = case(tmp_path, "O + O2 + M -> O3 + M", law, 'O = "1 Pa", O2 = "1 bar"', T=250)
    assert k_of(read, 250.0) == pytest.approx(6e-34 * CM6 * (250 / 300) ** -2.4, rel=1e-12)
    with_two = refused(
        tmp_path, "O + O2 -> O3", law.replace("cm^6", "cm^3"), 'O = "1 Pa", O2 = "1 Pa"'
    )
    assert with_two == [
        "steps.s.reaction: found 2 bodies on the left; expected three, such as H + O2 + M or "
        "2 NO + O2"
    ]


WALL = 'law = "wall"\nuptake = 0.02\n'
SPHERE = {"vessel": 'shape = { form = "sphere" }\n'}


def test_wall(tmp_path: Path) -> None:
    """At 1 mPa the path is longer than the vessel: gamma v S/(4 V), S/V = 3/r of one litre."""
    read = case(tmp_path, "H -> 0.5 H2", WALL, 'H = "1e-3 Pa"', **SPHERE)
    r = math.cbrt(3e-3 / (4 * math.pi))
    speed = math.sqrt(8 * R * 300 / (math.pi * 1.008e-3))
    assert k_of(read) == pytest.approx(0.02 * speed * 3 / (4 * r), rel=1e-4)  # mass to four digits
    assert read.notes[0] == "steps.s: wall loss of H: γ v S/(4 V), with no hindrance by diffusion."
    dense = case(tmp_path, "H -> 0.5 H2", WALL, 'H = "1 Pa", Ar = "1 bar"', **SPHERE)
    assert dense.notes[0] == (
        "steps.s: wall loss of H: the slowest mode of diffusion with uptake, exactly."
    )
    assert k_of(dense) < 0.1 * k_of(read)


def test_a_wall_without_a_vessel_or_with_a_reverse(tmp_path: Path) -> None:
    assert refused(tmp_path, "H -> 0.5 H2", WALL, 'H = "1 Pa"') == [
        "steps.s.area: found nothing; expected an area here, or a shape under [vessel]"
    ]
    law = WALL + 'reverse = { K = 2, at = "300 K" }\nk_counts = "loss of H"\n'
    found = refused(tmp_path, "H -> 0.5 H2", law, 'H = "1 Pa"', **SPHERE)
    assert found[:2] == [
        'steps.s.k_counts: found "loss of H" with a rate constant that is computed; expected '
        '"events", or no k_counts: each collision is one event',
        "steps.s.reverse: found a reverse of a loss on the wall; expected no reverse: it has no "
        "detailed balance",
    ]


def test_a_share_may_be_written_in_per_cent(tmp_path: Path) -> None:
    """As a fraction of the fill may: uptake of 2 % is 0.02, a sample of 10 % leaves 0.9."""
    wall = 'law = "wall"\nuptake = {}\nform = "uptake only"\n'
    shares = [
        k_of(case(tmp_path, "H -> 0.5 H2", wall.format(uptake), 'H = "1 Pa"', **SPHERE))
        for uptake in ('"2 %"', "0.02")
    ]
    assert shares[0] == shares[1]
    law = 'law = "fixed"\nk = "0 1/s"\n[[samples]]\nat = "0.5 s"\nfraction = "10 %"\n'
    run = integrate(case(tmp_path, "O3 ->", law, 'O3 = "1 Pa"'))
    assert run.amounts(1.0)[0, 0] / run.amounts(0.0)[0, 0] == pytest.approx(0.9, rel=1e-12)
    refusal = refused(tmp_path, "O3 ->", law.replace("10 %", "110 %"), 'O3 = "1 Pa"')
    assert refusal == ['samples.0.fraction: found "110 %"; expected a number above 0 and at most 1']


def test_light_by_the_clock(tmp_path: Path) -> None:
    """Lit from 0.2 to 0.5 s of one second: exp(-0.3 J)."""
    law = 'law = "photolysis"\nJ = "2 1/s"\non = ["200 ms"]\noff = ["0.5 s"]\nphoton = "365 nm"\n'
    read = case(tmp_path, "NO2 -> NO + O", law, 'NO2 = "1 torr"')
    run = integrate(read)
    assert run.remaining("NO2", 1.0)[0] == pytest.approx(math.exp(-0.6), rel=1e-7)
    assert inputs(read)["steps.s.on.0"].value == pytest.approx(200)


def test_sources_and_losses_have_an_empty_side(tmp_path: Path) -> None:
    law = 'law = "source"\nrate = "1e-3 mol/L/s"\n'
    read = case(tmp_path, "-> O3", law, 'O2 = "1 bar"')
    run = integrate(read)
    assert run.concentrations(1.0)[run.index("O3"), 0] == pytest.approx(1.0, rel=1e-9)
    lost = case(tmp_path, "O3 ->", 'law = "fixed"\nk = "2 1/s"\n', 'O3 = "1 Pa"')
    assert integrate(lost).remaining("O3", 1.0)[0] == pytest.approx(math.exp(-2), rel=1e-7)
    assert refused(tmp_path, "O2 -> O3", law, 'O2 = "1 bar"') == [
        'steps.s.reaction: found "O2 -> O3" (O: 2 on the left, 3 on the right); expected the same '
        "atoms and charge on both sides",
        'steps.s.rate: found "1e-3 mol/L/s", whose unit is mol/L/s; expected a rate constant '
        'of order 1 such as "1e-3 1/s"',
    ]


def test_every_law_has_a_shape_and_the_schema_holds_them_all() -> None:
    assert set(LAW_SHAPES) == set(LAWS)
    text = json.dumps(case_schema())
    for word in LAWS:
        assert f'"const": "{word}"' in text


SAMPLED = """law = "fixed"
k = "1 1/s"

[[samples]]
at = "0.5 s"
fraction = 0.25

[[samples]]
at = "0.2 s"
volume = "100 mL"
"""


def test_samples_are_drawn_in_their_order(tmp_path: Path) -> None:
    read = case(tmp_path, "N2O4 -> 2 NO2", SAMPLED, 'N2O4 = "1 torr"')
    run = integrate(read)
    assert run.retained([0.1, 0.3, 0.9]) == pytest.approx([1, 0.9, 0.675], rel=1e-14)
    assert run.conversion("N2O4", 1.0)[0] == pytest.approx(1 - math.exp(-1), rel=1e-7)
    assert inputs(read)["samples.0.volume"].value == 100
    assert with_inputs(read, {"samples.1.fraction": 0.5}).samples[1].fraction is not None


def test_wrong_samples_are_refused(tmp_path: Path) -> None:
    wrong = SAMPLED.replace("fraction = 0.25", "").replace("100 mL", "1 L").replace("0.2 s", "0 s")
    assert refused(tmp_path, "N2O4 -> 2 NO2", wrong, 'N2O4 = "1 torr"') == [
        'samples.0: found nothing drawn; expected fraction = 0.05, or volume = "5 mL"',
        "samples.1.at: found a time of 0; expected a time above 0 s: before it is the fill",
        "samples.1.volume: found 1 L, but the vessel has 1 L; expected less than the vessel",
    ]


LEAKY = """law = "fixed"
k = "1 1/s"

[[flows]]
kind = "effusion"
hole = "20 mm^2"
transmission = 0.5

[[flows]]
kind = "leak-up"
rise = "1 torr/s"
entering = { N2 = 0.79, O2 = 0.21 }
"""


def test_flows_are_read_and_no_conversion(tmp_path: Path) -> None:
    """Argon leaves by A tau v/(4 V); nitrogen comes in by 0.79 torr/s and leaves as it can."""
    read = case(tmp_path, "N2O4 -> 2 NO2", LEAKY, 'N2O4 = "1 torr", Ar = "1 torr"')
    run = integrate(read)
    mass = float(read.gas_named["Ar"].molar_mass)  # type: ignore[arg-type]
    k_out = 20e-6 * 0.5 * math.sqrt(8 * R * 300 / (math.pi * mass)) / 4e-3
    left = run.amounts(1.0)[run.index("Ar"), 0] / read.moles["Ar"]
    assert left == pytest.approx(math.exp(-k_out), rel=1e-7)
    assert run.conversion("N2O4", 1.0)[0] == pytest.approx(1 - math.exp(-1), rel=1e-6)
    assert 0 < run.partial_pressures(1.0)[run.index("N2"), 0] < 0.79 * constants.torr
    assert inputs(read)["flows.1.rise"].value == 1


def test_wrong_flows_are_refused(tmp_path: Path) -> None:
    wrong = LEAKY.replace('hole = "20 mm^2"', 'rate = "1 1/s"').replace("0.21", "0.3")
    assert refused(tmp_path, "N2O4 -> 2 NO2", wrong, 'N2O4 = "1 torr"') == [
        'flows.0.hole: found nothing, with kind = "effusion"; expected hole = "100 um^2"',
        'flows.0.rate: found rate with kind = "effusion"; expected only hole, or another kind',
        "flows.1.entering: found fractions that add up to 1.09; expected fractions that add up "
        "to 1",
    ]
