"""Published runs: the fit of the signal, the textbook's line, both ways of counting."""

from __future__ import annotations

import numpy as np
import pytest
from measured_runs import butadiene, case_text, csv, measured

from meanfree.gases.identity import find_gas
from meanfree.measured.arrhenius_lines import temperature_series
from meanfree.measured.each_run import Point
from meanfree.measured.fitting import fit
from meanfree.measured.integrated_lines import in_file, integrated_line
from meanfree.measured.orders import order_test
from meanfree.report.measured.summarising import rate_constants

K = '[fit]\nparameters = ["steps.d.k"]\n'


def both(found):
    """{what is counted: k} of a fit with one rate constant."""
    return {one.counts: one.value for one in rate_constants(found)}


def test_butadiene_by_total_pressure(tmp_path, checked):
    """Vaughan, J. Am. Chem. Soc. 54, 3863 (1932), in Smith, Chemical Engineering Kinetics.

    Loss: 0.880 ± 0.004 L/mol/min from the signal with p0 fixed, 0.8659 from the line (both
    recomputed independently from the table).
    """
    data = butadiene(tmp_path, K)
    found = fit(data.request)
    one = found.estimate("steps.d.k")
    source = "Vaughan, J. Am. Chem. Soc. 54, 3863 (1932), recomputed"
    checked("loss of butadiene, 326 °C, signal", one.value, "0.880", "L/mol/min", source)
    assert one.stderr == pytest.approx(0.004, abs=5e-4)
    assert both(found)["loss of A"] == one.value
    assert both(found)["events"] == pytest.approx(one.value / 2, rel=1e-14)
    line = integrated_line(data.runs[0])
    k, _, unit = in_file(line, data.runs[0])
    assert unit == "L/mol/min"
    # arithmetic, but for the unit: 1 mmHg is 133.322387 Pa here, 101325/760 in the check: 1.4e-7
    name = "loss of butadiene, 326 °C, straight line"
    checked(name, 2 * k, "0.865916796747", "L/mol/min", source, rel=2e-7)
    assert k == pytest.approx(0.432958398374, rel=2e-7)
    assert line.line.r_squared == pytest.approx(0.999343548427, rel=1e-9)
    assert line.how == "p(A) = p0(A) + 2 (p − p0)"
    assert any("keep one sign for long" in text for text in found.findings)


def test_butadiene_with_free_pressure_at_the_start(tmp_path):
    data = butadiene(tmp_path, '[fit]\nparameters = ["steps.d.k", "fill.gases.A"]\n')
    found = fit(data.request)
    k, p0 = found.estimate("steps.d.k"), found.estimate("fill.gases.A")
    # by hand: curve_fit of p0/2 (1 + 1/(1 + k t p0/RT))
    from scipy.optimize import curve_fit

    t, p = data.runs[0].readings.times, data.runs[0].readings.values

    def pressure(t, k, start):
        c = start / (8.31446261815324 * 599.15)
        return 0.5 * start * (1 + 1 / (1 + k * t * c))

    values, cov = curve_fit(pressure, t, p, p0=[1e-5, 84e3], xtol=1e-14, ftol=1e-14)
    assert k.value == pytest.approx(values[0] * 6e4, rel=1e-6)
    assert p0.value == pytest.approx(values[1] / 133.322387415, rel=1e-6)
    assert k.stderr == pytest.approx(np.sqrt(cov[0, 0]) * 6e4, rel=1e-4)
    assert p0.stderr == pytest.approx(np.sqrt(cov[1, 1]) / 133.322387415, rel=1e-4)


def test_peroxide_by_total_pressure(tmp_path, checked):
    """Trotman-Dickenson, J. Chem. Educ. 46, 396 (1969); Fogler 3rd ed., Ex. 5-1 and 5-2.

    Fogler reads 0.08 1/min; the line gives 0.0782 (recomputed), the signal 0.080.
    """
    law = 'law = "fixed"\nk = "0.05 1/min"'
    text = case_text("A -> B + 2 C", law, "7.5 mmHg", 443.15)
    text += """
[[data]]
file = "run.csv"
decimal = ","
time = { column = "t/min", unit = "min" }
signal = { column = "P/mmHg", unit = "mmHg", is = "total pressure" }
"""
    table = "t/min;P/mmHg\n0;7,5\n2,5;10,5\n5;12,5\n10;15,8\n15;17,9\n20;19,4\n"
    data = measured(tmp_path, text + K, {"run.csv": table})
    found = fit(data.request)
    ours = found.estimate("steps.d.k").value
    source = "Trotman-Dickenson (1969); Fogler, 3rd ed., Ex. 5-1, 5-2"
    checked("k of di-tert-butyl peroxide, 170 °C, signal", ours, "0.080", "min⁻¹", source)
    line = integrated_line(data.runs[0])
    ours = in_file(line, data.runs[0])[0]
    name = "k of di-tert-butyl peroxide, 170 °C, line"
    checked(name, ours, "0.0782047658457", "min⁻¹", source + ", recomputed", rel=1e-9)
    assert line.line.r_squared == pytest.approx(0.99972148926, rel=1e-9)
    assert line.how == "p(A) = p0(A) − 0.5 (p − p0)"
    # one molecule an event: both ways of counting are one
    assert both(found) == {
        "events": pytest.approx(0.080, abs=5e-4),
        "loss of A": both(found)["events"],
    }
    order = order_test(data.request, "d", "A")
    assert order.low < 1 < order.high


def test_butadiene_by_concentration(tmp_path, checked):
    """Zumdahl, Chemistry: 0.0614 L/mol/s for loss; the line 0.06124 (recomputed), signal 0.0609."""
    law = 'law = "fixed"\nk = "0.05 L/mol/s"'
    text = case_text(law=law, fill="0.01 mol/L", T=500)
    text += """
[[data]]
file = "run.tsv"
time = { column = 1, unit = "s" }
signal = { column = 2, unit = "mol/L", is = "concentration of A" }
"""
    rows = [(0, 0.01), (1000, 0.00625), (1800, 0.00476), (2800, 0.0037), (3600, 0.00313)]
    rows += [(4400, 0.0027), (5200, 0.00241), (6200, 0.00208)]
    table = "".join(f"{t}\t{c}\n" for t, c in rows)
    data = measured(tmp_path, text + K, {"run.tsv": table})
    found = fit(data.request)
    # this case counts events, the book counts loss
    assert both(found)["loss of A"] == pytest.approx(0.0609, abs=5e-5)
    assert both(found)["events"] == pytest.approx(0.0609 / 2, abs=3e-5)
    line = integrated_line(data.runs[0])
    ours = 2 * in_file(line, data.runs[0])[0]
    name = "loss of butadiene by concentration, line"
    checked(name, ours, "0.0614", "L/mol/s", "Zumdahl, Chemistry", rel=0.005)
    assert ours == pytest.approx(0.0612389061119, rel=1e-9)
    assert line.line.r_squared == pytest.approx(0.999873585431, rel=1e-9)


HYDROGEN_IODIDE = (
    [556, 575, 629, 647, 666, 683, 700, 716, 781],
    [3.52e-7, 1.22e-6, 3.02e-5, 8.59e-5, 2.19e-4, 5.12e-4, 1.16e-3, 2.5e-3, 3.95e-2],
)
"""K and L/mol/s. Bodenstein, Z. phys. Chem. 29, 295 (1899), as textbooks have it."""


def test_hydrogen_iodide_against_temperature(checked):
    """Ea 185.714 kJ/mol, A 8.7615e10 L/mol/s (recomputed); textbooks say 184 (from memory)."""
    T, k = HYDROGEN_IODIDE
    gas = find_gas("HI")
    points = [Point("", t, 1e-3 * one, np.nan, None) for t, one in zip(T, k, strict=True)]
    series = temperature_series("d", points, (gas, gas))
    assert series.Ea.value == pytest.approx(185714.182505, rel=1e-9)
    assert 1e3 * series.A.value == pytest.approx(87615227504.3, rel=1e-9)
    source = "Bodenstein (1899); textbooks (from memory)"
    name = "Ea of 2 HI → H₂ + I₂, nine temperatures"
    checked(name, 1e-3 * series.Ea.value, "184", "kJ/mol", source, rel=0.012)
    assert series.Ea.low < 184e3 < series.Ea.high
    assert series.words[0].startswith("The points curve upwards at high temperature")
    # a straight line of ln k against 1/T by an independent routine
    from scipy.stats import linregress

    line = linregress(1 / np.array(T), np.log(k))
    assert series.Ea.error == pytest.approx(8.31446261815324 * line.stderr, rel=1e-9)
    assert series.ln_A.error == pytest.approx(line.intercept_stderr, rel=1e-9)


def test_hydrogen_iodide_through_a_case(tmp_path):
    """The same nine points as readings: loss against events is a factor of two in A alone."""
    T, k = HYDROGEN_IODIDE
    found = {}
    for counts in ("events", "loss of HI"):
        law = 'law = "arrhenius"\nA = "1e10 L/mol/s"\nEa = "170 kJ/mol"'
        text = case_text("2 HI -> H2 + I2", law, "1 bar", 700)
        text = text.replace("labels = []", "").replace('{ A = "1 bar"', '{ HI = "1 bar"')
        text += f"""
[[data]]
file = "k.csv"
temperature = {{ column = "T", unit = "K" }}
signal = {{ column = "k", unit = "L/mol/s", is = "rate constant of d", counts = "{counts}" }}
[fit]
parameters = ["steps.d.A", "steps.d.Ea"]
"""
        data = measured(tmp_path, text, {"k.csv": csv({"T": T, "k": k})})
        found[counts] = fit(data.request)
    events, loss = found["events"], found["loss of HI"]
    assert events.estimate("steps.d.A").value == pytest.approx(87615227504.3, rel=1e-6)
    assert events.estimate("steps.d.Ea").value == pytest.approx(185.714182505, rel=1e-7)
    assert loss.estimate("steps.d.A").value == pytest.approx(87615227504.3 / 2, rel=1e-6)
    assert loss.estimate("steps.d.Ea").value == pytest.approx(185.714182505, rel=1e-7)
    one = events.estimate("steps.d.Ea")
    assert (one.low, one.high) == pytest.approx((181.515463, 189.912902), rel=1e-6)
