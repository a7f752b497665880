"""Each limit against its own formula by hand, and what it says in cases that break it."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from scipy.special import jn_zeros
from small_cases import edited, load_text
from validation import Checked

from meanfree.gases.identity import find_gas
from meanfree.integrate.single import integrate
from meanfree.planning.limits import Limit, Survey, Verdict, survey
from meanfree.planning.limits.limit import judged
from meanfree.planning.limits.motion import SHARE_OF_LOSS, wall_shares
from meanfree.planning.limits.vessel import second_virial
from meanfree.planning.mixture import FIRST_ZERO, Mixture
from meanfree.planning.own_time import own_time

CASE = """title = "Nitrosyl chloride"

[vessel]
holds = "volume"
volume = "1.8 L"
rated_pressure = "2 bar"
shape = { form = "sphere" }

[temperature]
mode = "isothermal"
value = "480 K"

[fill]
gases = { NOCl = "50 torr", Ar = "135 torr" }
at = "296 K"

[[steps]]
name = "decomposition"
reaction = "2 NOCl -> 2 NO + Cl2"
law = "arrhenius"
A = "9.4e9 L/mol/s"
Ea = "102 kJ/mol"

[plan]
warm_up = "4 min"
narrowest = "4 mm"
conductance = "0.09 W/K"
detection = { NOCl = "0.5 torr", Cl2 = "30 torr" }
"""

BURNING = """title = "Hydrogen and oxygen with iodine"

[vessel]
holds = "volume"
volume = "2 L"
rated_pressure = "1 bar"
dead_space = { volume = "50 mL", temperature = "293 K" }

[temperature]
mode = "isothermal"
value = "900 K"

[fill]
gases = { H2 = "300 torr", O2 = "300 torr", I2 = "20 torr" }

[[steps]]
name = "slow"
reaction = "H2 + I2 -> 2 HI"
law = "arrhenius"
A = "1e11 L/mol/s"
Ea = "170 kJ/mol"
"""


def surveyed(folder: Path, text: str) -> Survey:
    case = load_text(folder, text)
    return survey(integrate(case.experiment), case.planning)


@pytest.fixture(scope="module")
def found(tmp_path_factory: pytest.TempPathFactory) -> Survey:
    return surveyed(tmp_path_factory.mktemp("limits"), CASE)


def limit(found: Survey, key: str) -> Limit:
    return next(entry for entry in found.limits if entry.key == key)


def test_the_gravest_come_first(found: Survey) -> None:
    ranks = [entry.verdict.rank for entry in found.limits]
    assert ranks == sorted(ranks)
    assert limit(found, "detection.Cl2").verdict is Verdict.BEYOND


def test_every_limit_has_a_sentence_and_a_source_or_a_reason(found: Survey) -> None:
    for entry in found.limits:
        assert entry.meaning.endswith(".")
        assert entry.source or entry.verdict is Verdict.UNKNOWN
        assert entry.value is not None or entry.verdict is Verdict.UNKNOWN


def test_mixing_time_of_a_sphere(found: Survey) -> None:
    mixture = Mixture(found.run.experiment)
    radius = math.cbrt(0.75 * 1.8e-3 / math.pi)
    D = {m.gas: m.diffusion for m in mixture.molecules}
    own = own_time(found.run)
    assert own is not None
    assert own.words == "half-life"
    # Lambda = r/pi; the slower of the two filled gases
    by_hand = (radius / math.pi) ** 2 / min(D["NOCl"], D["Ar"]) / own.seconds
    assert limit(found, "mixing").value == pytest.approx(by_hand, rel=1e-12)


def test_second_order_half_life_is_the_own_time(found: Survey) -> None:
    own = own_time(found.run)
    assert own is not None
    c0 = 50 * 101325 / 760 / (8.31446261815324 * 296.0)
    k = 9.4e6 * math.exp(-102e3 / (8.31446261815324 * 480.0))
    assert own.seconds == pytest.approx(1 / (2 * k * c0), rel=1e-7)  # rtol of the run is 1e-8
    assert limit(found, "warm_up").value == pytest.approx(240.0 * 2 * k * c0, rel=1e-7)


def test_first_zero_of_the_bessel_function() -> None:
    assert pytest.approx(jn_zeros(0, 1)[0], rel=1e-14) == FIRST_ZERO


def test_long_cylinder_and_flat_one(tmp_path: Path) -> None:
    long = 'shape = { form = "cylinder", diameter = "2 cm", length = "573 cm" }'
    flat = 'shape = { form = "cylinder", diameter = "200 cm", length = "0.0573 cm" }'
    sphere = 'shape = { form = "sphere" }'
    r, L = 0.01, 5.73e-4
    for text, wanted in ((long, (r / 2.404826) ** 2), (flat, (L / math.pi) ** 2)):
        case = load_text(tmp_path, edited(CASE, [(sphere, text)]))
        found = Mixture(case.experiment).diffusion_length_squared
        # The other direction adds less than 1e-5 of it.
        assert found == pytest.approx(wanted, rel=2e-5)


def test_knudsen_number_over_the_stated_width(found: Survey) -> None:
    longest = max(m.free_path for m in Mixture(found.run.experiment).molecules)
    assert limit(found, "knudsen").value == pytest.approx(longest / 4e-3, rel=1e-12)


def test_uptake_that_does_not_matter_gives_back_its_share(found: Survey) -> None:
    """1/k_w = Lambda^2/D + 2 V (2 - g)/(g v S) at that uptake is 1 % of ln 2/t_half."""
    own = own_time(found.run)
    assert own is not None
    mixture = Mixture(found.run.experiment)
    for share in wall_shares(mixture, own):
        g, m = share.harmless, share.molecule
        assert g is not None
        assert 0 < g < 1
        surface = 4 * math.pi * mixture.radius**2
        resistance = 2 * mixture.volume * (2 - g) / (g * m.speed * surface)
        k_w = 1 / (mixture.diffusion_length_squared / m.diffusion + resistance)
        assert k_w == pytest.approx(SHARE_OF_LOSS * math.log(2) / own.seconds, rel=1e-9)


def test_semenov_is_zero_for_what_takes_up_heat(found: Survey) -> None:
    assert limit(found, "semenov").value == 0.0
    assert limit(found, "frank_kamenetskii").value is not None
    assert limit(found, "frank_kamenetskii").value < 0  # type: ignore[operator]


def test_pressure_by_hand(found: Survey) -> None:
    # 185 torr at 296 K, at 480 K and 2 -> 3 with all of NOCl gone but 0.1 %
    final = (185 + 0.5 * 50 * 0.999) * 101325 / 760 * 480 / 296
    assert limit(found, "pressure").value == pytest.approx(final / 2e5, rel=1e-6)


@pytest.mark.parametrize(
    ("name", "T", "measured"),
    # Dymond and Smith, The Virial Coefficients of Pure Gases and Mixtures (1980), in cm^3/mol
    # (from memory): what a form without the acentric factor gives is off by up to about 10.
    [("N2", 300.0, -4.5), ("Ar", 300.0, -15.5), ("CH4", 300.0, -42.0), ("CO2", 300.0, -122.0)],
)
def test_second_virial_coefficients(name: str, T: float, measured: float, checked: Checked) -> None:
    from meanfree.gases.critical import critical_point

    point = critical_point(find_gas(name))
    assert point is not None
    B = second_virial(T, point[0].value, point[1].value) * 1e6
    source = "Dymond and Smith (1980) (from memory)"
    checked(
        f"second virial coefficient of {name}", B, f"{measured}", "cm³/mol", source, within=10.0
    )


def test_fire_condensation_and_pressure_are_called_out(tmp_path: Path) -> None:
    found = surveyed(tmp_path, BURNING)
    assert limit(found, "flammability.H2").verdict is Verdict.BEYOND
    assert limit(found, "autoignition.H2").verdict is Verdict.BEYOND
    condensing = limit(found, "condensation.I2")
    assert condensing.verdict is Verdict.BEYOND
    assert "in the dead space" in condensing.meaning
    # I2 at 293 K: 27 to 28 Pa (CRC Handbook: 0.2 torr near 20 degC; from memory)
    vapour = next(fact.value for fact in condensing.facts if fact.name == "vapour pressure")
    assert 22 < vapour < 33
    assert limit(found, "pressure").verdict is Verdict.WITHIN
    assert limit(found, "warm_up").verdict is Verdict.UNKNOWN
    assert limit(found, "semenov").verdict is Verdict.UNKNOWN


def test_too_much_pressure_is_beyond(tmp_path: Path) -> None:
    found = surveyed(tmp_path, edited(CASE, [('"2 bar"', '"40 kPa"')]))
    assert limit(found, "pressure").verdict is Verdict.BEYOND
    near = surveyed(tmp_path, edited(CASE, [('"2 bar"', '"46 kPa"')]))
    assert limit(near, "pressure").verdict is Verdict.CAUTION


def test_labels_are_not_known_and_say_so(tmp_path: Path) -> None:
    text = 'labels = ["A", "B"]\n' + edited(
        CASE,
        [
            ('NOCl = "50 torr"', 'A = "50 torr"'),
            ("2 NOCl -> 2 NO + Cl2", "2 A -> B"),
            ('detection = { NOCl = "0.5 torr", Cl2 = "30 torr" }', ""),
        ],
    )
    found = surveyed(tmp_path, text)
    for key in ("mixing", "knudsen", "walls", "adiabatic_rise", "frank_kamenetskii"):
        assert limit(found, key).verdict is Verdict.UNKNOWN
    assert limit(found, "mixing").meaning == "A mass or a diameter of A is not known."


@pytest.mark.parametrize(
    ("value", "guideline", "above", "verdict"),
    [
        (0.01, 0.1, False, Verdict.WITHIN),
        (0.05, 0.1, False, Verdict.CAUTION),
        (0.2, 0.1, False, Verdict.BEYOND),
        (0.2, 0.1, True, Verdict.CAUTION),
        (2.0, 0.1, True, Verdict.WITHIN),
        (0.05, 0.1, True, Verdict.BEYOND),
    ],
)
def test_verdicts(value: float, guideline: float, above: bool, verdict: Verdict) -> None:
    assert judged(value, guideline, above=above) is verdict


def test_adiabatic_case_wants_slow_conduction(tmp_path: Path) -> None:
    case = load_text(
        tmp_path, (Path(__file__).parents[2] / "cases/cyclopropane-adiabatic.toml").read_text()
    )
    found = survey(integrate(case.experiment), case.planning)
    conduction = limit(found, "conduction")
    assert conduction.above
    assert conduction.verdict is Verdict.WITHIN
    assert not any(entry.key == "frank_kamenetskii" for entry in found.limits)
    rise = limit(found, "adiabatic_rise").value
    assert rise == pytest.approx(np.ptp(found.run.temperature([0.0, found.run.end])), rel=1e-6)
