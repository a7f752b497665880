"""When an automatic run ends although something never comes to rest."""

from __future__ import annotations

import math

import numpy as np
import pytest
from laboratory import experiment, si, step

from meanfree.errors import ComputationError
from meanfree.integrate import settling
from meanfree.integrate.run import Status
from meanfree.integrate.single import integrate
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.source import Source


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_growth_without_bound_is_given_up_in_words(holds: str) -> None:
    """A -> 2 A: ln(1e9)/k until the amount has grown a billion times."""
    with pytest.raises(ComputationError) as caught:
        integrate(experiment([step("A -> 2 A", 0.3)], {"A": 1.0}, holds=holds))
    text = str(caught.value)
    assert text.startswith("the amount of gas grew 1e+09 times by ")
    time = float(text.split(" by ")[1].split(" s,")[0])
    # the step that passed the bound ends within a tenth of the way
    assert np.log(1e9) / 0.3 <= time < 1.1 * np.log(1e9) / 0.3
    assert text.endswith('state a time under [run] until instead of "auto"')


def test_a_product_that_piles_up_does_not_keep_the_watched_gas_waiting():
    """A flows in at q and is lost at k: A = q/k + (A0 - q/k) exp(-k t), B grows for ever."""
    k, q, A0 = 1e-2, 1e-3, 1.0
    inflow = step("-> A", Source(si(q)))
    run = integrate(experiment([inflow, step("A -> B", k)], {"A": A0}, watch="A"))
    assert run.status is Status.SETTLED
    # 99.9 % of the way: exp(-k t) = 1e-3. It rests to 1e-6, which shifts the level by 1e-3 of it.
    assert run.end == pytest.approx(math.log(1000) / k, rel=2e-3)
    assert run.settled_state is not None
    # At rest is what moves by less than 1e-6 of the most there was.
    assert run.settled_state[run.index("A")] == pytest.approx(q / k, rel=1e-5)
    assert math.isnan(run.settled_state[run.index("B")])


@pytest.mark.parametrize("returns", ["B -> A", "A + B -> B + B", "A + M -> B + M"])
def test_what_bears_on_the_watched_gas_must_rest_with_it(returns):
    """B comes back to A, speeds its loss, or is a partner in M: then B counts too."""
    inflow = step("-> B", Source(si(1e-3)))
    run = experiment([inflow, step("A -> B", 1e-2), step(returns, 1e-3)], {"A": 1.0})
    from meanfree.equations.build import build_system

    system = build_system(run)
    assert settling.bearing_on(system, system.gases.index("A")) == [0, 1]


def test_what_swings_for_ever_is_ended_and_says_so(monkeypatch):
    """Lotka's scheme: x' = x - x y, y' = x y - y has closed orbits round (1, 1)."""
    monkeypatch.setattr(settling, "MOST_STEPS", 400)
    steps = [step("X -> 2 X", 1.0), step("X + Y -> 2 Y", 1.0), step("Y -> P", 1.0)]
    run = integrate(experiment(steps, {"X": 1.0, "Y": 0.5}, watch="X"))
    assert run.status is Status.RESTLESS
    assert "still moving" in run.message
    x, y = (run.concentrations(run.end)[run.index(g), 0] for g in "XY")
    # Its constant of motion x - ln x + y - ln y; 400 steps of rtol 1e-8 may add up.
    assert x - np.log(x) + y - np.log(y) == pytest.approx(1.5 + math.log(2), abs=1e-5)


def test_a_vessel_in_which_nothing_moves_says_that():
    run = integrate(experiment([step("A -> B", Arrhenius(si(0.0), si(5e4)))], {"A": 1.0}))
    assert run.message == "stopped: nothing moves"
