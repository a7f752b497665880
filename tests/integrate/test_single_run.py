"""Single runs against equations written out by hand, and what must not change a run."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from laboratory import experiment, si, step
from scipy.integrate import solve_ivp

from meanfree.constants import R
from meanfree.errors import ComputationError
from meanfree.experiment.mechanism import Bath
from meanfree.experiment.plan import Solver
from meanfree.experiment.temperature import Adiabatic, Exchange, Program
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.identity import find_gas
from meanfree.integrate.run import Status
from meanfree.integrate.single import integrate
from meanfree.integrate.verify import verify
from meanfree.rates.arrhenius import Arrhenius

# Radau at rtol 1e-8 reaches about 1e-9 on problems of this kind; ten times that is allowed.
REACHED = 1e-8


def gas(name):
    found = find_gas(name)
    return dataclasses.replace(found, thermochemistry=thermochemistry_of(found))


def arrhenius(A, Ea):
    return Arrhenius(si(A), si(Ea))


@pytest.mark.parametrize("holds", ["volume", "pressure"])
@pytest.mark.parametrize("wall", [None, 0.2])
def test_heat_exchange_against_a_balance_written_out(holds, wall):
    """Cyclopropane -> propene in argon, heat lost to the surroundings; n, V and T by hand."""
    gases = [gas(name) for name in ("c-C3H6", "propene", "Ar")]
    A, Ea, G, Ts, volume, T0 = 1.5e15, 272e3, 0.02, 950.0, 2e-3, 1000.0
    mode = Exchange(si(T0), si(Ts), si(G), None if wall is None else si(wall))
    run = integrate(
        experiment(
            [step("c-C3H6 -> propene", arrhenius(A, Ea))],
            {"c-C3H6": 3.0, "Ar": 10.0},
            holds=holds,
            volume=volume,
            temperature=mode,
            gases=gases,
            until=0.3,
        )
    )
    n0 = np.array([3.0, 0.0, 10.0]) * volume
    p0 = n0.sum() * R * T0 / volume

    def by_hand(t, y):
        n, T = y[:3], y[3]
        rate = A * np.exp(-Ea / (R * T)) * n[0]  # mol/s: first order, whatever the volume
        H = [float(g.thermochemistry.enthalpy(T)) for g in gases]
        Cp = np.array([float(g.thermochemistry.heat_capacity(T)) for g in gases])
        capacity = n @ (Cp - R if holds == "volume" else Cp) + (wall or 0.0)
        return [-rate, rate, 0.0, (-rate * (H[1] - H[0]) + G * (Ts - T)) / capacity]

    hand = solve_ivp(by_hand, (0, 0.3), [*n0, T0], method="DOP853", rtol=1e-11, atol=1e-16)
    assert run.temperature(0.3)[0] == pytest.approx(hand.y[3, -1], rel=REACHED)
    assert run.amounts(0.3)[:, 0] == pytest.approx(hand.y[:3, -1], rel=REACHED, abs=1e-12)
    if holds == "pressure":
        V = hand.y[:3, -1].sum() * R * hand.y[3, -1] / p0
        assert run.volume(0.3)[0] == pytest.approx(V, rel=REACHED)
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-8


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_program_against_equations_written_out(holds):
    points = [(0.0, 300.0), (100.0, 450.0), (200.0, 400.0)]
    mode = Program(tuple((si(t), si(T)) for t, T in points))
    A, Ea = 5e3, 40e3
    run = integrate(
        experiment(
            [step("2 A -> B", arrhenius(A, Ea))],
            {"A": 20.0},
            holds=holds,
            temperature=mode,
            until=400.0,
        )
    )
    p0 = 20.0 * R * 300.0

    def by_hand(t, y):
        T = np.interp(t, *zip(*points, strict=True))
        V = 1.0 if holds == "volume" else y.sum() * R * T / p0
        rate = A * np.exp(-Ea / (R * T)) * (y[0] / V) ** 2 * V
        return [-2 * rate, rate]

    y, start = [20.0, 0.0], 0.0
    for end in (100.0, 200.0, 400.0):
        y = solve_ivp(by_hand, (start, end), y, method="Radau", rtol=1e-11, atol=1e-16).y[:, -1]
        start = end
        assert run.state(end)[:2, 0] == pytest.approx(y, rel=REACHED)
        assert run.temperature(end)[0] == pytest.approx(np.interp(end, *zip(*points, strict=True)))
    assert {100.0, 200.0} <= set(run.trajectory.times)


def test_dead_space_slows_a_reaction_and_takes_its_share():
    """c = n/(V + V_d T/T_d): the gas in the lines is out of the reaction's reach."""
    k, volume, dead, T, T_dead = 2e-3, 1e-3, 2e-4, 500.0, 250.0
    run = integrate(
        experiment(
            [step("A -> 2 B", k)], {"A": 5.0}, T=T, volume=volume, dead=(dead, T_dead), until=500.0
        )
    )
    hot = volume / (volume + dead * T / T_dead)
    assert run.remaining("A", 500.0)[0] == pytest.approx(np.exp(-k * hot * 500.0), rel=REACHED)
    n = run.amounts(500.0)[:, 0].sum()
    expected = n * R / (volume / T + dead / T_dead)
    assert run.pressure(500.0)[0] == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("order", [0.0, 0.5])
def test_low_orders_stop_at_zero_and_say_so(order):
    orders = (("A", order),) if order else ()
    run = integrate(experiment([step("A -> B", 0.1, stated_orders=orders)], {"A": 1.0}, until=60.0))
    # c0^(1-q)/((1-q) k), closed form
    end = 1 / ((1 - order) * 0.1)
    (name, time), *others = run.ran_out
    assert name == "A"
    assert not others
    # the level is 1e-8 of the total: for q = 1/2 the last sqrt(1e-8) of the time is missing
    assert time == pytest.approx(end, rel=2e-4)
    assert run.state(60.0)[0, 0] == pytest.approx(0.0, abs=1e-9)
    assert run.state(60.0)[1, 0] == pytest.approx(1.0, abs=1e-9)


def base(**options):
    steps = [
        step("A + B -> C", 0.4, "one"),
        step("2 C -> D", 0.7, "two"),
        step("D + M -> A + E", 0.05, "three", bath=Bath({"B": 3.0})),
    ]
    return experiment(steps, {"A": 1.0, "B": 2.0, "Ar": 0.5}, until=5.0, **options)


def ends(run, names=("A", "B", "C", "D", "E")):
    return [run.amounts(run.end)[run.index(name), 0] for name in names]


# Two runs of one problem differ by rounding that the step-size control amplifies up to its
# tolerance, 1e-8; they share almost all steps, so a hundredth of that is asked.
SAME = 1e-10


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_the_order_of_steps_and_gases_does_not_matter(holds):
    case = base(holds=holds)
    turned = dataclasses.replace(case, steps=case.steps[::-1], gases=case.gases[::-1])
    assert ends(integrate(turned)) == pytest.approx(ends(integrate(case)), rel=SAME)


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_a_step_split_in_two_is_the_same_step(holds):
    case = base(holds=holds)
    one = case.steps[0]
    halves = [dataclasses.replace(step("A + B -> C", 0.2), name=f"half {i}") for i in (1, 2)]
    assert one.reaction == halves[0].reaction
    split = dataclasses.replace(case, steps=(*halves, *case.steps[1:]))
    assert ends(integrate(split)) == pytest.approx(ends(integrate(case)), rel=SAME)


def test_labels_are_only_names():
    new = {"A": "Z", "B": "Y", "C": "lump", "D": "Q", "E": "E2"}
    steps = [
        step("Z + Y -> lump", 0.4),
        step("2 lump -> Q", 0.7),
        step("Q + M -> Z + E2", 0.05, bath=Bath({"Y": 3.0})),
    ]
    renamed = experiment(steps, {"Z": 1.0, "Y": 2.0, "Ar": 0.5}, until=5.0)
    assert ends(integrate(renamed), new.values()) == pytest.approx(
        ends(integrate(base())), rel=SAME
    )


def test_scaled_time():
    """Every k times 1000 is the same run in a thousandth of the time."""
    case = base()
    fast = [
        dataclasses.replace(s, law=dataclasses.replace(s.law, k=si(1000 * s.law.k.value)))
        for s in case.steps
    ]
    plan = dataclasses.replace(case.plan, until=si(5e-3))
    quick = dataclasses.replace(case, steps=tuple(fast), plan=plan)
    assert ends(integrate(quick)) == pytest.approx(ends(integrate(case)), rel=SAME)


def test_scaled_concentrations():
    """Concentrations times 10 and k over 10 is the same run; so is a larger vessel."""
    small = experiment([step("2 A -> B", 0.3)], {"A": 2.0}, until=10.0)
    large = experiment([step("2 A -> B", 0.03)], {"A": 20.0}, until=10.0, volume=7.0)
    a, b = integrate(small), integrate(large)
    assert a.remaining("A", 10.0) == pytest.approx(b.remaining("A", 10.0), rel=SAME)


def test_every_method_agrees_with_the_second():
    for method in ("Radau", "BDF", "LSODA"):
        run = integrate(base(solver=Solver(method)))
        checked = verify(run)
        assert checked.method == ("BDF" if method == "Radau" else "Radau")
        assert checked.rtol == pytest.approx(1e-9)
        # BDF and LSODA add up about ten tolerances (see the stiff problems).
        assert checked.difference < 1e-6
        assert checked.gas in "ABCDE"


def test_open_ended_runs_end_as_they_say():
    gone = integrate(experiment([step("A -> B", 0.3)], {"A": 1.0}))
    assert gone.status is Status.CONVERTED
    assert gone.conversion("A", gone.end)[0] == pytest.approx(0.999, rel=1e-10)
    assert gone.end == pytest.approx(np.log(1000) / 0.3, rel=REACHED)
    rest = integrate(experiment([step("A -> B", 0.3), step("B -> A", 0.7)], {"A": 1.0}))
    assert rest.status is Status.SETTLED
    # exp(-(k1 + k2) t) = 0.001, from the closed form of the reversible first-order step
    assert rest.end == pytest.approx(np.log(1000), rel=1e-6)
    assert rest.settled_state is not None
    assert rest.settled_state[:2] == pytest.approx([0.7, 0.3], rel=1e-8)


def test_an_open_ended_run_goes_on_to_the_last_row_asked_for():
    """And ends there, not wherever the step that passed it happened to end."""
    case = experiment([step("A -> B", 0.3)], {"A": 1.0})
    asked = dataclasses.replace(case.plan, report_at=(si(40.0), si(5.0)))
    run = integrate(dataclasses.replace(case, plan=asked))
    assert run.end == 40.0
    assert run.status is Status.CONVERTED
    assert run.remaining("A", 40.0)[0] == pytest.approx(np.exp(-12.0), rel=REACHED)
    early = dataclasses.replace(case.plan, report_at=(si(5.0),))
    assert integrate(dataclasses.replace(case, plan=early)).end == pytest.approx(
        np.log(1000) / 0.3, rel=REACHED
    )


@pytest.mark.parametrize("trace", [1e-14, 1e-18, 1e-24])
def test_half_lives_of_a_filled_trace_are_right(trace):
    """However little of the whole it is: pseudo-first order in a great excess of B."""
    run = integrate(experiment([step("A + B -> C", 0.5)], {"A": trace, "B": 2.0}))
    assert run.half_lives("A")[0].duration == pytest.approx(np.log(2), rel=REACHED)


def test_an_induction_period_is_not_taken_for_rest():
    """Autocatalysis from a seed of 1e-12: nothing seems to happen for most of the time."""
    run = integrate(experiment([step("A + B -> 2 B", 1.0)], {"A": 1.0, "B": 1e-12}))
    assert run.status is Status.CONVERTED
    # logistic growth: t(X) = ln(X/(1-X)/b)/(1+b), closed form
    expected = np.log(0.5 / 0.5 / 1e-12)
    assert run.reaction_time("A", 0.5) == pytest.approx(expected, rel=REACHED)


def test_a_vessel_in_which_nothing_happens():
    run = integrate(experiment([step("A -> B", 0.3)], {"Ar": 1.0}))
    assert run.status is Status.SETTLED
    assert run.consumed == ()


def test_half_lives_of_a_second_order_reaction_double():
    run = integrate(experiment([step("2 A -> B", 0.25)], {"A": 2.0}))
    halves = run.half_lives("A")
    first = 1 / (2 * 0.25 * 2.0)
    for entry in halves[:-1]:
        assert entry.duration == pytest.approx(first * 2 ** (entry.ordinal - 1), rel=REACHED)
        begun = first * (2 ** (entry.ordinal - 1) - 1)
        assert entry.start == pytest.approx(begun, rel=REACHED)
    assert halves[-1].duration is None
    assert len(halves) == 10


def test_thermal_runaway_keeps_its_energy():
    """A step of 272 kJ/mol that heats itself by more than a thousand kelvin."""
    gases = [gas(name) for name in ("c-C3H6", "propene")]
    run = integrate(
        experiment(
            [step("c-C3H6 -> propene", arrhenius(1.5e15, 272e3))],
            {"c-C3H6": 10.0},
            temperature=Adiabatic(si(900.0)),
            gases=gases,
        )
    )
    assert run.temperature(run.end)[0] > 1100
    assert run.invariants.energy is not None
    assert run.invariants.energy < 1e-8


def test_energies_are_not_used_where_they_are_not_known():
    """NOCl's heat capacity ends at 1000 K; a few kelvin more are said, many more are refused."""
    known = gas("NOCl")
    assert known.thermochemistry is not None
    assert known.thermochemistry.high == 1000.0
    gases = [known, gas("NO"), gas("Cl2")]

    def started_at(T, gases=gases):
        return experiment(
            [step("2 NO + Cl2 -> 2 NOCl", 1e-3)],
            {"NO": 2.0, "Cl2": 1e-3},
            temperature=Adiabatic(si(T)),
            gases=gases,
            until=1.0,
        )

    assert integrate(started_at(900.0)).notes == ()
    (note,) = integrate(started_at(1004.0)).notes
    assert note == (
        "the run went from 1004 to 1004 K, but energies of NOCl are known from 298 to 1000 K"
    )
    with pytest.raises(ComputationError) as caught:
        integrate(started_at(1100.0))
    assert str(caught.value).endswith(
        "energies of NOCl are known from 298 to 1000 K; "
        "extrapolate = true under [gases.NOCl] allows it"
    )
    allowed = [dataclasses.replace(known, extrapolate=True), *gases[1:]]
    assert len(integrate(started_at(1100.0, allowed)).notes) == 1


def test_a_failed_check_is_an_error(monkeypatch):
    """A right-hand side that loses matter is caught by the elements."""
    from meanfree.equations.arrays import ArrayEquations
    from meanfree.integrate import single

    class Leaking(ArrayEquations):
        def derivative(self, t, y, segment):
            out = super().derivative(t, y, segment)
            out[1] *= 0.99
            return out

    monkeypatch.setattr(single, "equations_for", Leaking)
    gases = [gas(name) for name in ("c-C3H6", "propene")]
    case = experiment([step("c-C3H6 -> propene", 0.3)], {"c-C3H6": 1.0}, gases=gases, until=10.0)
    with pytest.raises(ComputationError) as caught:
        integrate(case)
    assert str(caught.value).startswith("the run failed its own checks: C drifted by 9")


def test_an_explosion_is_reported_and_not_a_traceback():
    """2 A -> 3 A grows without bound in finite time, 1/(k c0)."""
    case = experiment([step("2 A -> 3 A", 1.0)], {"A": 1.0}, until=2.0)
    with pytest.raises(ComputationError) as caught:
        integrate(case)
    assert "at t = 1 s" in str(caught.value)
