"""The core and the fits beside independent fitting libraries, and what it says when it cannot."""

from __future__ import annotations

import lmfit
import numpy as np
import pytest
from measured_runs import case_text, csv, loaded, made_up, measured
from scipy.optimize import curve_fit

from meanfree.constants import R
from meanfree.errors import ComputationError, InputError
from meanfree.measured.covariances import covariance
from meanfree.measured.fits import FitRequest
from meanfree.measured.fitting import fit
from meanfree.measured.least_squares import Scales, solve
from meanfree.measured.parameters import Asked, Prior
from meanfree.measured.profiles import profile
from meanfree.measured.signals import Signal

T = np.linspace(0.0, 3000.0, 25)


def noisy(values, size, seed):
    return values + np.random.default_rng(seed).normal(0.0, size, len(values))


def one_step(folder, reaction, k, fill="1 mol/m^3"):
    return loaded(folder, case_text(reaction, f'law = "fixed"\nk = "{k}"', fill, 300.0), {})


# Integrated laws of a second gas kept simple: c(t; k, c0) for loss by one event
LAWS = {
    "A -> B": ("1e-3 1/s", lambda t, k, c0: c0 * np.exp(-k * t)),
    "2 A -> B": ("1e-3 m^3/mol/s", lambda t, k, c0: c0 / (1 + 2 * k * c0 * t)),
    "3 A -> B": ("1e-3 m^6/mol^2/s", lambda t, k, c0: c0 / np.sqrt(1 + 6 * k * c0**2 * t)),
}


@pytest.mark.parametrize("known", [None, 0.02])
@pytest.mark.parametrize("reaction", LAWS)
def test_beside_curve_fit_and_lmfit(tmp_path, reaction, known):
    """Estimates to 1e-6, standard errors to 1e-4: all three minimise the same sum."""
    start, law = LAWS[reaction]
    y = noisy(law(T, 7e-4, 1.1), 0.02, 5)
    run = made_up(
        one_step(tmp_path, reaction, start),
        T,
        y,
        signal=Signal("concentration", ("A",)),
        sd=known,
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.k"), Asked("fill.gases.A"))))
    k, c0 = found.estimates
    sd = None if known is None else np.full(len(T), known)
    options = {"p0": [1e-3, 1.0], "ftol": 1e-14, "xtol": 1e-14, "gtol": 1e-14}
    values, cov = curve_fit(law, T, y, sigma=sd, absolute_sigma=known is not None, **options)
    assert [k.value, c0.value] == pytest.approx(values, rel=1e-6)
    assert [k.stderr, c0.stderr] == pytest.approx(np.sqrt(np.diag(cov)), rel=1e-4)
    r = cov[0, 1] / np.sqrt(cov[0, 0] * cov[1, 1])
    assert found.correlation[0, 1] == pytest.approx(r, abs=1e-4)
    theirs = lmfit.Model(law).fit(
        y,
        t=T,
        k=1e-3,
        c0=1.0,
        weights=None if sd is None else 1 / sd,
        scale_covar=known is None,
        fit_kws={"ftol": 1e-14, "xtol": 1e-14, "gtol": 1e-14},
    )
    assert [k.value, c0.value] == pytest.approx(list(theirs.best_values.values()), rel=1e-6)
    # MINPACK's one-sided differences: their errors are good to four digits or so
    errors = [theirs.params["k"].stderr, theirs.params["c0"].stderr]
    assert [k.stderr, c0.stderr] == pytest.approx(errors, rel=1e-4)
    if known is not None:
        assert found.chi_square == pytest.approx(theirs.chisqr, rel=1e-8)


def test_profile_interval_beside_lmfit(tmp_path):
    """lmfit's conf_interval walks the same profile, with an F test of one parameter."""
    start, law = LAWS["2 A -> B"]
    y = noisy(law(T, 7e-4, 1.1), 0.1, 8)
    run = made_up(
        one_step(tmp_path, "2 A -> B", start),
        T,
        y,
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.k"), Asked("fill.gases.A"))))
    theirs = lmfit.Model(law).fit(y, t=T, k=1e-3, c0=1.0)
    limits = theirs.conf_interval(sigmas=[0.95])
    for one, name in zip(found.estimates, ("k", "c0"), strict=True):
        low, _, high = (value for _, value in limits[name])
        # theirs stops its search for the limits at 1e-4 or so of them
        assert (one.low, one.high) == pytest.approx((low, high), rel=1e-3)
    # not the symmetric interval: k is known less well above than below
    k = found.estimates[0]
    assert k.high - k.value > 1.1 * (k.value - k.low)


def test_profile_of_a_straight_line_is_students_interval():
    """For a linear model the profile is a parabola: limits at t standard errors exactly."""
    x = np.linspace(0.0, 1.0, 9)
    y = noisy(2 + 3 * x, 0.1, 3)

    def residuals(p):
        return y - p[0] - p[1] * x

    scales = Scales.of([1.0, 1.0])
    solution = solve(residuals, scales)
    cov = covariance(solution)
    for place in range(2):
        walked = profile(residuals, solution, cov, place, 4.0, scales)
        half = 2.0 * np.sqrt(cov[place, place])
        middle = solution.values[place]
        assert (walked.low, walked.high) == pytest.approx((middle - half, middle + half), rel=1e-7)
        assert walked.excess == pytest.approx(((walked.at - middle) / half * 2) ** 2, abs=1e-6)


def test_bounds_are_kept_and_said(tmp_path):
    start, law = LAWS["A -> B"]
    run = made_up(
        one_step(tmp_path, "A -> B", start),
        T,
        law(T, 7e-4, 1.0) + 1e-3 * np.cos(T),
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.k", low=9e-4, high=2e-3),)))
    one = found.estimates[0]
    assert one.value == pytest.approx(9e-4, rel=1e-9)
    assert one.at_bound
    assert "steps.d.k rests on its bound, 0.0009 1/s." in found.findings


def test_a_prior_pulls_as_hard_as_its_deviation_says(tmp_path):
    """A linear case by hand: weighted mean of what the readings say and what was known."""
    run = made_up(
        one_step(tmp_path, "A -> B", "1e-9 1/s"),
        [0, 1, 2, 3],
        [1.1, 0.9, 1.0, 1.2],
        sd=0.1,
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
    )
    free = fit(FitRequest((run,), (Asked("fill.gases.A"),)))
    pulled = fit(FitRequest((run,), (Asked("fill.gases.A", prior=Prior(2.0, 0.05)),)))
    assert free.estimates[0].value == pytest.approx(1.05, rel=1e-8)
    weights = np.array([4 / 0.1**2, 1 / 0.05**2])
    assert pulled.estimates[0].value == pytest.approx(
        weights @ [1.05, 2.0] / weights.sum(), rel=1e-8
    )
    assert pulled.estimates[0].stderr == pytest.approx(weights.sum() ** -0.5, rel=1e-6)


def test_robust_loss_forgets_an_outlier(tmp_path):
    start, law = LAWS["A -> B"]
    y = noisy(law(T, 7e-4, 1.0), 0.005, 4)
    spoilt = y.copy()
    spoilt[7] += 0.5
    case = one_step(tmp_path, "A -> B", start)
    signal = Signal("concentration", ("A",))
    asked = (Asked("steps.d.k"), Asked("fill.gases.A"))

    def k(values, loss):
        run = made_up(case, T, values, signal=signal, unit="mol/m^3")
        return fit(FitRequest((run,), asked, loss=loss)).estimates[0]

    clean, robust = k(y, "linear"), k(spoilt, "soft_l1")
    assert abs(k(spoilt, "linear").value - clean.value) > 3 * clean.stderr
    assert abs(robust.value - clean.value) < clean.stderr
    assert 0.5 * clean.stderr < robust.stderr < 2 * clean.stderr


def test_further_starts_find_the_lower_minimum():
    """Two minima by construction: from 0 the near one, with more starts the deep one."""

    def residuals(p):
        x = p[0]
        return np.array([(x - 4) * (x + 1) * 0.5, 0.3 * (x - 4)])

    near = solve(residuals, Scales.of([-1.5]))
    both = solve(residuals, Scales.of([-1.5]), starts=[np.array([3.0])])
    assert near.values[0] < 0
    assert both.values[0] == pytest.approx(4.0, abs=1e-6)
    assert len(both.minima) == 2


def test_what_the_readings_do_not_depend_on_is_said(tmp_path):
    """A consecutive step far too slow to matter."""
    text = case_text("A -> B", 'law = "fixed"\nk = "1e-3 1/s"', "1 mol/m^3", 300.0)
    text = text.replace('["A", "B"]', '["A", "B", "C"]')
    text += '\n[[steps]]\nname = "slow"\nreaction = "B -> C"\nlaw = "fixed"\nk = "1e-3 1/s"\n'
    run = made_up(
        loaded(tmp_path, text, {}),
        T,
        noisy(np.exp(-1e-3 * T), 0.01, 6),
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.k"), Asked("steps.slow.k"))))
    assert (
        "The readings do not depend on steps.slow.k: they say nothing about it. "
        "Take it out of the parameters, or give it a prior." in found.findings
    )
    assert np.isinf(found.estimate("steps.slow.k").stderr)
    # what is known stays known
    alone = fit(FitRequest((run,), (Asked("steps.d.k"),))).estimates[0]
    assert found.estimate("steps.d.k").value == pytest.approx(alone.value, rel=1e-6)


def test_what_only_a_combination_is_known_of_is_said(tmp_path):
    """A and Ea from one temperature."""
    text = case_text("A -> B", 'law = "arrhenius"\nA = "1e9 1/s"\nEa = "70 kJ/mol"', "1 bar", 300.0)
    c0 = 1e5 / (R * 300)
    k = 1e9 * np.exp(-70e3 / (R * 300))
    t = T * 1e-3 / k
    run = made_up(
        loaded(tmp_path, text, {}),
        t,
        noisy(c0 * np.exp(-k * t), 0.01 * c0, 6),
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.A"), Asked("steps.d.Ea"))))
    assert found.findings[0] == (
        "The readings do not determine steps.d.A and steps.d.Ea separately: "
        "only a combination of them. Hold one at a known value, or give it a prior."
    )


def test_an_open_interval_is_said(tmp_path):
    """A reaction that is over before the first reading: k has a lower limit only."""
    run = made_up(
        one_step(tmp_path, "A -> 2 B", "0.5 1/s"),
        [10, 20, 30, 40, 50],
        np.array([1, -1, 0.5, -0.5, 0]) * 1e-3 + 2.0,
        signal=Signal("concentration", ("B",)),
        sd=2e-3,
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.k"),)))
    one = found.estimates[0]
    assert one.high == np.inf
    # exp(-k t) = 1.96 x 2e-3/2 at the first reading, or so
    assert 0.3 < one.low < 1.0
    assert (
        "The readings do not bound steps.d.k from above; only its lower limit means anything."
        in found.findings
    )


def test_refusals(tmp_path):
    case = one_step(tmp_path, "A -> B", "1e-3 1/s")
    signal = Signal("concentration", ("A",))
    run = made_up(case, [0, 1], [1.0, 0.9], signal=signal, unit="mol/m^3")

    def refused(*asked, runs=(run,)):
        with pytest.raises(InputError) as caught:
            fit(FitRequest(runs, tuple(Asked(one) for one in asked)))
        return [str(p) for p in caught.value.problems]

    assert refused("steps.d.k", "fill.gases.A") == [
        "fit.parameters: found 2 parameters for 2 readings; expected at most 1, or more readings"
    ]
    assert refused("steps.d.kk", "steps.d.k", "steps.d.k", "data.x.time_offset") == [
        'fit.parameters.0: found "steps.d.kk", an unknown address; expected one of steps.d.k',
        "fit.parameters.2: found steps.d.k; expected each address once",
        'fit.parameters.3: found "data.x.time_offset", of a run that is not there; '
        "expected one of the runs run",
    ]
    other = made_up(
        case,
        [0, 1],
        [1.0, 0.9],
        signal=signal,
        unit="mol/m^3",
        name="other",
        conditions={"fill.gases.A": "2 mol/m^3"},
    )
    assert refused("fill.gases.A", runs=(run, other)) == [
        'fit.parameters.0: found "fill.gases.A", which the conditions of other set; expected the '
        'address of one run, such as "data.other.fill.gases.A"'
    ]
    assert refused("signal_offset", "data.other.signal_offset", runs=(run, other)) == [
        "fit.parameters: found data.other.signal_offset beside signal_offset; "
        "expected one of the two"
    ]


def test_a_fit_that_finds_nothing_says_so(tmp_path):
    """Readings of a gas whose equations cannot be integrated with any k tried."""
    from dataclasses import replace

    run = made_up(
        one_step(tmp_path, "A -> B", "1e-3 1/s"),
        T,
        np.full(len(T), np.nan),
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
        sd=1.0,
    )
    with pytest.raises(ComputationError, match="The fit failed: no minimum was found"):
        fit(replace(FitRequest((run,), (Asked("steps.d.k"),)), starts=2))


def test_offsets(tmp_path):
    """A clock that started 5 min early and a gauge that reads 2 mmHg too much."""
    text = (
        case_text()
        + """
[[data]]
file = "run.csv"
time = { column = "t", unit = "min" }
signal = { column = "p", unit = "mmHg", is = "total pressure" }
[fit]
parameters = ["steps.d.k", "time_offset", "signal_offset"]
"""
    )
    k = 0.9 / 6e4
    t = np.linspace(5, 90, 30)
    p0, size = 632 * 133.322387415, 133.322387415
    c0 = p0 / (R * 599.15)
    p = 0.5 * p0 * (1 + 1 / (1 + k * c0 * 60 * (t - 5))) / size + 2
    data = measured(tmp_path, text, {"run.csv": csv({"t": t, "p": noisy(p, 1e-4, 1)})})
    found = fit(data.request)
    # readings good to 1e-4 mmHg leave this much
    assert found.estimate("steps.d.k").value == pytest.approx(0.9, rel=1e-4)
    assert found.estimate("time_offset").value == pytest.approx(5.0, abs=1e-3)
    assert found.estimate("signal_offset").value == pytest.approx(2.0, abs=1e-2)


@pytest.mark.parametrize("decades", [-11, -6, -3, 3, 6, 11])
def test_a_guess_that_is_off_by_decades(tmp_path, decades):
    """Nothing reacts, or everything at once: no slope to follow, yet the same answer."""
    _, law = LAWS["2 A -> B"]
    y = noisy(law(T, 7e-4, 1.0), 0.01, 5)
    run = made_up(
        one_step(tmp_path, "2 A -> B", f"{7e-4 * 10.0**decades!r} m^3/mol/s"),
        T,
        y,
        signal=Signal("concentration", ("A",)),
        unit="mol/m^3",
    )
    found = fit(FitRequest((run,), (Asked("steps.d.k"),))).estimates[0]
    values, _ = curve_fit(lambda t, k: law(t, k, 1.0), T, y, p0=[7e-4], xtol=1e-14)
    assert found.value == pytest.approx(values[0], rel=1e-6)
