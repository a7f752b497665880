"""What is read off a run, against closed forms: amounts, volumes, rates, peaks, crossings, ends.

Radau at rtol 1e-8 keeps these problems to about 1e-9; ten times that is allowed unless said.
"""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from laboratory import experiment, si, step

from meanfree.equations.build import build_system
from meanfree.experiment.plan import Solver
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Program
from meanfree.integrate.events import crossings, first_crossing, last_crossing
from meanfree.integrate.gauge import first_shown, initial_slope
from meanfree.integrate.run import Status
from meanfree.integrate.single import integrate
from meanfree.integrate.stepping import equations_for, tolerances
from meanfree.integrate.verify import verify
from meanfree.rates.arrhenius import Arrhenius

R = 8.314462618
REACHED = 1e-8


def chain(**options):
    """A -> B -> C with k1 = 0.5 and k2 = 0.2: B = k1 A0 (exp(-k2 t) - exp(-k1 t))/(k1 - k2)."""
    steps = [step("A -> B", 0.5), step("B -> C", 0.2)]
    return integrate(experiment(steps, {"A": 3.0, "Ar": 1.0}, **{"until": 20.0, **options}))


def middle(t):
    return 3.0 * 0.5 * (np.exp(-0.2 * t) - np.exp(-0.5 * t)) / 0.3


def test_amounts_pressures_and_rates_at_once():
    run, t = chain(T=350.0, volume=2e-3), np.array([0.0, 1.0, 7.0])
    a, b = 3.0 * np.exp(-0.5 * t), middle(t)
    assert run.concentrations(t)[0] == pytest.approx(a, rel=REACHED)
    assert run.amounts(t)[run.index("B")] == pytest.approx(b * 2e-3, rel=REACHED)
    assert run.partial_pressures(t)[run.index("B")] == pytest.approx(b * R * 350.0, rel=REACHED)
    assert run.pressure(t) == pytest.approx([4.0 * R * 350.0] * 3, rel=REACHED)
    assert run.rates(t) == pytest.approx(np.array([0.5 * a, 0.2 * b]), rel=REACHED)
    assert run.conversion("A", t) == pytest.approx(1 - np.exp(-0.5 * t), abs=REACHED)
    assert run.volume(t).tolist() == [2e-3] * 3
    assert run.volume_ratio(5.0).tolist() == [1.0]
    assert run.temperature(t).tolist() == [350.0] * 3
    assert run.consumed == ("A",)
    assert (run.end, run.status, run.message) == (
        20.0,
        Status.REACHED,
        "stopped: reached the stated time",
    )
    assert (run.method, run.rtol, run.notes) == ("Radau", 1e-8, ())


def test_the_most_there_is_of_an_intermediate():
    """t = ln(k1/k2)/(k1 - k2). Flat: the time is known to the root of the height."""
    run = chain()
    time, amount = run.peak("B")
    assert time == pytest.approx(math.log(2.5) / 0.3, rel=1e-4)
    assert amount == pytest.approx(middle(math.log(2.5) / 0.3) * 1e-3, rel=REACHED)
    # what only falls is highest at the start, what only rises at the end
    assert run.peak("A") == (0.0, pytest.approx(3e-3, rel=1e-14))
    end, most = run.peak("C")
    assert end == 20.0
    assert most == pytest.approx(run.amounts(20.0)[run.index("C"), 0], rel=1e-14)


def test_a_level_that_is_crossed_twice_and_one_that_is_not():
    run = chain()
    up, down = run.crossings("B", 1e-3)
    assert middle(up) == pytest.approx(1.0, rel=REACHED)
    assert middle(down) == pytest.approx(1.0, rel=REACHED)
    assert up < math.log(2.5) / 0.3 < down

    def b(t):
        return run.amounts(t)[run.index("B")]

    assert first_crossing(run.trajectory, b, 1e-3) == up
    assert last_crossing(run.trajectory, b, 1e-3) == down
    assert crossings(run.trajectory, b, 1e-3) == [up, down]
    assert crossings(run.trajectory, b, 1e-3, first_only=True) == [up]
    assert crossings(run.trajectory, b, 5e-3) == []
    assert first_crossing(run.trajectory, b, 5e-3) is None
    assert last_crossing(run.trajectory, b, 5e-3) is None
    # a level that is met at time zero and left at once is met at time zero only
    assert crossings(run.trajectory, lambda t: run.amounts(t)[0], 3e-3) == [0.0]


def test_reaction_times_and_half_lives_of_a_first_order():
    run = chain()
    assert run.reaction_time("A", 0.9) == pytest.approx(math.log(10) / 0.5, rel=REACHED)
    assert run.reaction_time("A", 0.99999) is None
    halves = run.half_lives("A")
    assert [one.ordinal for one in halves] == list(range(1, len(halves) + 1))
    assert [one.gas for one in halves] == ["A"] * 10
    # the tolerance is over what there was, and at the tenth half-life 1e-3 of it is left
    for one in halves:
        assert one.duration == pytest.approx(math.log(2) / 0.5, rel=1e-6)
        assert one.start == pytest.approx((one.ordinal - 1) * math.log(2) / 0.5, rel=1e-6)
    short = chain(until=3.0).half_lives("A")
    assert [one.duration is None for one in short] == [False, False, True]
    assert short[-1].start == pytest.approx(2 * math.log(2) / 0.5, rel=REACHED)


def test_a_piston_by_the_equation_of_state():
    """A -> 2 B in a piston, first order: V/V0 = 1 + X x_A with X = 1 - exp(-k t)."""
    run = integrate(
        experiment([step("A -> 2 B", 0.3)], {"A": 3.0, "Ar": 1.0}, holds="pressure", until=5.0)
    )
    t = np.array([0.0, 2.0, 5.0])
    growth = 1 + 0.75 * (1 - np.exp(-0.3 * t))
    assert run.volume_ratio(t) == pytest.approx(growth, rel=REACHED)
    assert run.volume(t) == pytest.approx(1e-3 * growth, rel=REACHED)
    assert run.concentrations(t)[0] == pytest.approx(3.0 * np.exp(-0.3 * t) / growth, rel=REACHED)
    assert run.pressure(t) == pytest.approx([4.0 * R * 300.0] * 3, rel=REACHED)


def test_a_programmed_temperature_between_its_points():
    ramp = Program(((si(0.0), si(300.0)), (si(10.0), si(400.0)), (si(20.0), si(350.0))))
    run = chain(temperature=ramp, until=30.0)
    t = np.array([0.0, 5.0, 10.0, 16.0, 20.0, 30.0])
    expected = [300.0, 350.0, 400.0, 370.0, 350.0, 350.0]
    assert run.temperature(t) == pytest.approx(expected, rel=1e-14)
    assert run.temperature(7.0).tolist() == pytest.approx([370.0], rel=1e-14)
    assert run.pressure(t) == pytest.approx([4.0 * R * T for T in expected], rel=REACHED)


def test_states_before_and_after_a_sample():
    """A quarter is drawn at 4 s: at the break itself a trajectory gives what was there before."""
    sampled = dataclasses.replace(
        experiment([step("A -> B", 0.5)], {"A": 2.0}, until=8.0),
        samples=(Sample(si(4.0), fraction=si(0.25)),),
    )
    run = integrate(sampled)
    before = 2.0 * math.exp(-2.0)
    assert run.trajectory(4.0)[0, 0] == pytest.approx(before, rel=REACHED)
    assert run.trajectory(4.0, after_break=True)[0, 0] == pytest.approx(0.75 * before, rel=REACHED)
    assert run.retained([3.9, 4.0, 4.1, 8.0]).tolist() == [1.0, 1.0, 0.75, 0.75]
    assert run.retained_of("A", 8.0).tolist() == [0.75]
    assert run.remaining("A", 8.0)[0] == pytest.approx(math.exp(-4.0), rel=REACHED)
    assert np.count_nonzero(run.trajectory.times == 4.0) == 1
    for outside in (-1e-9, 8.1):
        with pytest.raises(ValueError, match=r"^times must lie between 0 and 8 s$"):
            run.trajectory(outside)


def test_a_solution_cut_short_is_the_same_up_to_there():
    sampled = dataclasses.replace(
        experiment([step("A -> B", 0.5)], {"A": 2.0}, until=8.0),
        samples=(Sample(si(4.0), fraction=si(0.25)),),
    )
    whole = integrate(sampled).trajectory
    for end, n_stretches in ((3.3, 1), (4.0, 1), (5.5, 2), (8.0, 2)):
        cut = whole.cut(end)
        assert cut.end == end
        assert len(cut.stretches) == n_stretches
        t = np.linspace(0.0, end, 37)
        assert np.array_equal(cut(t), whole(t))
        with pytest.raises(ValueError, match=f"between 0 and {end:g} s"):
            cut(end + 1e-6)
        inside = [time for time in whole.times if time < end]
        assert cut.times.tolist() == [*inside, end]


def test_every_accepted_step_is_met_and_four_places_within_it():
    run = chain()
    times = run.trajectory.times
    fine = run.trajectory.fine_times
    for quarter in range(4):
        expected = times[:-1] + quarter / 4 * np.diff(times)
        assert fine[:-1][quarter::4] == pytest.approx(expected, rel=1e-14)
    assert fine[-1] == times[-1]
    assert len(fine) == 4 * (len(times) - 1) + 1
    states = run.trajectory.stretches[0].states
    assert np.array_equal(run.trajectory(times), np.column_stack(states))
    assert np.array_equal(run.trajectory(fine), run.trajectory(fine.copy()))


@pytest.mark.parametrize(("dead", "share"), [(None, 1.0), ((1e-3, 300.0), 0.5)])
def test_what_a_gauge_sees_first(dead, share):
    """A -> 2 B at 2 mol/m3 and 300 K: dp/dt = k c R T, halved where dead space doubles the room."""
    run = integrate(
        experiment(
            [step("A -> 2 B", 0.01)], {"A": 2.0}, kind="concentration", dead=dead, until=200.0
        )
    )
    c = run.concentrations(0.0)[0, 0]
    assert initial_slope(run) == pytest.approx(share * 0.01 * c * R * 300.0, rel=1e-9)
    p0 = c * R * 300.0
    time = first_shown(run, 0.1 * p0)
    # p = p0 (2 - exp(-k t s)): only the gas in the hot part reacts
    assert time == pytest.approx(-math.log(0.9) / (0.01 * share), rel=REACHED)
    assert first_shown(run, 2 * p0) is None
    falling = integrate(experiment([step("2 A -> B", 0.01)], {"A": 2.0}, until=200.0))
    # c_A = c0/(1 + 2 k c0 t), p falls by half of what is lost
    shown = first_shown(falling, 0.1 * 2.0 * R * 300.0)
    assert shown == pytest.approx((1 / 0.8 - 1) / (2 * 0.01 * 2.0), rel=REACHED)


@pytest.mark.parametrize(("order", "time"), [(0.0, 4.0), (0.5, 2 / 0.5 * 1.0)])
def test_what_runs_out_is_said_with_its_time(order, time):
    """dc/dt = -k c^q from 1: out at 1/(k (1 - q)), for q = 0 and k = 1/4, q = 1/2 and k = 1/2."""
    k = 0.25 if order == 0 else 0.5
    made = step("A -> B", k, stated_orders=(("A", order),) if order else ())
    run = integrate(experiment([made], {"A": 1.0, "Ar": 1.0}, until=10.0))
    ((gas, when),) = run.ran_out
    assert gas == "A"
    # it leaves its power law a little above zero, within 1e-4 of the time
    assert when == pytest.approx(time, rel=1e-3)
    (note,) = run.notes
    assert (
        note == f"A ran out at {when:.6g} s; a rate of order below one in it stops smoothly at zero"
    )
    early = integrate(experiment([made], {"A": 1.0, "Ar": 1.0}, until=1.0))
    assert early.ran_out == ()
    none = integrate(experiment([made], {"Ar": 1.0}, until=1.0))
    assert none.ran_out == ()


def test_a_second_method_at_a_tenth_of_the_tolerance():
    steps = [step("A -> B", 0.5), step("2 B -> C", 0.2)]
    run = integrate(experiment(steps, {"A": 3.0}, until=20.0, solver=Solver("BDF", 1e-5, 1e-12)))
    found = verify(run, n_times=50)
    assert found.method == "Radau"
    assert found.rtol == pytest.approx(1e-6)
    # against the reference of a third: the difference is that of the first to a few per cent
    fine = integrate(experiment(steps, {"A": 3.0}, until=20.0, solver=Solver("Radau", 1e-11)))
    t = np.unique(np.concatenate([run.trajectory.times, np.linspace(0, 20.0, 50)]))
    off = np.abs(run.amounts(t) - fine.amounts(t)) / fine.amounts(t).max(axis=1)[:, None]
    gas, place = np.unravel_index(int(off.argmax()), off.shape)
    assert found.difference == pytest.approx(off.max(), rel=0.2)
    assert found.gas == run.system.gases[gas]
    assert 0.0 < found.time <= 20.0
    near = off[gas, np.searchsorted(t, found.time)]
    assert near > 0.8 * off.max()
    assert place > 0


def test_absolute_tolerances():
    """1e-20 of the total, or 1e-12 of a gas's own fill where that is less: for traces."""
    case = experiment([step("A + B -> C", 1.0)], {"A": 1e-10, "B": 2.0}, holds="pressure")
    system = build_system(case)
    atol = tolerances(system, Solver())
    a, b, c = (system.gases.index(gas) for gas in "ABC")
    assert atol[b] == pytest.approx(2e-20, rel=1e-9)
    assert atol[c] == pytest.approx(2e-20, rel=1e-9)
    assert atol[a] == pytest.approx(2e-20, rel=1e-9)
    loose = tolerances(system, Solver(atol=1e-9))
    assert loose[a] == pytest.approx(1e-22, rel=1e-9)
    assert loose[b] == pytest.approx(2e-12, rel=1e-9)
    assert loose[c] == pytest.approx(2e-9, rel=1e-9)


def test_small_mechanisms_are_compiled_and_large_ones_are_not():
    def reader(n):
        steps = [step(f"G{i} -> G{i + 1}", 1.0) for i in range(n)]
        return type(equations_for(build_system(experiment(steps, {"G0": 1.0})))).__name__

    assert reader(49) == "CompiledEquations"
    assert reader(50) == "ArrayEquations"


def test_an_open_run_of_arrhenius_steps_counts_its_work():
    run = integrate(experiment([step("A -> B", Arrhenius(si(1e3), si(20e3)))], {"A": 1.0}))
    counters = run.counters
    n = sum(len(s.pieces) for s in run.trajectory.stretches)
    assert counters.n_steps >= n
    assert counters.nfev > counters.n_steps
    assert counters.nlu >= 2 * counters.njev > 0
    assert run.message == "stopped when 99.9 % of A was converted"


def test_an_open_run_does_not_end_before_the_last_break():
    """At rest after some 50 s; but a lamp, or a program, may still change what rest is."""
    ramp = Program(((si(0.0), si(300.0)), (si(400.0), si(300.0)), (si(500.0), si(310.0))))
    steps = [step("A -> B", 0.3), step("B -> A", 0.7)]
    run = integrate(experiment(steps, {"A": 1.0}, temperature=ramp, watch="A"))
    assert run.status is Status.SETTLED
    assert run.end == 500.0


def test_a_programmed_piston_has_no_equation_of_state_to_leave():
    """There T follows the clock, and a state alone does not say what its volume should be."""
    ramp = Program(((si(0.0), si(300.0)), (si(10.0), si(400.0))))
    run = chain(temperature=ramp, holds="pressure")
    assert run.invariants.volume is None
    assert chain(holds="pressure").invariants.volume is not None
