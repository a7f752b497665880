"""Thermochemistry: its own consistency, and what it gives against published values."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.integrate import quad
from validation import Checked

from meanfree.errors import InputError
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.gas import Gas
from meanfree.gases.identity import find_gas
from meanfree.gases.pinned import pinned_gases, pinned_heat_capacity
from meanfree.gases.thermochemistry import Array, Thermochemistry, build, from_values
from meanfree.sourced import Sourced


def of(name: str, lowest: float | None = None, highest: float | None = None) -> Thermochemistry:
    found = thermochemistry_of(find_gas(name), lowest, highest)
    assert found is not None
    return found


WITH_ENERGIES = [gas.name for gas in pinned_gases() if thermochemistry_of(find_gas(gas.name))]


@pytest.mark.parametrize("name", ["H2", "Ar", "I2", "N2O4", "SF6", "ICl", "CH4", "CN"])
def test_h_and_s_are_the_integrals_of_cp(name: str) -> None:
    """Against adaptive quadrature of the Cp series, done to 1e-12 of the integral."""
    gas = of(name)
    for temperature in (gas.low, 250.0, 400.0, 0.7 * gas.high, gas.high):
        if temperature < gas.low:
            continue
        h, _ = quad(
            lambda t: float(gas.heat_capacity(t)),
            298.15,
            temperature,
            epsabs=0,
            epsrel=1e-12,
            limit=400,
        )
        s, _ = quad(
            lambda t: float(gas.heat_capacity(t)) / t,
            298.15,
            temperature,
            epsabs=0,
            epsrel=1e-12,
            limit=400,
        )
        # H carries the enthalpy of formation, whose last bit is 1e-10 J/mol at 1e6 J/mol.
        assert gas.enthalpy(temperature) - gas.enthalpy_298.value == pytest.approx(
            h, rel=1e-10, abs=1e-8
        )
        assert gas.entropy(temperature) - gas.entropy_298.value == pytest.approx(
            s, rel=1e-11, abs=1e-11
        )


def slope(function: Callable[[Array], Array], temperature: Array) -> Array:
    """Derivative by central differences of fourth order, step 0.5 K."""
    step = 0.5
    near = function(temperature + step) - function(temperature - step)
    far = function(temperature + 2.0 * step) - function(temperature - 2.0 * step)
    return np.asarray((8.0 * near - far) / (12.0 * step))


def test_derivatives_of_g_and_h_in_all_pinned_gases() -> None:
    """dH/dT = Cp and dG/dT = -S.

    H of 1e6 J/mol is rounded to 1e-10, some 1e-9 J/mol/K in the slope; G, of 1e6 too, moves
    by 300 J/mol/K, so 1e-10 of that. The step leaves h^4/30 of the fifth derivative, which
    the sharpest joint of pieces (K) raises to 2e-7 of Cp.
    """
    for name in WITH_ENERGIES:
        gas = of(name)
        t = np.linspace(max(gas.low, 150.0) + 2.0, gas.high - 2.0, 40)
        np.testing.assert_allclose(slope(gas.enthalpy, t), gas.heat_capacity(t), rtol=3e-7)
        np.testing.assert_allclose(slope(gas.gibbs, t), -gas.entropy(t), rtol=1e-9)


def test_values_at_298_are_the_stated_ones() -> None:
    for name in WITH_ENERGIES:
        gas = of(name)
        assert float(gas.enthalpy(298.15)) == pytest.approx(gas.enthalpy_298.value, abs=1e-8)
        assert float(gas.entropy(298.15)) == pytest.approx(gas.entropy_298.value, abs=1e-11)


def test_the_series_follows_its_source() -> None:
    """Kinks of the sources limit it, locally; the integrals are hardly touched.

    The closed form has a jump in its second derivative at a7 (benzene the worst, 0.12 %),
    Shomate's pieces do not quite meet (CN 0.9 %), JANAF's tables are joined by a spline
    (K the worst, 1.3 %, where liquid and gas points alternate).
    """
    limits = {"TRC": 1.2e-3, "Shomate": 9e-3, "JANAF": 1.3e-2, "5/2 R": 1e-10}
    for name in WITH_ENERGIES:
        gas = of(name)
        (limit,) = (v for key, v in limits.items() if key in gas.heat_capacity_source)
        assert gas.deviation < limit, name
    for name in ("CH4", "H2O", "O2", "HI"):
        gas, table = of(name), pinned_heat_capacity(find_gas(name).cas or "")
        assert table is not None
        cp = table.function()
        points = [table.numbers[7]]
        h, _ = quad(lambda t: float(cp(np.array([t]))[0]), 298.15, 900.0, points=points)  # noqa: B023
        assert float(gas.enthalpy(900.0)) - gas.enthalpy_298.value == pytest.approx(h, abs=0.5)


def test_sources_are_taken_in_the_order_that_was_decided() -> None:
    for name in ("NO2", "Br", "Cl2", "OH", "CH3"):
        assert "ATcT" in of(name).enthalpy_298.source
    assert "JANAF" in of("SO2").enthalpy_298.source
    assert "CRC" in of("1,3-butadiene").enthalpy_298.source
    assert "factor of two" in of("1,3-butadiene").cautions[0]
    for gas in pinned_gases():
        if gas.enthalpy_298 is not None:
            assert not any(s in gas.enthalpy_298.source for s in ("TRC", "API", "JOBACK", "Yaws"))
    assert of("Br").enthalpy_298.value == pytest.approx(111_870, abs=240)  # API: 30.9 kJ/mol
    assert of("Cl2").enthalpy_298.value == 0.0  # JOBACK: -74.8 kJ/mol


def test_heat_capacities_only_where_their_range_covers() -> None:
    """Shomate starts at 332 K for Br2, 458 K for I2 and 500 K for N2O4."""
    for name in ("Br2", "I2", "N2O4"):
        assert of(name).low == 50.0
    assert "TRC" in of("I2").heat_capacity_source
    hot = of("I2", 300.0, 2000.0)
    assert "JANAF" in hot.heat_capacity_source
    assert hot.range_problem(300.0, 2000.0) == "inside"
    assert "5/2 R" in of("Ar").heat_capacity_source
    assert of("I2", 300.0, 9000.0) == of("I2")  # none covers it: the best there is


def test_a_few_kelvin_outside_is_allowed_and_said() -> None:
    gas = of("NOCl")  # 298 to 1000 K
    assert gas.range_problem(298.0, 1000.0) == "inside"
    assert gas.range_problem(296.0, 480.0) == "slightly outside"
    assert gas.range_problem(300.0, 1009.0) == "slightly outside"
    assert gas.range_problem(280.0, 480.0) == "outside"
    assert gas.range_problem(300.0, 1011.0) == "outside"
    # the closed form itself, 5 K below its stated range
    table = pinned_heat_capacity(find_gas("NOCl").cas or "")
    assert table is not None
    assert float(gas.heat_capacity(293.0)) == pytest.approx(
        float(table.function()(np.array([293.0]))[0]), rel=1e-6
    )


def test_far_outside_the_series_stays_finite_and_consistent() -> None:
    gas = of("NOCl")
    _, end = gas.domain
    far = end + 500.0
    cp = float(gas.heat_capacity(end))
    assert float(gas.heat_capacity(far)) == cp
    assert float(gas.enthalpy(far) - gas.enthalpy(end)) == pytest.approx(500.0 * cp, rel=1e-12)
    assert float(gas.entropy(far) - gas.entropy(end)) == pytest.approx(
        cp * np.log(far / end), rel=1e-10
    )


def sourced(value: float) -> Sourced:
    return Sourced(value, "", "as given")


def test_a_readers_own_values() -> None:
    gas = from_values(
        enthalpy_298=sourced(-3.4e5), entropy_298=sourced(450.0), heat_capacity=sourced(200.0)
    )
    t = np.array([200.0, 298.15, 433.0])
    np.testing.assert_allclose(gas.enthalpy(t), -3.4e5 + 200.0 * (t - 298.15), rtol=1e-13)
    np.testing.assert_allclose(gas.entropy(t), 450.0 + 200.0 * np.log(t / 298.15), rtol=1e-13)
    named = Gas("x", thermochemistry=gas)
    assert thermochemistry_of(named) is gas


def test_a_readers_own_table_is_followed_without_overshoot() -> None:
    points = [(250.0, 100.0), (300.0, 100.0), (400.0, 130.0), (600.0, 131.0)]
    gas = from_values(enthalpy_298=sourced(0.0), entropy_298=sourced(0.0), heat_capacity=points)
    assert (gas.low, gas.high) == (250.0, 600.0)
    t = np.linspace(250.0, 600.0, 300)
    # third-order joints leave the series 0.2 % from the curve at worst
    assert float(np.max(gas.heat_capacity(t))) < 131.0 * 1.002
    assert float(gas.heat_capacity(400.0)) == pytest.approx(130.0, rel=2e-3)


def test_bad_values_are_all_reported_in_one_go() -> None:
    with pytest.raises(InputError) as caught:
        from_values(
            enthalpy_298=sourced(float("nan")),
            entropy_298=sourced(200.0),
            heat_capacity=[(400.0, -3.0), (300.0, 30.0)],
            key="gases.x.thermochemistry",
        )
    assert [(p.key, p.found) for p in caught.value.problems] == [
        ("gases.x.thermochemistry.heat_capacity", "-3 J/mol/K at 400 K"),
        ("gases.x.thermochemistry.heat_capacity", "temperatures out of order"),
        ("gases.x.thermochemistry.enthalpy_298", "nan"),
    ]
    with pytest.raises(InputError, match=r"a range that holds 298\.15 K"):
        from_values(
            enthalpy_298=sourced(0.0),
            entropy_298=sourced(0.0),
            heat_capacity=[(400.0, 30.0), (600.0, 30.0)],
        )
    with pytest.raises(InputError, match="at least two, or one value"):
        from_values(
            enthalpy_298=sourced(0.0), entropy_298=sourced(0.0), heat_capacity=[(298.15, 30.0)]
        )


def test_a_range_without_298_kelvin_cannot_be_built() -> None:
    with pytest.raises(ValueError, match=r"298\.15 K lies outside 332 to 6000 K"):
        build(
            np.ones_like,
            332.0,
            6000.0,
            enthalpy_298=sourced(0.0),
            entropy_298=sourced(0.0),
            source="",
        )


def test_what_has_no_energies_says_none() -> None:
    assert thermochemistry_of(Gas.label("A")) is None
    assert thermochemistry_of(find_gas("DTBP")) is None
    assert thermochemistry_of(find_gas("CH3O")) is None  # no entropy in any table


def test_ions_say_which_convention(checked: Checked) -> None:
    ion = of("Ar+")
    assert "stationary-electron" in ion.cautions[-1]
    # ionisation energy of argon, 15.7596 eV (NIST, from memory): H(Ar+) - H(Ar) at 0 K; at
    # 298 K the ion's fine structure adds a few J/mol.
    rise = ion.enthalpy_298.value - of("Ar").enthalpy_298.value
    name = "ionisation energy of Ar, H(Ar⁺) − H(Ar)"
    within = 100.0 / 96485.33
    checked(name, rise / 96485.33, "15.7596", "eV", "NIST (from memory)", within=within)


def test_hydrogen_says_that_it_is_the_equilibrium_mixture() -> None:
    assert "ortho and para" in of("H2").cautions[0]


def test_pinned_gases_need_no_library() -> None:
    """In a fresh interpreter: identity and energies of pinned gases import no table."""
    import subprocess
    import sys

    code = (
        "import sys\n"
        "from meanfree.gases.identity import find_gas\n"
        "from meanfree.gases.energies import thermochemistry_of\n"
        "from meanfree.gases.condensation import condenses\n"
        "assert thermochemistry_of(find_gas('NOCl')).low == 298\n"
        "assert condenses(find_gas('Br2'), 296.0, 1e5)\n"
        "print([m for m in ('chemicals', 'pandas', 'sympy', 'numba') if m in sys.modules])\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
