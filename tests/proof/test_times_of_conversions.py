"""Half-lives and conversion times where they are easily got wrong, against closed forms.

Every case goes through a single run and through the kernel.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from laboratory import experiment, step

from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.flows import Flow
from meanfree.experiment.temperature import Isothermal
from meanfree.integrate.many import many
from meanfree.integrate.observables import At, HalfLife, Observable, ReactionTime
from meanfree.integrate.single import integrate
from meanfree.sourced import Sourced

T = 300.0

# Both integrators at rtol 1e-8; a few tolerances of the amount, and n/|dn/dt| is at most 10 t here.
REACHED = 1e-7


def case(steps: list, fill: dict[str, float], until: float | None) -> Experiment:
    held = Isothermal(Sourced(T, "K", dimension="temperature"))
    return experiment(steps, fill, until=until, T=T, temperature=held)


def of_kernel(e: Experiment, asked: list[Observable]) -> list[float]:
    frame = many(e, {"temperature.value": np.array([T])}, asked, workers=1)
    return [float(frame[o.columns[0]][0]) for o in asked]


def half_lives(e: Experiment, gas: str, count: int) -> list[list[float]]:
    """Of a single run and of the kernel; NaN: not reached."""
    found = [h.duration for h in integrate(e).half_lives(gas)]
    single = [np.nan if d is None else d for d in found] + [np.nan] * count
    return [single[:count], of_kernel(e, [HalfLife(gas, i + 1) for i in range(count)])]


def times(e: Experiment, gas: str, *conversions: float) -> list[list[float]]:
    """The same for the times of conversions."""
    run = integrate(e)
    single = [run.reaction_time(gas, X) for X in conversions]
    return [
        [np.nan if t is None else t for t in single],
        of_kernel(e, [ReactionTime(gas, X) for X in conversions]),
    ]


@pytest.mark.parametrize("scale", [1e-12, 1.0, 1e12])
@pytest.mark.parametrize("until", [None, 10.0])
def test_from_a_picosecond_to_thirty_thousand_years(scale: float, until: float | None) -> None:
    """A -> B: ln 2/k each time, ln 1000/k to 99.9 %, which is where an automatic run ends."""
    e = case([step("A -> B", 1 / scale)], {"A": 2.0}, None if until is None else until * scale)
    for found in half_lives(e, "A", 3):
        assert found == pytest.approx([np.log(2) * scale] * 3, rel=REACHED)
    for found in times(e, "A", 0.1, 0.999):
        assert found == pytest.approx([-np.log(0.9) * scale, np.log(1000) * scale], rel=REACHED)


@pytest.mark.parametrize("scale", [1e-12, 1e12])
def test_half_lives_that_double(scale: float) -> None:
    """2 A -> B: 1/(2 k c), twice as long each time."""
    e = case([step("2 A -> B", 1 / scale)], {"A": 1.0}, 100 * scale)
    for found in half_lives(e, "A", 3):
        assert found == pytest.approx(np.array([0.5, 1.0, 2.0]) * scale, rel=REACHED)


def test_a_conversion_that_equilibrium_stops_short_of() -> None:
    """A <-> B ends at 70 %; 70 % itself is approached and never reached."""
    e = case([step("A -> B", 0.7), step("B -> A", 0.3)], {"A": 1.0}, 200.0)
    for found in times(e, "A", 0.69, 0.71):
        # 0.7 (1 - exp(-t)) = 0.69; n/|dn/dt| there is 31 s to 4.2 s, so 31e-8 s a tolerance
        assert found[0] == pytest.approx(np.log(70.0), rel=1e-6)
        assert np.isnan(found[1])
    for found in half_lives(e, "A", 2):
        assert found[0] == pytest.approx(-np.log(1 - 0.5 / 0.7), rel=REACHED)
        assert np.isnan(found[1])


def test_a_run_that_ends_where_a_half_life_does() -> None:
    """Whichever side of the level rounding leaves the end, the time is right or not given."""
    e = case([step("A -> B", 0.1)], {"A": 1.0}, np.log(2) / 0.1)
    for found in half_lives(e, "A", 1):
        assert np.isnan(found[0]) or found[0] == pytest.approx(np.log(2) / 0.1, rel=REACHED)
    longer = replace(e, plan=replace(e.plan, until=Sourced((1 + 1e-6) * np.log(2) / 0.1)))
    for found in half_lives(longer, "A", 1):
        assert found[0] == pytest.approx(np.log(2) / 0.1, rel=REACHED)


def test_a_conversion_that_goes_back_counts_when_it_was_first_there() -> None:
    """A -> B -> C -> A: A falls to a fifth and comes back; exponentials of the matrix by scipy."""
    steps = [step("A -> B", 1.0), step("B -> C", 0.2), step("C -> A", 0.05)]
    e = case(steps, {"A": 1.0}, 200.0)
    K = np.array([[-1.0, 0.0, 0.05], [1.0, -0.2, 0.0], [0.0, 0.2, -0.05]])
    from scipy.linalg import expm
    from scipy.optimize import brentq

    def A(t: float) -> float:
        return float(expm(K * t)[0, 0])

    grid = np.linspace(0, 200, 2001)
    lowest = grid[np.argmin([A(t) for t in grid])]
    level = 0.5 * (A(lowest) + A(200.0))
    first = brentq(lambda t: A(t) - level, 0.0, lowest, xtol=1e-13)
    assert A(200.0) > level  # it comes back
    for found in times(e, "A", 1 - level):
        assert found[0] == pytest.approx(first, rel=1e-6)


def test_a_gas_that_first_becomes_more() -> None:
    """B is filled and made: its half-life counts from the start and ends after the maximum."""
    e = case([step("A -> B", 1.0), step("B -> C", 0.2)], {"A": 1.0, "B": 0.5}, 80.0)
    # B = -1.25 exp(-t) + 1.75 exp(-0.2 t)
    from scipy.optimize import brentq

    ends = [
        brentq(
            lambda t, c=c: -1.25 * np.exp(-t) + 1.75 * np.exp(-0.2 * t) - c, 1.0, 80.0, xtol=1e-13
        )
        for c in (0.25, 0.125)
    ]
    for found in half_lives(e, "B", 2):
        assert found == pytest.approx([ends[0], ends[1] - ends[0]], rel=REACHED)


def test_swings_cross_a_level_many_times_and_the_first_counts() -> None:
    """Predator and prey: the food is the filled label, in great excess."""
    steps = [step("F + X -> 2 X", 1e-6), step("X + Y -> 2 Y", 1.0), step("Y -> D", 1.0)]
    e = case(steps, {"F": 1e6, "X": 2.0, "Y": 1.0}, 30.0)
    run = integrate(e)
    V = e.vessel.volume.value
    crossed = run.crossings("X", 1.0 * V)
    assert len(crossed) > 6
    single, kernel = half_lives(e, "X", 1)
    assert single[0] == crossed[0]
    assert kernel[0] == pytest.approx(single[0], rel=REACHED)


def test_a_gas_that_was_not_filled_has_no_conversion() -> None:
    e = case([step("A -> B", 1.0), step("B -> C", 0.2)], {"A": 1.0, "B": 0.0}, 10.0)
    run = integrate(e)
    assert run.half_lives("B") == []
    assert run.reaction_time("B", 0.5) is None
    assert np.isnan(of_kernel(e, [HalfLife("B"), ReactionTime("B", 0.5)])).all()


@pytest.mark.parametrize("trace", [1e-9, 1e-14, 1e-18, 1e-24])
def test_a_filled_trace_is_followed_on_its_own_scale(trace: float) -> None:
    """Pseudo-first order in an excess of B: ln 2/(k b), however little of the whole A is."""
    e = case([step("A + B -> C", 0.5)], {"A": trace, "B": 2.0}, 5.0)
    for found in half_lives(e, "A", 2):
        # k b falls by trace/b on the way: 5e-10 at most
        assert found == pytest.approx([np.log(2)] * 2, rel=REACHED)


def test_conversions_of_a_gas_that_also_flows_out() -> None:
    """A single run keeps outflow apart; many runs refuse what they cannot tell."""
    pump = Flow("pumping", rate=Sourced(0.1, "1/s", dimension="frequency"))
    e = replace(case([step("A -> B", 0.1)], {"A": 1.0}, 50.0), flows=(pump,))
    assert integrate(e).half_lives("A")[0].duration == pytest.approx(np.log(2) / 0.1, rel=REACHED)
    with pytest.raises(InputError) as caught:
        of_kernel(e, [HalfLife("A"), ReactionTime("A", 0.5), At("conversion", "A")])
    assert len(caught.value.problems) == 3
    assert "conversions of A, which also flows out" in str(caught.value)
    left = of_kernel(e, [At("concentration", "A")])
    assert left == pytest.approx([np.exp(-10.0)], rel=1e-6)
