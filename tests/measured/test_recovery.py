"""Made-up runs of four mechanisms, many times over: no bias, and intervals that cover 95 %."""

from __future__ import annotations

import math

import numpy as np
import pytest
from measured_runs import case_text, loaded, made_up

from meanfree.experiment.inputs import inputs
from meanfree.measured.fits import FitRequest
from meanfree.measured.fitting import fit
from meanfree.measured.parameters import Asked
from meanfree.measured.prediction import predict
from meanfree.measured.signals import Signal, predicted

SECOND = ("2 A -> B", 'law = "fixed"\nk = "0.5 L/mol/s"', "0.01 mol/L")
CONSECUTIVE = '[[steps]]\nname = "e"\nreaction = "B -> C"\nlaw = "fixed"\nk = "2e-3 1/s"\n'
MECHANISMS = {
    # (reaction, law, fill), more steps, signal, its sd over the first reading's kind of size,
    # is sd given, parameters, last reading [s]
    "dimerisation, total pressure": (
        SECOND, "", Signal("total pressure"), 200.0, True, ("steps.d.k", "fill.gases.A"), 400.0
    ),
    "first order, deviation estimated": (
        ("A -> B", 'law = "fixed"\nk = "3e-3 1/s"', "10 mol/m^3"), "",
        Signal("concentration", ("A",)), 0.2, False, ("steps.d.k", "fill.gases.A"), 1000.0,
    ),
    "reversible, product": (
        (
            "A -> B",
            'law = "fixed"\nk = "3e-3 1/s"\nreverse = { Kc = 2.0, at = "599.15 K" }',
            "10 mol/m^3",
        ),
        "", Signal("mole fraction", ("B",)), 0.01, True,
        ("steps.d.k", "steps.d.reverse.Kc"), 1500.0,
    ),
    "consecutive, intermediate": (
        ("A -> B", 'law = "fixed"\nk = "4e-3 1/s"', "10 mol/m^3"), CONSECUTIVE,
        Signal("concentration", ("B",)), 0.1, False, ("steps.d.k", "steps.e.k"), 1500.0,
    ),
}  # fmt: skip


@pytest.mark.slow
@pytest.mark.parametrize("name", MECHANISMS)
def test_recovery(tmp_path, name, size):
    """Bounds are 3.5 binomial deviations: eight such tests fail by chance one time in 270."""
    step, more, signal, sd, given, addresses, last = MECHANISMS[name]
    text = case_text(*step)
    if more:
        text = text.replace('"A", "B"', '"A", "B", "C"') + more
    case = loaded(tmp_path, text, {})
    t = np.linspace(0.0, last, 20)
    truth = predicted(signal, predict(case.experiment, t))
    known = [inputs(case.experiment)[address].value for address in addresses]
    repeats = 1000 if size == "full" else 60
    random = np.random.default_rng(20)
    covered, scores = np.zeros(len(addresses)), []
    for _ in range(repeats):
        values = truth + random.normal(0.0, sd, len(t))
        run = made_up(case, t, values, signal=signal, sd=sd if given else None, unit="")
        found = fit(FitRequest((run,), tuple(Asked(address) for address in addresses)))
        pairs = list(zip(found.estimates, known, strict=True))
        covered += [one.low <= true <= one.high for one, true in pairs]
        scores.append([math.log(one.value / true) * one.value / one.stderr for one, true in pairs])
    allowed = 3.5 * math.sqrt(0.95 * 0.05 / repeats)
    assert covered / repeats == pytest.approx(np.full(len(addresses), 0.95), abs=allowed)
    # ln of an estimate is off by about half its relative variance, 0.001 or less here, some
    # hundredths of a standard error; the mean of the scores scatters by 1/sqrt(repeats)
    mean = np.mean(scores, axis=0)
    assert mean == pytest.approx(np.zeros(len(addresses)), abs=3.5 / math.sqrt(repeats) + 0.04)
