"""Each check of a run fails on a run that was spoilt for it, and says by how much.

A good run is taken, one number of one accepted step is changed by a known amount, and the words are
compared whole: what is said is the change over what the docstring names, worked out by hand.
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from laboratory import experiment, si, step

from meanfree.errors import ComputationError
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Adiabatic, Exchange
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.identity import find_gas
from meanfree.integrate.checks import check, composition
from meanfree.integrate.single import integrate
from meanfree.integrate.trajectory import Trajectory
from meanfree.rates.source import Source

RTOL = 1e-8


def gas(name):
    found = find_gas(name)
    return dataclasses.replace(found, thermochemistry=thermochemistry_of(found))


def spoilt(run, row, by, place=-1, stretch=-1):
    """The checks of a run in which one number of one state is another by ``by``."""
    changed = [
        dataclasses.replace(s, states=[y.copy() for y in s.states])
        for s in run.trajectory.stretches
    ]
    changed[stretch].states[place][row] += by
    return check(run.experiment, run.system, Trajectory(changed), RTOL)


def dissociating(**options):
    """Real gases with a step that no integrated rate law is known for."""
    gases = [gas(name) for name in ("N2O4", "NO2", "Ar")]
    steps = [step("N2O4 -> 2 NO2", 0.2, reverse="thermochemistry")]
    fill = options.pop("fill", {"N2O4": 2.0, "Ar": 1.0})
    return experiment(steps, fill, gases=gases, T=330.0, until=3.0, **options)


def test_an_unspoilt_run_passes():
    run = integrate(dissociating())
    assert check(run.experiment, run.system, run.trajectory, RTOL).failures == ()
    # rounding alone drifts: at most some hundred times 1e-16
    assert set(run.invariants.elements) == {"Ar", "N", "O"}
    assert all(drift < 1e-12 for drift in run.invariants.elements.values())
    assert run.invariants.most_negative == 0.0
    assert (run.invariants.energy, run.invariants.volume) == (None, None)


def test_a_drift_of_an_element_over_the_most_there_was():
    """2 mol/m3 of N2O4 hold 4 of N and 8 of O: 4e-4 more of NO2 is 1e-4 of either."""
    run = integrate(dissociating())
    found = spoilt(run, 1, 4e-4)
    assert found.elements["N"] == pytest.approx(1e-4, rel=1e-3)
    assert found.elements["O"] == pytest.approx(1e-4, rel=1e-3)
    assert found.elements["Ar"] < 1e-12
    assert found.failures == (
        "N drifted by 1.0e-04 of what there was",
        "O drifted by 1.0e-04 of what there was",
    )
    # ten tolerances are allowed, 1e-7 here
    assert spoilt(run, 1, 4 * 0.9e-7).failures == ()
    assert len(spoilt(run, 1, 4 * 1.1e-7).failures) == 2
    assert len(spoilt(run, 2, 1.1e-7).failures) == 1


def test_a_drift_anywhere_in_a_run_is_seen():
    run = integrate(dissociating())
    middle = len(run.trajectory.stretches[0].states) // 2
    assert spoilt(run, 2, -3e-4, middle).failures == ("Ar drifted by 3.0e-04 of what there was",)


def test_what_is_not_finite_is_said():
    run = integrate(dissociating())
    assert "a value is not finite" in spoilt(run, 0, np.nan).failures


def test_a_negative_amount_beyond_the_tolerance_is_said():
    """100 tolerances of the most there was of the gas are allowed: 1e-6 of about 1 mol/m3."""
    case = experiment(
        [step("A -> B", 0.3), step("B -> C", 0.1), step("A -> C", 1.0)], {"A": 1.0}, until=9.0
    )
    run = integrate(case)
    left = run.state(9.0)[0, 0]
    assert spoilt(run, 0, -left - 0.9e-6).failures == ()
    assert len(spoilt(run, 0, -left - 1.1e-6).failures) == 1
    found = spoilt(run, 0, -left - 2e-3)
    assert found.failures == ("A went negative, to -2.0e-03 mol/m^3",)
    assert found.most_negative == pytest.approx(2e-3, rel=1e-6)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_energy_over_the_heat_that_is_there(holds):
    """A tenth of a kelvin too much is C dT, over the most that sum n Cp T was in the run."""
    case = dataclasses.replace(dissociating(holds=holds), temperature=Adiabatic(si(330.0)))
    run = integrate(case)
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-9
    found = spoilt(run, run.system.temperature_index, 0.1)
    heats, capacity = [], 0.0
    for t in run.trajectory.times:
        n, T = run.amounts(t)[:, 0], run.temperature(t)[0]
        Cp = np.array([float(g.thermochemistry.heat_capacity(T)) for g in case.gases])
        heats.append(n @ Cp * T)
        capacity = n @ Cp - (8.314462618 * n.sum() if holds == "volume" else 0.0)
    # Cp changes by 1e-4 of itself over the tenth of a kelvin
    assert found.energy == pytest.approx(capacity * 0.1 / max(heats), rel=1e-3)
    assert f"energy drifted by {found.energy:.1e}" in found.failures


def test_energy_counts_the_wall_and_what_was_exchanged():
    mode = Exchange(si(330.0), si(350.0), si(0.02), si(0.5))
    run = integrate(dataclasses.replace(dissociating(), temperature=mode))
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-9
    assert abs(run.temperature(run.end)[0] - 330.0) > 0.05


def test_energy_is_kept_over_a_sample():
    sample = Sample(si(1.0), fraction=si(0.3))
    case = dataclasses.replace(dissociating(), temperature=Adiabatic(si(330.0)), samples=(sample,))
    run = integrate(case)
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-9
    assert max(run.invariants.elements.values()) < 1e-12
    assert spoilt(run, 2, 2e-3, stretch=0, place=1).failures


def test_energies_that_gases_do_not_decide_are_not_judged():
    gases = [gas(name) for name in ("N2O4", "NO2")]
    heated = step("N2O4 -> 2 NO2", 0.2, heat=si(5e4))
    case = experiment(
        [heated], {"N2O4": 2.0}, gases=gases, temperature=Adiabatic(si(330.0)), until=1.0
    )
    assert integrate(case).invariants.energy is None
    fed = [step("N2O4 -> 2 NO2", 0.2), step("-> NO2", Source(si(0.1)))]
    open_case = experiment(
        fed, {"N2O4": 2.0}, gases=gases, temperature=Adiabatic(si(330.0)), until=1.0
    )
    run = integrate(open_case)
    assert run.invariants.energy is None
    # what the source brought is counted: 0.1 mol/m3 of N more than was filled
    assert max(run.invariants.elements.values()) < 1e-12
    assert spoilt(run, 1, 1e-3).elements["N"] == pytest.approx(1e-3 / 4.1, rel=1e-3)


def test_a_piston_leaves_the_equation_of_state():
    """v is 1 at the start and about 1.2 at the end; 1e-4 more is 8e-5 of it."""
    run = integrate(dissociating(holds="pressure"))
    row = run.system.volume_index
    v = run.state(run.end)[row, 0]
    found = spoilt(run, row, 1e-4 * v)
    assert found.volume == pytest.approx(1e-4, rel=1e-3)
    assert found.failures == ("the volume left the equation of state by 1.0e-04",)
    # a thousand tolerances are allowed
    assert spoilt(run, row, 0.9e-5 * v).failures == ()
    assert len(spoilt(run, row, 1.1e-5 * v).failures) == 1
    warm = integrate(
        dataclasses.replace(dissociating(holds="pressure"), temperature=Adiabatic(si(330.0)))
    )
    assert warm.invariants.volume is not None
    assert warm.invariants.volume < 1e-9
    with_dead = integrate(dissociating(holds="pressure", dead=(2e-4, 290.0)))
    assert with_dead.invariants.volume is not None
    assert with_dead.invariants.volume < 1e-9


def test_the_integrated_rate_law_is_left():
    """First order: a hundredth more of A at the last accepted step, over the 2 there were."""
    run = integrate(experiment([step("A -> B", 0.3)], {"A": 2.0}, until=4.0))
    assert run.invariants.closed_form == "first order"
    assert run.invariants.closed_form_difference is not None
    assert run.invariants.closed_form_difference < 1e-7
    found = spoilt(run, 0, 0.02)
    assert found.closed_form_difference == pytest.approx(0.01, rel=1e-4)
    assert found.failures == ("the integrated rate law (first order) was left by 1.0e-02",)
    assert spoilt(run, 0, 1.8e-5).failures == ()
    assert len(spoilt(run, 0, 2.2e-5).failures) == 1
    unknown = integrate(
        experiment([step("A -> B", 0.3), step("2 A -> C", 0.1)], {"A": 2.0}, until=4.0)
    )
    assert (unknown.invariants.closed_form, unknown.invariants.closed_form_difference) == ("", None)


def test_elements_of_a_mechanism():
    gases = [gas(name) for name in ("NO2", "N2O4")]
    case = experiment([step("2 NO2 -> N2O4", 1.0)], {"NO2": 1.0}, gases=gases)
    names, table = composition(case)
    assert names == ["N", "O"]
    assert table.tolist() == [[1.0, 2.0], [2.0, 4.0]]


def test_charge_is_conserved_beside_the_elements():
    from encounters import molecule

    gases = [molecule("H3O+"), molecule("H2O"), molecule("H+")]
    case = experiment([step("H3O+ -> H2O + H+", 1.0)], {"H3O+": 1.0}, gases=gases)
    names, table = composition(case)
    assert names == ["H", "O", "charge"]
    assert table.tolist() == [[3.0, 2.0, 1.0], [1.0, 1.0, 0.0], [1.0, 0.0, 1.0]]


def test_labels_among_real_gases_conserve_nothing_by_name():
    gases = [gas("NO2"), dataclasses.replace(gas("Ar"), name="X", formula=None), gas("Ar")]
    mixed = experiment([step("NO2 -> X", 1.0)], {"NO2": 1.0}, gases=gases)
    names, table = composition(mixed)
    assert (names, table.shape) == ([], (0, 3))
    idle = experiment([step("NO2 -> Ar", 1.0)], {"NO2": 1.0, "X": 1.0}, gases=gases)
    names, table = composition(idle)
    assert names == ["Ar", "N", "O"]
    assert table[:, 1].tolist() == [0.0, 0.0, 0.0]


def test_a_catalyst_is_not_consumed():
    run = integrate(experiment([step("A + E -> B + E", 0.3)], {"A": 1.0, "E": 0.5}, until=2.0))
    assert run.consumed == ("A",)


def test_growth_is_judged_over_what_was_filled():
    """A -> 2 A from 50 mol/m3: a billion times that, not of one, and so no sooner."""
    with pytest.raises(ComputationError) as caught:
        integrate(experiment([step("A -> 2 A", 0.3)], {"A": 50.0}))
    time = float(str(caught.value).split(" by ")[1].split(" s,")[0])
    # the step that passed the bound ends within a tenth of the way
    assert np.log(1e9) / 0.3 <= time < 1.1 * np.log(1e9) / 0.3
