"""Sizing against closed forms, against running again, and what it says where nothing does."""

from __future__ import annotations

import math

import numpy as np
import pytest
from laboratory import step
from planned_cases import arrhenius, fixed, planned, quantity

from meanfree.constants import R
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.gases.identity import find_gas
from meanfree.integrate.single import integrate
from meanfree.planning.best_stop import peak_of, peaks
from meanfree.planning.goal import SHARP, Goal, carried_out, reach
from meanfree.planning.sizing import _roots, size
from meanfree.planning.why_not import Reason
from meanfree.rates.ceiling import ceiling
from meanfree.rates.collision import Collision

EXACT = 1e-8
"""What sizing promises; its runs have a relative tolerance of 1e-10."""

A, EA, C0 = 1e8, 100e3, 20.0
LAW = arrhenius(A, EA)
FIRST = arrhenius(A, EA, 1.0)


def second_order(holds: str = "volume") -> Experiment:
    """2 A -> 3 B with 20 mol/m^3 A and 20 mol/m^3 of inert N, filled at 500 K."""
    return planned(
        [step("2 A -> 3 B", LAW, "s")], {"A": C0, "N": C0}, T=500.0, holds=holds, fill_at=500.0
    )


def k_at(T: float) -> float:
    return A * math.exp(-EA / (R * T))


def test_temperature_of_second_order_in_a_rigid_vessel() -> None:
    X, within = 0.4, 5.0
    found = size(
        second_order(), Goal("conversion", "A", X), within, "temperature.value", 420.0, 600.0
    )
    # X/(1-X) = 2 k c0 t; c0 stays, for the vessel is rigid and filled at 500 K.
    k = X / (1 - X) / (2 * C0 * within)
    wanted = EA / (R * math.log(A / k))
    assert len(found.roots) == 1
    assert found.rising == (True,)
    assert found.roots[0].value == pytest.approx(wanted, rel=EXACT)
    assert found.roots[0].time == pytest.approx(within, rel=EXACT)


def test_fill_of_second_order_in_a_rigid_vessel() -> None:
    X, within = 0.4, 5.0
    found = size(second_order(), Goal("conversion", "A", X), within, "fill.gases.A", 1.0, 200.0)
    wanted = X / (1 - X) / (2 * k_at(500.0) * within)
    assert [root.value for root in found.roots] == [pytest.approx(wanted, rel=EXACT)]


def test_time_and_dilution_of_second_order_in_a_piston() -> None:
    """a k c0 t = (1 + e) X/(1 - X) + e ln(1 - X), e = growth at full conversion.

    Source: Levenspiel, Chemical Reaction Engineering, 3rd ed. (1999), chapter 3.
    """
    goal = Goal("conversion", "A", 0.6)
    case = second_order("pressure")

    def time(c0: float, inert: float) -> float:
        e = 0.5 * c0 / (c0 + inert)
        X = goal.level
        return ((1 + e) * X / (1 - X) + e * math.log(1 - X)) / (2 * k_at(500.0) * c0)

    run = carried_out(case, goal, None, SHARP)
    assert reach(run, goal).time == pytest.approx(time(C0, C0), rel=EXACT)
    # With more inert gas the volume grows less: the time falls a little.
    within = time(C0, 37.0)
    found = size(case, goal, within, "fill.gases.N", 10.0, 90.0)
    assert [root.value for root in found.roots] == [pytest.approx(37.0, rel=1e-7)]
    # e changes by 1e-8 where the inert changes by 5e-8: the root is that much less sharp.
    assert found.roots[0].time == pytest.approx(within, rel=EXACT)


@pytest.mark.parametrize("address", ["temperature.value", "fill.gases.A", "vessel.volume"])
def test_it_inverts_running(address: str) -> None:
    """A value, run; its time, sized; the value again."""
    case = planned([step("A + N -> B", LAW, "s")], {"A": 0.01, "N": 0.03}, T=500.0, kind="amount")
    goal = Goal("conversion", "A", 0.3)
    true = {"temperature.value": 512.3, "fill.gases.A": 0.0137, "vessel.volume": 1.234e-3}[address]
    time = reach(carried_out(with_inputs(case, {address: true}), goal, None, SHARP), goal).time
    assert time is not None
    found = size(case, goal, time, address, 0.7 * true, 1.4 * true)
    assert [root.value for root in found.roots] == [pytest.approx(true, rel=EXACT)]


def test_an_exothermic_equilibrium_has_two_roots() -> None:
    """A <=> B, releasing heat: too slow when cold, held back by equilibrium when hot."""
    dH, K500 = -60e3, 4.0
    back = GivenEquilibrium(
        "K", quantity(K500, "pure"), quantity(500.0, "temperature"), quantity(dH, "molar energy")
    )
    case = planned([step("A -> B", FIRST, "s", reverse=back)], {"A": 1.0}, fill_at=500.0)
    X, within = 0.75, 600.0

    def conversion(T: float) -> float:
        k, K = k_at(T), K500 * math.exp(-dH / R * (1 / T - 1 / 500.0))
        return K / (1 + K) * (1 - math.exp(-k * (1 + 1 / K) * within))

    found = size(case, Goal("conversion", "A", X), within, "temperature.value", 420.0, 640.0)
    assert found.rising == (True, False)
    for root in found.roots:
        assert conversion(root.value) == pytest.approx(X, rel=1e-8)
    # K(T) = 3 in the limit of infinite time is 508.0 K: the hot root lies just below it.
    limit = 1 / (1 / 500.0 - R / dH * math.log(3.0 / K500))
    assert found.roots[1].value == pytest.approx(limit, abs=6.0)
    assert found.roots[1].value < limit


def test_a_hump_between_grid_points_has_two_roots() -> None:
    """A narrow hump shows on no grid point, or on one; both its sides are found."""

    def hump(x: float) -> float:
        return 1e-3 - (x - 0.52) ** 2

    values = np.linspace(0.0, 1.0, 11)
    found = _roots(hump, values, np.array([hump(float(v)) for v in values]))
    # Only the grid point 0.5 is above zero; the narrower hump shows on none.
    assert [value for value, _ in found] == pytest.approx(
        [0.52 - math.sqrt(1e-3), 0.52 + math.sqrt(1e-3)], rel=1e-12
    )

    def hidden(x: float) -> float:
        return 4e-4 - (x - 0.45) ** 2

    found = _roots(hidden, values, np.array([hidden(float(v)) for v in values]))
    assert [value for value, _ in found] == pytest.approx([0.43, 0.47], rel=1e-12)
    assert [rising for _, rising in found] == [True, False]


def test_most_of_an_intermediate() -> None:
    """A -> B -> C, first order: t = ln(k1/k2)/(k1 - k2); both vessels."""
    k1, k2 = 3e-3, 1e-3
    for holds in ("volume", "pressure"):
        case = planned(
            [step("A -> B", fixed(k1)), step("B -> C", fixed(k2))], {"A": 1.0}, holds=holds
        )
        run = carried_out(case, Goal("conversion", "A", 0.5), 5e3, SHARP)
        found = peaks(run)
        assert [peak.gas for peak in found] == ["B"]
        assert found[0].time == pytest.approx(math.log(k1 / k2) / (k1 - k2), rel=EXACT)
        share = (k1 / k2) ** (k2 / (k2 - k1))
        assert found[0].amount == pytest.approx(1e-3 * share, rel=EXACT)
        assert peak_of(run, "A") is None
        assert peak_of(run, "C") is None


# Why not


def reason(
    case: Experiment, goal: Goal, within: float, address: str, low: float, high: float
) -> Reason:
    found = size(case, goal, within, address, low, high)
    assert found.roots == ()
    assert found.reason is not None
    return found.reason


def test_equilibrium_is_the_reason() -> None:
    back = GivenEquilibrium("K", quantity(0.5, "pure"), quantity(500.0, "temperature"))
    case = planned([step("A -> B", FIRST, "s", reverse=back)], {"A": C0}, T=500.0)
    why = reason(case, Goal("conversion", "A", 0.5), 1e4, "temperature.value", 450.0, 700.0)
    assert why.why == "equilibrium"
    assert why.eventually == pytest.approx(1 / 3, rel=1e-9)  # K = 1/2
    assert why.at == 700.0


def test_another_gas_is_the_reason() -> None:
    case = planned([step("A + B -> C", LAW)], {"A": 10.0, "B": 4.0}, T=600.0)
    why = reason(case, Goal("conversion", "A", 0.5), 1e4, "temperature.value", 600.0, 800.0)
    assert (why.why, why.named) == ("another gas", "B")
    assert why.eventually == pytest.approx(0.4, rel=2e-3)  # the run ends at 99.9 % of B


def test_another_step_is_the_reason() -> None:
    steps = [step("A -> B", FIRST, "wanted"), step("A -> C", fixed(0.05), "rival")]
    case = planned(steps, {"A": 10.0}, T=450.0)
    why = reason(case, Goal("yield", "B", 0.9, "A"), 1e4, "temperature.value", 420.0, 460.0)
    assert (why.why, why.named) == ("another step", "rival")


def test_slowness_is_the_reason_and_the_limit_of_collisions_is_told() -> None:
    gas = find_gas("NO2")
    law = Collision(threshold=quantity(100e3, "molar energy"), steric=quantity(1e-3, "pure"))
    gases = [gas, find_gas("NO"), find_gas("O2")]
    case = planned([step("2 NO2 -> 2 NO + O2", law, "s")], {"NO2": C0}, T=500.0, gases=gases)
    goal = Goal("conversion", "NO2", 0.5)
    why = reason(case, goal, 1.0, "temperature.value", 480.0, 520.0)
    assert why.why == "slow"
    assert why.at == 520.0
    assert why.at_limit is not None
    # If every encounter reacted: t = 1/(2 Z c0).
    limit = ceiling((gas, gas), 520.0)
    assert limit is not None
    assert why.at_limit == pytest.approx(1 / (2 * limit.Z * C0), rel=1e-6)
    # Faster than every encounter can be:
    why = reason(case, goal, 1e-12, "temperature.value", 480.0, 520.0)
    assert why.why == "limit of collisions"


def test_sooner_everywhere_is_told() -> None:
    case = second_order()
    why = reason(case, Goal("conversion", "A", 0.4), 1e3, "temperature.value", 450.0, 550.0)
    assert why.why == "reached sooner"
    assert why.at == 450.0
    assert why.time == pytest.approx(0.4 / 0.6 / (2 * k_at(450.0) * C0), rel=1e-7)


def test_refusals() -> None:
    goal = Goal("conversion", "A", 0.4)
    with pytest.raises(InputError, match="a lower and a higher value"):
        size(second_order(), goal, 1.0, "temperature.value", 500.0, 400.0)
    with pytest.raises(InputError, match="possible values"):
        size(second_order(), goal, 1.0, "temperature.value", -500.0, -400.0)
    with pytest.raises(InputError, match="an unknown address"):
        with_inputs(second_order(), {"temperature.valu": 1.0})
    assert integrate(second_order()).conversion("A", 0.0)[0] == 0.0
