"""The figure `limits`: every number over its guideline on one logarithmic scale."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure

from meanfree.planning.limits import Limit, Survey, Verdict
from meanfree.report import wording
from meanfree.report.figures import style

CAPTION = (
    "Each number over its guideline (the guideline over the number, where it should be larger): "
    "right of the line it is beyond. What has no guideline is in the table alone."
)

FARTHEST = 1e-7
"""Ratios below this stand at the edge, with an arrow."""

_COLOURS = {
    Verdict.BEYOND: "#883300",
    Verdict.CAUTION: "#cc7700",
    Verdict.WITHIN: "#002299",
    Verdict.UNKNOWN: "#8a8a8a",
}
_MARKS = {Verdict.BEYOND: "D", Verdict.CAUTION: "s", Verdict.WITHIN: "o", Verdict.UNKNOWN: "x"}


def ratio(limit: Limit) -> float | None:
    """How far a number has gone towards its guideline, above 1 beyond it."""
    if limit.value is None or not limit.guideline:
        return None
    value = abs(limit.value)
    if limit.above:
        return limit.guideline / value if value > 0 else None
    return value / limit.guideline


def figure(survey: Survey) -> Figure:
    """One row a limit, the largest ratio on top."""
    found = [(value, limit) for limit in survey.limits if (value := ratio(limit)) is not None]
    found.sort(key=lambda pair: -pair[0])
    height = 0.25 * max(len(found), 1) + 0.75
    left = 3.35
    drawn = Figure(figsize=(7.4, height))
    box = (left / 7.4, 0.5 / height, (7.4 - left - 0.2) / 7.4, (height - 0.62) / height)
    ax = drawn.add_axes(box)
    values = [max(value, FARTHEST) for value, _ in found] or [1.0]
    low = min(10.0 ** np.floor(np.log10(min(values))), 0.01)
    high = max(10.0 ** np.ceil(np.log10(max(values) * 1.5)), 10.0)
    ax.set_xscale("log")
    ax.set_xlim(low * 0.6, high)
    ax.axvspan(1.0, high, color="#883300", alpha=0.08, linewidth=0)
    ax.axvline(1.0, color=style.INK, linewidth=1.0)
    for place, (value, limit) in enumerate(found):
        y, colour = -place, _COLOURS[limit.verdict]
        at = max(value, FARTHEST)
        ax.plot([low * 0.6, at], [y, y], color=style.GUIDE, linewidth=0.7, zorder=1)
        mark = "<" if value < FARTHEST else _MARKS[limit.verdict]
        ax.plot([at], [y], mark, color=colour, markersize=6, zorder=2, clip_on=False)
    ax.set_ylim(-max(len(found), 1) + 0.4, 0.6)
    ax.set_yticks([-place for place in range(len(found))])
    ax.set_yticklabels([_short(limit.name) for _, limit in found], fontsize=8.5)
    ax.tick_params(axis="y", length=0)
    style.plain_decades(ax.xaxis)
    style.label(ax, x="Number over guideline")
    return drawn


def _short(name: str, longest: int = 52) -> str:
    text = wording.clean(name)
    return text if len(text) <= longest else text[: longest - 1] + "…"
