"""What can be said of a fit: do the residuals look like scatter, and do the readings determine it.

Each judgement comes with words, so that a table, the screen and the page say the same.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from meanfree.equations.system import Floats
from meanfree.measured.covariances import BLIND, without_voice
from meanfree.measured.least_squares import Solution
from meanfree.measured.parameters import Parameter

DOUBTFUL: Final[float] = 0.05
TOGETHER: Final[float] = 0.99
"""Correlation above which two parameters are said to move together; common practice, no source."""


@dataclass(frozen=True)
class RunsTest:
    """Runs of one sign among residuals in order of time.

    ``runs`` were met, ``expected`` are the mean of chance, ``probability`` [1] is that of so few.
    """

    runs: int
    expected: float
    probability: float

    @property
    def is_doubtful(self) -> bool:
        """True where chance makes so few runs less often than one time in twenty."""
        return self.probability < DOUBTFUL


def runs_test(residuals: Floats) -> RunsTest | None:
    """The runs test of Wald and Wolfowitz, one-sided (too few runs); None below 5 residuals.

    Exact distribution. Source: Ann. Math. Statist. 11 (1940) 147.

    >>> round(runs_test([1, 2, 1, 3, -1, -2, -1, -4]).probability, 4)
    0.0286
    """
    signs = np.sign(np.asarray(residuals, float))
    signs = signs[signs != 0]
    above, below = int(np.sum(signs > 0)), int(np.sum(signs < 0))
    if len(signs) < 5:
        return None
    runs = 1 + int(np.sum(signs[1:] != signs[:-1]))
    if above == 0 or below == 0:
        # The sum of least-squares residuals is near zero; all of one sign is as doubtful as can be.
        return RunsTest(runs, 1.0, 2.0 ** (1 - len(signs)))
    expected = 1 + 2 * above * below / (above + below)
    whole = math.comb(above + below, above)
    share = sum(_ways(r, above, below) for r in range(2, runs + 1)) / whole
    return RunsTest(runs, expected, min(1.0, share))


def _ways(runs: int, above: int, below: int) -> int:
    """Sequences of that many signs with that many runs."""
    half = runs // 2
    if runs % 2 == 0:
        return 2 * math.comb(above - 1, half - 1) * math.comb(below - 1, half - 1)
    return math.comb(above - 1, half - 1) * math.comb(below - 1, half) + math.comb(
        above - 1, half
    ) * math.comb(below - 1, half - 1)


def undetermined(solution: Solution, parameters: Sequence[Parameter]) -> tuple[str, ...]:
    """What the residuals do not depend on at all, in words; empty where there is no such thing."""
    free = [i for i, is_free in enumerate(solution.free) if is_free]
    names = [parameters[i].address for i in free]
    J = solution.jacobian[:, free] * solution.size[free]
    norm = np.linalg.norm(J, axis=0)
    silent = without_voice(norm)
    found = [_blind(names[i]) for i in np.flatnonzero(silent)]
    heard = np.flatnonzero(~silent)
    if len(heard):
        _, s, vt = np.linalg.svd(J[:, heard] / norm[heard], full_matrices=False)
        for direction in vt[s <= BLIND * s[0]]:
            members = [names[heard[i]] for i in np.flatnonzero(np.abs(direction) > 1e-3)]
            found.append(
                f"The readings do not determine {_listed(members)} separately: "
                "only a combination of them. Hold one at a known value, or give it a prior."
            )
    return tuple(found)


def _blind(name: str) -> str:
    return (
        f"The readings do not depend on {name}: they say nothing about it. "
        "Take it out of the parameters, or give it a prior."
    )


def moving_together(correlation: Floats, parameters: Sequence[Parameter]) -> tuple[str, ...]:
    """Pairs whose estimates move together so closely that neither is well known alone."""
    found = []
    for i in range(len(parameters)):
        for j in range(i):
            r = float(correlation[i, j])
            if np.isfinite(r) and abs(r) > TOGETHER and not _is_ridge(parameters[i], parameters[j]):
                both = f"{parameters[j].address} and {parameters[i].address}"
                found.append(
                    f"{both} move together (correlation {_signed(r)}): a combination of them is "
                    "known better than either."
                )
    return tuple(found)


def _is_ridge(one: Parameter, other: Parameter) -> bool:
    """True for A and Ea of one step, which always move together: k in the middle is shown."""
    steps = [parameter.key.rpartition(".") for parameter in (one, other)]
    return steps[0][0] == steps[1][0] and {steps[0][2], steps[1][2]} == {"A", "Ea"}


def open_interval(name: str, low_open: bool, high_open: bool) -> str:
    """Words for an interval without an end; empty where it has both."""
    if low_open and high_open:
        return f"The readings do not determine {name}: its interval is open on both sides."
    if low_open or high_open:
        side, end = ("below", "upper") if low_open else ("above", "lower")
        return f"The readings do not bound {name} from {side}; only its {end} limit means anything."
    return ""


def of_scatter(reduced: float, freedom: int) -> str:
    """Words for a reduced chi-square of readings whose deviations were given; empty if likely."""
    from scipy.stats import chi2

    too_much = float(chi2.sf(reduced * freedom, freedom))
    if too_much < 0.01:
        return (
            f"The scatter is {math.sqrt(reduced):.3g} times what the standard deviations say: "
            "the model does not describe the readings, or the deviations are too small. "
            "The intervals rest on the deviations as given."
        )
    if too_much > 0.99:
        return (
            f"The scatter is only {math.sqrt(reduced):.3g} times what the standard deviations "
            "say: they are too large, and so are the intervals."
        )
    return ""


def of_runs(run: str, test: RunsTest | None) -> str:
    """Words for residuals that keep their sign too long; empty where they do not."""
    if test is None or not test.is_doubtful:
        return ""
    return (
        f"The residuals of {run} keep one sign for long ({test.runs} runs of sign, chance would "
        f"make {test.expected:.1f}; probability {test.probability:.2g}): the model leaves "
        "something out, and the intervals are too narrow."
    )


def _signed(r: float) -> str:
    return f"{r:+.4f}".replace("-", "−")


def _listed(names: Sequence[str]) -> str:
    return names[0] if len(names) == 1 else ", ".join(names[:-1]) + " and " + names[-1]
