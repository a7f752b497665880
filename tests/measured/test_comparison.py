"""The same vessel under collision theory and under the limit: half-lives and P by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest
from measured_runs import case_text, loaded, made_up

from meanfree.constants import N_A, R, k_B
from meanfree.errors import InputError
from meanfree.measured.comparison import CEILING, FITTED, SUPPLIED, THEORY, compare
from meanfree.measured.fits import FitRequest
from meanfree.measured.fitting import fit
from meanfree.measured.parameters import Asked
from meanfree.measured.signals import Signal

T, D, M = 700.0, 4e-10, 0.12791
C0 = 1e5 / (R * T)


def hydrogen_iodide(folder, law):
    text = case_text("2 HI -> H2 + I2", law, "1 bar", T).replace("labels = []", "")
    text = text.replace('{ A = "1 bar"', '{ HI = "1 bar"')
    text += '\n[gases.HI]\ndiameter = "4 angstrom"\n'
    return loaded(folder, text, {})


def Z():
    """Half sigma v N_A for like partners, v = sqrt(8 kT/pi mu), mu = m/2."""
    mu = 0.5 * M / N_A
    return 0.5 * math.pi * D**2 * math.sqrt(8 * k_B * T / (math.pi * mu)) * N_A


ARRHENIUS = 'law = "arrhenius"\nA = "6e10 L/mol/s"\nEa = "184 kJ/mol"'


def test_by_hand(tmp_path):
    found = compare(hydrogen_iodide(tmp_path, ARRHENIUS).experiment)
    assert [one.name for one in found.scenarios] == [SUPPLIED, THEORY, CEILING]
    k = 6e7 * math.exp(-184e3 / (R * T))
    theory = Z() * math.exp(-(184e3 - 0.5 * R * T) / (R * T))
    # second order: t = 1/(2 k c0), then twice as long, and four times
    for scenario, rate in zip(found.scenarios, (k, theory, Z()), strict=True):
        first = 1 / (2 * rate * C0)
        # masses of HI differ in the sixth digit between tables; Radau at 1e-8
        assert scenario.half_lives == pytest.approx([first, 2 * first, 4 * first], rel=1e-5)
    step = found.steps[0]
    assert step.steric is not None
    assert step.steric.value == pytest.approx(k / theory, rel=1e-5)
    # diameters good to x/÷ 1.1, sigma with d^2, 1.96 deviations
    assert step.steric.high / step.steric.value == pytest.approx(1.1 ** (2 * 1.959964), rel=1e-6)
    assert step.judgement.A_over_Z == pytest.approx(6e7 / Z(), rel=1e-5)
    assert found.left_out == ()


def test_a_fixed_k_has_no_energy_term(tmp_path):
    found = compare(hydrogen_iodide(tmp_path, 'law = "fixed"\nk = "1e-3 L/mol/s"').experiment)
    assert [one.name for one in found.scenarios] == [SUPPLIED, CEILING]
    assert found.steps[0].steric is None
    assert found.left_out == (
        "d states no activation energy, so that collision theory has no energy term for it.",
    )


def test_fitted_kinetics_with_their_interval(tmp_path):
    """P's interval is that of ln A (Ea held) and of the diameters, in quadrature."""
    case = hydrogen_iodide(tmp_path, ARRHENIUS)
    k = 5e7 * math.exp(-184e3 / (R * T))
    t = np.linspace(0, 3 / (2 * k * C0), 30)
    c = C0 / (1 + 2 * k * C0 * t) + np.random.default_rng(3).normal(0, 0.05 * C0, 30)
    run = made_up(case, t, c, signal=Signal("concentration", ("HI",)), sd=0.05 * C0, unit="mol/m^3")
    found = fit(FitRequest((run,), (Asked("steps.d.A"),)))
    A = found.estimates[0]
    both = compare(run.experiment, found)
    assert both.scenarios[0].name == FITTED
    step = both.steps[0]
    assert step.steric is not None
    assert step.k == pytest.approx(A.value * 1e-3 * math.exp(-184e3 / (R * T)), rel=1e-9)
    share = A.stderr / A.value
    assert step.k_interval is not None
    assert math.log(step.k_interval[1] / step.k) == pytest.approx(1.959964 * share, rel=1e-4)
    wide = 1.959964 * math.hypot(share, 2 * math.log(1.1))
    assert math.log(step.steric.high / step.steric.value) == pytest.approx(wide, rel=1e-4)


def test_what_cannot_be_compared(tmp_path):
    with pytest.raises(InputError) as caught:
        compare(loaded(tmp_path, case_text(), {}).experiment)
    assert str(caught.value) == (
        "steps: found no encounter of two gases whose masses and diameters are known; expected at "
        "least one step of two molecules, each with formula and diameter"
    )
