"""Orders, lines and plots: what made-up readings were made from comes back."""

from __future__ import annotations

import math

import numpy as np
import pytest
from measured_runs import case_text, csv, loaded, made_up, measured
from scipy.optimize import curve_fit
from scipy.stats import linregress

from meanfree.constants import R
from meanfree.errors import InputError
from meanfree.gases.gas import Gas
from meanfree.gases.identity import find_gas
from meanfree.measured.analyses import analyse
from meanfree.measured.arrhenius_lines import temperature_series
from meanfree.measured.each_run import Point
from meanfree.measured.fits import FitRequest
from meanfree.measured.initial_rates import initial_rates
from meanfree.measured.orders import applicable, in_words, order_test
from meanfree.measured.parameters import Asked
from meanfree.measured.pseudo_first_order import pseudo_first_order
from meanfree.measured.relative_rates import relative_rate
from meanfree.measured.signals import Signal
from meanfree.measured.straight_lines import correlated_line, straight_line
from meanfree.rates.ceiling import ceiling

MOL = {"unit": "mol/m^3"}
A, B = Signal("concentration", ("A",)), Signal("concentration", ("B",))


def random(seed):
    return np.random.default_rng(seed)


@pytest.mark.parametrize("order", [0.5, 1.0, 1.5, 2.0])
def test_the_order_comes_back(tmp_path, order):
    """c^(1-q) = c0^(1-q) + (q-1) k t, readings of 0.3 %."""
    t = np.linspace(0, 1000, 30)
    k = 1e-3
    c = np.exp(-k * t) if order == 1 else (1 + (order - 1) * k * t) ** (1 / (1 - order))
    text = case_text("A -> B", 'law = "fixed"\nk = "2e-3 1/s"', "1 mol/m^3", 300.0)
    case = loaded(tmp_path, text, {})
    run = made_up(case, t, c + random(2).normal(0, 3e-3, len(t)), signal=A, sd=3e-3, **MOL)
    test = order_test(FitRequest((run,), (Asked("steps.d.k"),)), "d", "A")
    assert test.candidates[0].name == f"order {order:g}"
    assert test.low < order < test.high
    assert abs(test.order - order) < 3 * test.error
    assert f"Order in A: {test.order:.2f}" in in_words(test)


def test_order_beside_curve_fit(tmp_path):
    """The interval's half-width against the standard error of a three-parameter fit by scipy."""
    t = np.linspace(0, 3000, 40)
    c = 1 / (1 + 1e-3 * t) + random(3).normal(0, 5e-3, len(t))

    def law(t, ln_k, q, c0):
        return (c0 ** (1 - q) + (q - 1) * np.exp(ln_k) * t) ** (1 / (1 - q))

    values, cov = curve_fit(
        law, t, c, p0=[-7, 1.8, 1.0], sigma=np.full(40, 5e-3), absolute_sigma=True
    )
    text = case_text("A -> B", 'law = "fixed"\nk = "2e-3 1/s"', "1 mol/m^3", 300.0)
    run = made_up(loaded(tmp_path, text, {}), t, c, signal=A, sd=5e-3, **MOL)
    request = FitRequest((run,), (Asked("steps.d.k"), Asked("fill.gases.A")))
    test = order_test(request, "d", "A")
    assert test.order == pytest.approx(values[1], abs=1e-3)
    # a likelihood is no parabola: a tenth of the width
    assert test.error == pytest.approx(math.sqrt(cov[1, 1]), rel=0.1)


def test_the_order_of_a_table_is_refused(tmp_path):
    """Its ks all have the unit of the written order; one of them alone cannot take another."""
    law = 'law = "table"\npoints = [["290 K", "1e-3 1/s"], ["310 K", "2e-3 1/s"]]'
    case = loaded(tmp_path, case_text("A -> B", law, "1 mol/m^3", 300.0), {})
    run = made_up(case, np.array([0.0, 100, 300]), [1.0, 0.9, 0.7], signal=A, sd=0.01, **MOL)
    request = FitRequest((run,), (Asked("steps.d.points.0.k"),))
    assert applicable(request) is None
    with pytest.raises(InputError) as error:
        order_test(request, "d", "A")
    assert str(error.value) == (
        'fit.order.step: found "d" with law = "table", whose rate constant is several numbers; '
        'expected a step with one k or A, such as law = "fixed" or "arrhenius"'
    )


def test_straight_line_beside_scipy():
    x = np.array([0.0, 1, 2, 4, 5, 8])
    y = 1 + 2 * x + random(1).normal(0, 0.3, 6)
    ours, theirs = straight_line(x, y), linregress(x, y)
    assert (ours.slope, ours.intercept) == pytest.approx(
        (theirs.slope, theirs.intercept), rel=1e-12
    )
    assert ours.slope_error == pytest.approx(theirs.stderr, rel=1e-12)
    assert ours.intercept_error == pytest.approx(theirs.intercept_stderr, rel=1e-12)
    assert ours.r_squared == pytest.approx(theirs.rvalue**2, rel=1e-12)
    sd = np.array([0.1, 0.2, 0.1, 0.3, 0.2, 0.1])
    weighted = straight_line(x, y, sd)
    values, cov = np.polyfit(x, y, 1, w=1 / sd, cov="unscaled")
    assert (weighted.slope, weighted.intercept) == pytest.approx(tuple(values), rel=1e-12)
    assert weighted.slope_error == pytest.approx(math.sqrt(cov[0, 0]), rel=1e-12)
    origin = straight_line(x, y, through_origin=True)
    assert origin.slope == pytest.approx(x @ y / (x @ x), rel=1e-12)
    for bad, text in (
        ((x[:2], y[:2]), "2 points"),
        ((np.ones(4), np.arange(4)), "every x is the same"),
    ):
        with pytest.raises(ValueError, match=text):
            straight_line(*bad)


def two_gases(folder, a, b):
    text = case_text("A + B -> C", 'law = "fixed"\nk = "1e-3 m^3/mol/s"', "1 mol/m^3", 300.0)
    text = text.replace('{ A = "1 mol/m^3" }', f'{{ A = "{a} mol/m^3", B = "{b} mol/m^3" }}')
    folder.mkdir()
    return loaded(folder, text, {})


def decays(folder, extra, base=0.0, excess=200.0):
    """Runs with k' = 2e-3 [B] + extra."""
    runs = []
    for n, b in enumerate((1.0, 2.0, 3.0, 5.0)):
        rate = 2e-3 * b + extra
        t = np.linspace(0, 3 / rate, 25)
        y = b / excess * np.exp(-rate * t) + base
        y = y + random(n).normal(0, 2e-3 * b / excess, len(t))
        case = two_gases(folder / str(n), b / excess, b)
        runs.append(made_up(case, t, y, signal=A, name=f"run {n}", **MOL))
    return runs


def test_pseudo_first_order(tmp_path):
    found = pseudo_first_order(decays(tmp_path, 0.0), "A", "B")
    assert found.slope.low < 2e-3 < found.slope.high
    assert found.slope.error < 2e-5
    assert found.per_event == 1.0
    assert found.words[0].startswith("The intercept is zero within its interval")


def test_what_an_intercept_means(tmp_path):
    found = pseudo_first_order(decays(tmp_path, 1e-3, base=0.01), "A", "B", base_line=True)
    assert found.slope.low < 2e-3 < found.slope.high
    assert found.intercept.low < 1e-3 < found.intercept.high
    assert found.words[0].startswith("The intercept is above zero: A is also lost without B")
    assert "that is 3" in found.words[0]  # 33 % or so at the least B


def test_partner_that_is_not_in_excess(tmp_path):
    found = pseudo_first_order(decays(tmp_path, 0.0, excess=4.0), "A", "B")
    assert found.words[1].startswith("B is only 4 times A in one run")


def test_relative_rate(tmp_path):
    """Two gases lost to an unknown partner whose concentration falls: ratio 2.5."""
    text = case_text("A -> C", 'law = "fixed"\nk = "1e-3 1/s"', "1 mol/m^3", 300.0)
    text = text.replace('["A", "C"]', '["A", "B", "C"]').replace(
        '{ A = "1 mol/m^3" }', '{ A = "1 mol/m^3", B = "1 mol/m^3" }'
    )
    case = loaded(tmp_path, text, {})
    t = np.linspace(0, 1000, 15)
    exposure = 1 - np.exp(-2e-3 * t)
    y, x = np.exp(-2.5 * exposure), np.exp(-exposure)
    noise = random(5).normal(0, 2e-3, (2, len(t)))
    runs = [
        made_up(case, t, y + noise[0], signal=A, sd=2e-3, name="a", **MOL),
        made_up(case, t, x + noise[1], signal=B, sd=2e-3, name="b", **MOL),
    ]
    found = relative_rate(runs, "A", "B", 4e-12, 1.2)
    assert found.ratio.low < 2.5 < found.ratio.high
    assert found.ratio.error < 0.02
    assert found.k is not None
    assert found.k.value == pytest.approx(found.ratio.value * 4e-12)
    # the reference's factor of 1.2 rules: 1.96 ln 1.2
    assert found.k.high / found.k.value == pytest.approx(1.2**1.96, rel=0.01)
    assert found.words == ("A free intercept is zero within its interval, as it should be.",)
    with pytest.raises(InputError, match="no runs of A and C at the same times"):
        relative_rate(runs, "A", "C")


def test_initial_rates(tmp_path):
    """Second order in A, from the first tenth of the reaction."""
    runs = []
    for n, c0 in enumerate((1.0, 2.0, 4.0, 8.0)):
        (tmp_path / str(n)).mkdir()
        law = 'law = "fixed"\nk = "1e-3 m^3/mol/s"'
        case = loaded(tmp_path / str(n), case_text(law=law, fill=f"{c0} mol/m^3", T=300), {})
        t = np.linspace(0, 200 / c0, 21)
        c = c0 / (1 + 1e-3 * c0 * t) + random(n).normal(0, 1e-4 * c0, len(t))
        runs.append(made_up(case, t, c, signal=A, sd=1e-4 * c0, name=str(n), **MOL))
    found = initial_rates(runs, "A", until=None)
    assert found.order.low < 2 < found.order.high
    # loss counts: -dc/dt = 1e-3 c^2; a parabola leaves the third order out, 1 % here
    assert math.exp(found.ln_k.value) == pytest.approx(1e-3, rel=0.03)
    assert len(found.words) == 1


def test_initial_rates_from_too_long_a_stretch(tmp_path):
    """Second order to three quarters of conversion is no parabola: the order is off and told so."""
    runs = []
    for n, c0 in enumerate((1.0, 2.0, 4.0)):
        (tmp_path / str(n)).mkdir()
        law = 'law = "fixed"\nk = "1e-3 m^3/mol/s"'
        case = loaded(tmp_path / str(n), case_text(law=law, fill=f"{c0} mol/m^3", T=300), {})
        t = np.linspace(0, 750, 21)
        c = c0 / (1 + 1e-3 * c0 * t) + random(n).normal(0, 1e-3, len(t))
        runs.append(made_up(case, t, c, signal=A, sd=1e-3, name=f"fill {n}", **MOL))
    found = initial_rates(runs, "A", until=750.0)
    assert found.order.value < 1.8
    assert [one.off > 0 for one in found.rates] == [True, True, True]
    # a cubic takes back the larger part of what the parabola lacks
    one = found.rates[2]
    assert one.rate < one.rate * (1 + one.off) < 1e-3 * 16
    assert found.words[1].startswith(
        "Up to there the readings of fill 0, fill 1, fill 2 bend more than a parabola can: "
        "initial rates are off by as much as "
    )


def test_arrhenius_beside_curve_fit():
    """A weighted fit of ln k, by another routine in another form."""
    T = np.array([400.0, 450, 500, 550, 600])
    sd = np.array([0.05, 0.04, 0.03, 0.04, 0.05])
    ln_k = 20 - 80e3 / (R * T) + sd * np.array([1, -1, 0.5, 0.3, -0.8])
    points = [
        Point("x", float(t), float(np.exp(k)), float(s), None)
        for t, k, s in zip(T, ln_k, sd, strict=True)
    ]
    values, cov = curve_fit(
        lambda T, a, E: a - E / (R * T), T, ln_k, p0=[19, 7e4], sigma=sd, absolute_sigma=True
    )
    found = temperature_series("d", points)
    assert found.Ea.value == pytest.approx(values[1], rel=1e-7)
    assert found.ln_A.value == pytest.approx(values[0], rel=1e-7)
    assert found.covariance == pytest.approx(cov, rel=1e-5)
    assert found.Ea.high - found.Ea.value == pytest.approx(
        1.959964 * math.sqrt(cov[1, 1]), rel=1e-5
    )
    assert found.centres is None
    assert found.words == (found.words[0],)
    assert found.words[0].startswith("The points show no curvature beyond their scatter")


def test_line_of_centres_comes_back_with_the_diameters_uncertainty():
    gas = find_gas("HI")
    T = np.linspace(550, 780, 9)
    limits = [ceiling((gas, gas), float(t)) for t in T]
    k = np.array([0.2 * one.Z for one in limits if one]) * np.exp(-180e3 / (R * T))
    points = [Point("x", float(t), float(one), 1e-6, None) for t, one in zip(T, k, strict=True)]
    found = temperature_series("d", points, (gas, gas), diameter_factor=1.2)
    assert found.centres is not None
    assert found.centres.threshold.value == pytest.approx(180e3, rel=1e-8)
    assert found.centres.steric.value == pytest.approx(0.2, rel=1e-6)
    # Z goes with d^2: x/÷ 1.2 in d is x/÷ 1.2^2 in P, at 1.96 deviations
    assert found.centres.steric.high / 0.2 == pytest.approx(1.2 ** (2 * 1.959964), rel=1e-4)
    # Ea = E0 + RT/2 in the middle; A over Z is sqrt(e) P there. A line through what is sqrt(T)
    # over a third of an octave is off by a hundredth of RT/2, about
    half = 0.5 * R * found.middle
    assert found.Ea.value == pytest.approx(180e3 + half, abs=0.02 * half)
    assert found.centres.a_over_z.value == pytest.approx(0.2 * math.exp(0.5), rel=2e-3)


def test_too_few_temperatures():
    points = [Point("x", 300.0, 1.0, 0.1, None), Point("y", 400.0, 2.0, 0.1, None)]
    with pytest.raises(InputError, match="rate constants of d at 2 temperatures"):
        temperature_series("d", points, (Gas.label("A"), Gas.label("A")))


def walls(folder, gas, wall):
    """Four bulbs of one fill: k = gas + wall S/V."""
    text = case_text("A -> B + C", 'law = "fixed"\nk = "1e-3 1/s"', "100 Pa", 300.0)
    text = text.replace('volume = "0.5 L"', 'volume = "2 L"\nshape = { form = "sphere" }')
    files = {}
    for n, litres in enumerate((2.0, 1.0, 0.3, 0.05)):
        V = litres * 1e-3
        k = gas + wall * (math.pi * (6 * V / math.pi) ** (2 / 3)) / V
        t = np.linspace(0, 2 / k, 20)
        p = 100 * (2 - np.exp(-k * t)) + random(n).normal(0, 0.2, len(t))
        files[f"{n}.csv"] = csv({"t": t, "p": p})
        text += f"""
[[data]]
file = "{n}.csv"
time = {{ column = "t", unit = "s" }}
signal = {{ column = "p", unit = "Pa", is = "total pressure" }}
[data.conditions]
"vessel.volume" = "{litres} L"
"""
    text += '[fit]\n[[fit.analyses]]\nkind = "wall"\nstep = "d"\n'
    return analyse(measured(folder, text, files).plan).walls[0]


def test_walls_come_back(tmp_path):
    found = walls(tmp_path, 5e-4, 2e-5)
    assert found.gas.low < 5e-4 < found.gas.high
    assert found.wall.low < 2e-5 < found.wall.high
    assert found.words.startswith("The walls take part: ")
    V = 2e-3
    sphere = math.pi * (6 * V / math.pi) ** (2 / 3) / V
    assert found.shares[0] == pytest.approx(2e-5 * sphere / (5e-4 + 2e-5 * sphere), rel=0.05)


def test_no_wall_is_said(tmp_path):
    found = walls(tmp_path, 1e-3, 0.0)
    assert found.words.startswith("No wall is seen: the slope is zero within its interval")
    assert found.probability > 0.01


def test_a_line_with_errors_that_go_together():
    """Generalised least squares against simulation: the first reading's error moves all points."""
    x = np.linspace(0.1, 1.0, 10)
    V = 0.01**2 * np.eye(10) + 0.02**2
    lower = np.linalg.cholesky(V)
    slopes, errors = [], []
    for n in range(400):
        y = 2 * x + lower @ random(n).normal(size=10)
        line = correlated_line(x, y, V, known=True, through_origin=True)
        slopes.append(line.slope)
        errors.append(line.slope_error)
    # a standard deviation out of 400 is good to 1/sqrt(800), three of these allowed
    assert np.std(slopes) == pytest.approx(np.mean(errors), rel=3 / math.sqrt(800))
    assert np.mean(slopes) == pytest.approx(2.0, abs=3 * np.mean(errors) / 20)
    alike = correlated_line(x, y, np.eye(10), known=False)
    plain = straight_line(x, y)
    assert alike.covariance == pytest.approx(plain.covariance, rel=1e-9)
    assert alike.slope == pytest.approx(plain.slope, rel=1e-10)
