"""Words beside curves: names at their right ends, times along the top edge, none on a curve."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree.report.figures.style import GUIDE, INK

MOST_LABELS = 8
"""More curves than this get a legend beside the axes instead of labels at their ends."""


LONGEST = 18
"""Characters of a name beside a curve; longer ones are cut, the tables have them in full."""


def short(text: str) -> str:
    """A name that fits beside a curve."""
    return text if len(text) <= LONGEST else text[: LONGEST - 1] + "…"


def room_for(names: Sequence[str]) -> float:
    """Room that names beside curves need [inch]."""
    return 0.38 + 0.082 * max((len(short(name)) for name in names), default=0)


@dataclass(frozen=True)
class EndLabel:
    """The name of a curve and where the curve ends, in data units of y."""

    text: str
    value: float
    color: str


def size_of(ax: Axes) -> tuple[float, float]:
    """Width and height of the axes [inch]."""
    figure, box = ax.figure, ax.get_position()
    assert isinstance(figure, Figure), "our figures have no subfigures"
    width, height = figure.get_size_inches()
    return float(width * box.width), float(height * box.height)


def at_ends(ax: Axes, labels: Sequence[EndLabel]) -> None:
    """Names at the right ends of curves, moved apart where the curves end close together."""
    if not labels:
        return
    height = size_of(ax)[1]
    gap = 0.165 / height
    ends = np.array([_fraction(ax, entry.value) for entry in labels])
    places = spread(ends, gap)
    for entry, end, place in zip(labels, ends, places, strict=True):
        ax.plot(
            [1.003, 1.016, 1.024],
            [end, place, place],
            transform=ax.transAxes,
            color=entry.color,
            linewidth=0.8,
            clip_on=False,
            solid_capstyle="butt",
        )
        ax.text(
            1.03,
            place,
            short(entry.text),
            transform=ax.transAxes,
            color=entry.color,
            va="center",
            ha="left",
            fontsize=9.5,
        )


def _fraction(ax: Axes, value: float) -> float:
    low, high = ax.get_ylim()
    if ax.get_yscale() == "log":
        value, low, high = np.log(max(value, low)), np.log(low), np.log(high)
    return float(np.clip((value - low) / (high - low), 0.0, 1.0))


def spread(wanted: np.ndarray, gap: float) -> np.ndarray:
    """Places at least ``gap`` apart, in order, as near to those wanted as can be.

    Neighbours that would touch are pooled and centred on the mean of what they wanted
    (pooling of adjacent violators), so that no label moves further than it must.
    """
    order = np.argsort(wanted, kind="stable")
    shifted = wanted[order] - gap * np.arange(len(wanted))
    pools: list[list[float]] = []
    for value in shifted:
        pools.append([float(value), 1.0])
        while len(pools) > 1 and pools[-2][0] > pools[-1][0]:
            (a, n), (b, m) = pools[-2], pools.pop()
            pools[-1] = [(a * n + b * m) / (n + m), n + m]
    level = np.concatenate([np.full(int(n), value) for value, n in pools])
    places = np.empty(len(wanted))
    places[order] = level + gap * np.arange(len(wanted))
    return places


def legend_beside(ax: Axes) -> None:
    """A legend right of the axes, clear of every curve."""
    ax.legend(
        loc="upper left",
        bbox_to_anchor=(1.01, 1.02),
        frameon=False,
        fontsize=8,
        handlelength=2.4,
        borderaxespad=0.0,
    )


def place_of(ax: Axes, x: float) -> float:
    """Where a value of x lies, 0 at the left end of the axis and 1 at the right."""
    low, high = ax.get_xlim()
    if ax.get_xscale() == "log":
        return float(np.log(x / low) / np.log(high / low))
    return (x - low) / (high - low)


def width_of(ax: Axes, text: str) -> float:
    """About how wide a text is, as a fraction of the axis."""
    return (0.064 * len(text) + 0.12) / size_of(ax)[0]


def along_top(ax: Axes, marks: Sequence[tuple[float, str]]) -> None:
    """Dotted lines at times (in data units of x) with a word above each, where there is room."""
    low, high = ax.get_xlim()
    width = size_of(ax)[0]
    taken = -np.inf
    for x, text in marks:
        if not low <= x <= high:
            continue
        place = place_of(ax, x)
        # A long word ends at its line, so that the next line may follow closely.
        before = 0.068 * (len(text) - 1) + 0.034
        if before / width > place:
            before = 0.034
        after = 0.068 * len(text) - before
        if place - before / width < taken:
            continue
        taken = place + (after + 0.06) / width
        ax.axvline(x, color=GUIDE, linewidth=0.8, linestyle=(0, (1, 2)), zorder=0.5)
        ax.text(
            place + 0.5 * (after - before) / width,
            1.015,
            text,
            transform=ax.transAxes,
            ha="center",
            va="bottom",
            fontsize=8.5,
            color=INK,
        )
