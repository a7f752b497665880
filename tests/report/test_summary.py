"""The numbers of the summary against closed forms and an independent quadrature."""

from __future__ import annotations

import json
import math

import pytest
from laboratory import step
from planned_cases import fixed, planned, quantity
from scipy.integrate import quad
from small_runs import dimerisation

from meanfree.constants import R
from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate
from meanfree.rates.photolysis import Photolysis
from meanfree.report.answers import answers
from meanfree.report.run_models import RunSummary
from meanfree.report.summary import summarise
from meanfree.sourced import Sourced
from meanfree.units import rate_constant, si_unit

# The integrator runs at a relative tolerance of 1e-8 and reaches about 1e-9 on smooth problems;
# a time at which a steep curve crosses a level is as good as the curve. 1e-7 leaves a decade.
TOLERANCE = 1e-7
K_LOSS = 0.866e-3 / 60  # m^3/mol/s, for the loss of the monomer
C0 = 1e5 / (R * 599.0)


def summary_of(run: Run) -> RunSummary:
    return summarise(run, case="case.toml", case_sha256="0" * 64, version="0")


def test_second_order_in_a_piston_against_the_closed_form(dimer_run: Run) -> None:
    # k C0 t = (1 + e) X/(1 - X) + e ln(1 - X), e = -1/2 for 2 A -> A2: Levenspiel, Chemical
    # Reaction Engineering, 3rd ed., chapter 3 (second order, varying volume).
    answer = summary_of(dimer_run).gas("A")
    assert answer is not None
    for entry in answer.reaction_times:
        X = entry.conversion
        expected = (0.5 * X / (1 - X) - 0.5 * math.log1p(-X)) / (K_LOSS * C0)
        assert entry.time_s == pytest.approx(expected, rel=TOLERANCE)
    assert answer.time_to_50_percent_s == pytest.approx(48.7 * 60, rel=1e-3)  # as rounded


def test_second_order_in_a_rigid_vessel_doubles_each_half_life() -> None:
    # t_half = 1/(k c) with c halved each time: any textbook of kinetics.
    answer = summary_of(integrate(dimerisation("volume"))).gas("A")
    assert answer is not None
    done = [t for t in answer.half_lives_s if t is not None]
    assert done[0] / 60 == pytest.approx(57.5, rel=1e-3)
    for place, lasted in enumerate(done):
        assert lasted == pytest.approx(2**place / (K_LOSS * C0), rel=TOLERANCE)
    assert answer.half_lives_s[-1] is None  # 99.9 % is short of the tenth half-life
    assert len(done) == 9


def test_volume_of_the_piston_follows_the_moles(dimer_run: Run) -> None:
    vessel = summary_of(dimer_run).vessel
    # 99.9 % of A gone leaves (1 - 0.999/2) of the moles.
    assert vessel.final_volume_m3 / vessel.initial_volume_m3 == pytest.approx(0.5005, rel=1e-9)
    assert vessel.final_pressure_Pa == pytest.approx(vessel.initial_pressure_Pa, rel=1e-9)


def test_reversible_decomposition_against_quadrature(nocl_run: Run) -> None:
    # t(X) is the integral of dX c0 / (2 (k c_A^2 - k' c_B^2 c_C)), all in one variable.
    summary = summary_of(nocl_run)
    answer = summary.gas("NOCl")
    assert answer is not None
    forward, reverse = (row.k for row in summary.rate_constants)
    c0 = summary.amounts[0].start_mol / summary.vessel.initial_volume_m3

    def slowness(X: float) -> float:
        a, b, c = c0 * (1 - X), c0 * X, 0.5 * c0 * X
        return c0 / (2 * (forward * a**2 - reverse * b**2 * c))

    for entry in answer.reaction_times:
        if entry.time_s is not None:
            expected, _ = quad(slowness, 0, entry.conversion, epsrel=1e-12)
            assert entry.time_s == pytest.approx(expected, rel=TOLERANCE)
    quarter = answer.reaction_times[1].time_s
    assert quarter is not None
    assert 14.0 < quarter / 60 < 15.0
    assert [e.conversion for e in answer.reaction_times if e.time_s is None] == [
        0.5,
        0.75,
        0.9,
        0.99,
    ]


def test_conversion_that_goes_back() -> None:
    """A lamp makes B, which goes back in the dark: the most is where the lamp goes out.

    Lit: dx/dt = J (1 - x) - k x, so x = J/(J + k) (1 - exp(-(J + k) t)); dark: exp(-k t).
    """
    J, k, lit, end = 2e-3, 1e-3, 300.0, 3000.0
    word = rate_constant(1.0)
    lamp = Photolysis(Sourced(J, si_unit(word), "test", word), off=(quantity(lit, "time"),))
    steps = [step("A -> B", lamp, "lamp"), step("B -> A", fixed(k), "dark")]
    run = integrate(planned(steps, {"A": 1.0}, until=end, watch="A"))
    summary = summary_of(run)
    most = J / (J + k) * -math.expm1(-(J + k) * lit)
    gas = summary.gas("A")
    # A run at rtol 1e-8; the highest point is a kink, looked for within steps.
    assert gas.highest_conversion == pytest.approx(most, rel=1e-7)
    assert gas.conversion_at_end == pytest.approx(most * math.exp(-k * (end - lit)), rel=1e-6)
    said = {row.question: row for row in answers(run, summary)}
    assert said["90 % of A converted"].note == "at most 39.6 % on the way"
    assert said["How far it goes"].note.startswith("at most 39.6 % on the way; ")


def test_equilibrium_is_where_the_rates_balance(nocl_run: Run) -> None:
    summary = summary_of(nocl_run)
    answer = summary.gas("NOCl")
    assert answer is not None
    X = answer.equilibrium_conversion
    assert X is not None
    c0 = summary.amounts[0].start_mol / summary.vessel.initial_volume_m3
    forward, reverse = (row.k for row in summary.rate_constants)
    # Kc = [NO]^2 [Cl2] / [NOCl]^2, both sides from different code.
    assert (X / (1 - X)) ** 2 * 0.5 * X * c0 == pytest.approx(forward / reverse, rel=1e-9)
    # the run stops 99.9 % of the way there
    assert answer.conversion_at_end == pytest.approx(0.999 * X, rel=1e-5)
    # one mole of gas more for every two of NOCl
    share = summary.amounts[0].start_mol / sum(a.start_mol for a in summary.amounts)
    ratio = summary.vessel.final_pressure_Pa / summary.vessel.initial_pressure_Pa
    assert ratio == pytest.approx(1 + 0.5 * share * answer.conversion_at_end, rel=1e-8)


def test_what_is_not_reached_is_null_and_keys_are_stable(nocl_run: Run) -> None:
    text = summary_of(nocl_run).to_json()
    data = json.loads(text)
    assert data["schema"] == "meanfree-run-1"
    assert data["gases"][0]["time_to_50_percent_s"] is None
    assert data["gases"][0]["half_lives_s"] == [None]
    assert data["equilibrium"]["why_none"] is None
    assert RunSummary.model_validate_json(text) == summary_of(nocl_run)


def test_a_one_way_run_says_why_it_has_no_equilibrium(dimer_run: Run) -> None:
    data = json.loads(summary_of(dimer_run).to_json())
    assert data["equilibrium"]["why_none"] == "one-way steps: dimerisation"
    assert data["gases"][0]["equilibrium_conversion"] is None


def test_rate_constant_counts_events_and_as_the_case_does(dimer_run: Run) -> None:
    row = summary_of(dimer_run).rate_constants[0]
    assert row.counts == "events"
    assert row.k == pytest.approx(K_LOSS / 2, rel=1e-12)
    assert (row.counts_in_case, row.k_in_case_unit) == ("loss of A", "L/mol/min")
    assert row.k_in_case == pytest.approx(0.866, rel=1e-12)


def test_rate_constants_are_those_that_the_run_used(nocl_run: Run) -> None:
    summary = summary_of(nocl_run)
    c = nocl_run.concentrations(600.0)[:, 0]
    a, b, d = (c[nocl_run.index(name)] for name in ("NOCl", "NO", "Cl2"))
    rates = nocl_run.rates(600.0)[:, 0]
    forward, reverse = (row.k for row in summary.rate_constants)
    assert rates == pytest.approx([forward * a**2, reverse * b**2 * d], rel=1e-12)
