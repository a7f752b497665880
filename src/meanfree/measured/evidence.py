"""Which description of the same readings is the better one: AICc, and the evidence in words.

Source: Burnham and Anderson, Model Selection and Multimodel Inference, 2nd ed. 2002, chapters 2
(AICc, weights) and section 2.6 (what a difference means).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.measured.fits import Fit


@dataclass(frozen=True)
class Candidate:
    """One description: its name, its AICc, how far that is above the best, its Akaike weight."""

    name: str
    fit: Fit
    aicc: float
    difference: float
    weight: float


def aicc(fit: Fit) -> float:
    """-2 ln L + 2 p n/(n - p - 1), p counting estimated deviations too; infinite for n <= p + 1."""
    n = fit.misfit.n_readings
    p = len(fit.parameters) + len(set(fit.misfit.groups) - {""})
    if n <= p + 1:
        return math.inf
    return -2 * fit.log_likelihood + 2 * p * n / (n - p - 1)


def ranked(fits: Sequence[tuple[str, Fit]]) -> tuple[Candidate, ...]:
    """Descriptions of the same readings, the best first."""
    values = np.array([aicc(fit) for _, fit in fits])
    least = float(np.min(values))
    if not math.isfinite(least):
        shares = np.full(len(values), 1.0 / len(values))
        differences = np.zeros(len(values))
    else:
        differences = values - least
        shares = np.exp(-0.5 * differences)
        shares = shares / shares.sum()
    found = [
        Candidate(name, fit, float(value), float(difference), float(share))
        for (name, fit), value, difference, share in zip(
            fits, values, differences, shares, strict=True
        )
    ]
    return tuple(sorted(found, key=lambda one: one.difference))


def evidence(candidates: Sequence[Candidate]) -> str:
    """What the ranking says, in a sentence."""
    if len(candidates) < 2:
        return ""
    best, second = candidates[0], candidates[1]
    if not math.isfinite(best.aicc):
        return "There are too few readings to rank anything by AICc."
    d = second.difference
    if d < 2:
        near = [one.name for one in candidates if one.difference < 2]
        return (
            f"The readings do not tell {' from '.join(near)} (differences in AICc below 2): "
            "follow the reaction further, or change the fill."
        )
    words = "some evidence" if d < 4 else "good evidence" if d < 10 else "decisive evidence"
    return (
        f"{best.name} describes the readings best: {words} over {second.name} "
        f"(AICc lower by {d:.1f})."
    )
