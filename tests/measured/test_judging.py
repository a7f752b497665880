"""Runs of sign, chi-square and AICc against independent routines; the evidence in words."""

from __future__ import annotations

import itertools
import math

import lmfit
import numpy as np
import pytest
from measured_runs import case_text, loaded, made_up

from meanfree.measured.evidence import aicc, evidence, ranked
from meanfree.measured.fits import FitRequest
from meanfree.measured.fitting import fit
from meanfree.measured.judging import of_runs, of_scatter, open_interval, runs_test
from meanfree.measured.parameters import Asked
from meanfree.measured.signals import Signal


@pytest.mark.parametrize(("above", "below"), [(4, 4), (3, 6), (7, 2), (5, 5)])
def test_runs_test_by_counting_every_order(above, below):
    """The exact distribution, by writing every arrangement down."""
    length = above + below
    counts: dict[int, int] = {}
    for places in itertools.combinations(range(length), above):
        signs = [1 if i in places else -1 for i in range(length)]
        runs = 1 + sum(a != b for a, b in itertools.pairwise(signs))
        counts[runs] = counts.get(runs, 0) + 1
    whole = math.comb(length, above)
    mean = sum(runs * n for runs, n in counts.items()) / whole
    for runs in counts:
        signs = _with_runs(above, below, runs)
        found = runs_test(np.array(signs, float))
        assert found is not None
        assert found.runs == runs
        assert found.expected == pytest.approx(mean, rel=1e-12)
        share = sum(n for r, n in counts.items() if r <= runs) / whole
        assert found.probability == pytest.approx(share, rel=1e-12)


def _with_runs(above, below, runs):
    """Some signs with that many runs."""
    for places in itertools.combinations(range(above + below), above):
        signs = [1 if i in places else -1 for i in range(above + below)]
        if 1 + sum(a != b for a, b in itertools.pairwise(signs)) == runs:
            return signs
    raise AssertionError


def test_runs_of_few_or_of_one_sign():
    assert runs_test(np.array([1.0, -1.0, 1.0, -1.0])) is None
    found = runs_test(np.ones(8))
    assert found is not None
    assert found.probability == pytest.approx(2**-7)
    assert of_runs("x", found).startswith(
        "The residuals of x keep one sign for long (1 runs of sign"
    )
    assert of_runs("x", runs_test(np.array([1.0, -1, 1, -1, 1, -1]))) == ""


def test_scatter_in_words():
    assert of_scatter(1.0, 20) == ""
    assert of_scatter(4.0, 20).startswith("The scatter is 2 times what the standard deviations say")
    assert of_scatter(0.25, 20).startswith("The scatter is only 0.5 times what the standard")


def test_open_intervals_in_words():
    assert open_interval("x", False, False) == ""
    assert open_interval("x", True, True) == (
        "The readings do not determine x: its interval is open on both sides."
    )
    assert open_interval("x", True, False) == (
        "The readings do not bound x from below; only its upper limit means anything."
    )


T = np.linspace(0, 3000, 20)
SIGNAL = Signal("concentration", ("A",))


def fits(folder, y, sd):
    """First and second order to the same readings."""
    found = []
    for n, (reaction, k) in enumerate((("A -> B", "1e-3 1/s"), ("2 A -> B", "5e-4 m^3/mol/s"))):
        text = case_text(reaction, f'law = "fixed"\nk = "{k}"', "1 mol/m^3", 300.0)
        case = loaded(folder / str(n), text, {}) if (folder / str(n)).mkdir() is None else None
        run = made_up(case, T, y, signal=SIGNAL, unit="mol/m^3", sd=sd)
        found.append((reaction, fit(FitRequest((run,), (Asked("steps.d.k"),)))))
    return found


def test_aicc_beside_lmfit(tmp_path):
    """lmfit: n ln(chi2/n) + 2 p. Ours has constants, counts the deviation, and the small-n term."""
    y = np.exp(-1e-3 * T) + np.random.default_rng(1).normal(0, 0.02, len(T))
    found = fits(tmp_path, y, None)[0][1]
    model = lmfit.Model(lambda t, k: np.exp(-k * t))
    theirs = model.fit(y, t=T, k=1e-3)
    n, p = len(T), 2
    expected = theirs.aic - 2 + n * (math.log(2 * math.pi) + 1) + 2 * p * n / (n - p - 1)
    assert aicc(found) == pytest.approx(expected, rel=1e-9)


def test_ranking_tells_a_law_from_another(tmp_path):
    y = np.exp(-1e-3 * T) + np.random.default_rng(1).normal(0, 0.02, len(T))
    best = ranked(fits(tmp_path, y, 0.02))
    assert best[0].name == "A -> B"
    assert best[0].weight > 0.999
    assert sum(one.weight for one in best) == pytest.approx(1.0)
    assert evidence(best).startswith(
        "A -> B describes the readings best: decisive evidence over 2 A -> B (AICc lower by "
    )


def test_ranking_of_readings_that_do_not_tell(tmp_path):
    y = np.exp(-1e-3 * T) + np.random.default_rng(1).normal(0, 0.02, len(T))
    same = ranked(fits(tmp_path, y, 5.0))
    assert evidence(same) == (
        f"The readings do not tell {same[0].name} from {same[1].name} "
        "(differences in AICc below 2): follow the reaction further, or change the fill."
    )
