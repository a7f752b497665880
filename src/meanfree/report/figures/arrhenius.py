"""The figure `arrhenius`: the rate constant of a pair against 1/T, under its collision ceiling."""

from __future__ import annotations

from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from meanfree import units
from meanfree.report.figures import labels, style
from meanfree.report.pair.question import PairQuestion
from meanfree.report.wording import pretty_unit

POINTS: Final[int] = 120
SPAN: Final[float] = 2.0
"""The figure reaches from the temperature asked for divided by this to it times this."""

LEAST: Final[float] = 1e-100
"""Below this a rate constant is no longer drawn: nothing happens, whatever the unit."""


def figure(question: PairQuestion) -> Figure:
    """Z and, where a threshold is given, k against 1000 K / T; the temperature itself is marked."""
    asked = question.temperature.value
    x = np.linspace(1e3 / (SPAN * asked), SPAN * 1e3 / asked, POINTS)
    pairs = [question.collisions(1e3 / float(at)) for at in x]
    unit, dimension = (
        ("cm^2/molecule/s", "rate constant in a plane")
        if question.in_plane
        else ("L/mol/s", units.rate_constant(2))
    )
    here = question.collisions()
    curves = [("Z, the ceiling", [p.ceiling for p in pairs], here.ceiling)]
    if question.has_threshold and here.threshold > 0:
        curves.append(("k", [p.rate_constant for p in pairs], here.rate_constant))
    drawn, (ax,) = style.panels([3.4], labels.room_for([name for name, _, _ in curves]), 0.55)
    ends: list[labels.EndLabel] = []
    seen: list[float] = []
    for n, (name, values, at) in enumerate(curves):
        shown = np.array([units.from_si(v, unit, dimension) for v in values])
        shown[shown < LEAST] = np.nan
        look = style.style_of(n)
        ax.plot(x, shown, **look)
        mark = units.from_si(at, unit, dimension)
        if mark >= LEAST:
            ax.plot([1e3 / asked], [mark], "o", color=look["color"], markersize=5)
        good = shown[np.isfinite(shown)]
        if good.size:
            seen += [float(good.min()), float(good.max())]
            ends.append(labels.EndLabel(name, float(good[-1]), look["color"]))
    ax.set_xlim(float(x[0]), float(x[-1]))
    style.set_logarithmic(ax, _floor(min(seen)), _ceiling(max(seen)))
    style.label(ax, x="1000 K / T", y=f"Rate constant ({pretty_unit(unit)})")
    temperatures_along_top(ax, asked / SPAN, asked * SPAN)
    labels.at_ends(ax, ends)
    return drawn


def _floor(value: float) -> float:
    """The decade below, with room for a line that lies on it."""
    return float(10.0 ** np.floor(np.log10(value) - 0.15))


def _ceiling(value: float) -> float:
    return float(10.0 ** np.ceil(np.log10(value) + 0.15))


def temperatures_along_top(ax: Axes, coldest: float, hottest: float) -> None:
    """Temperatures [K] along the top of an axis in 1000 K / T, as many as stand clear."""
    top = ax.twiny()
    top.set_xlim(ax.get_xlim())
    low, high = ax.get_xlim()
    places: list[float] = []
    kept: list[float] = []
    width = labels.size_of(ax)[0]
    for kelvin in sorted(_round_temperatures(coldest, hottest), reverse=True):
        place = (1e3 / kelvin - low) / (high - low) * width
        if 0 <= place <= width and (not places or place - places[-1] > 0.5):
            places.append(place)
            kept.append(kelvin)
    top.set_xticks([1e3 / kelvin for kelvin in kept], [f"{kelvin:g}" for kelvin in kept])
    top.spines["top"].set_visible(True)
    top.set_xlabel("Temperature (K)")


def _round_temperatures(coldest: float, hottest: float) -> list[float]:
    found = MaxNLocator(12, steps=[1, 2, 2.5, 5, 10]).tick_values(coldest, hottest)
    return [float(kelvin) for kelvin in found if kelvin > 0]
