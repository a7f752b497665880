"""The figure `half_lives`: what is left of the reactants, with the half-lives measured on it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.run_models import GasAnswer, RunSummary
from meanfree.report.sampling import SPREAD, TimeAxis, figure_times, time_axis, unit_for

MARKED = 4
"""Half-lives marked in the figure; the table has them all."""

MOST_GASES = 8
ORDINALS = ("first", "second", "third", "fourth")


def figure(run: Run, summary: RunSummary) -> Figure:
    """Fraction left of every filled gas that is consumed; half-lives of the watched one."""
    watched = summary.gas(summary.watched_gas) if summary.watched_gas else None
    axis = _axis(run, watched)
    times = figure_times(run, axis)
    names = _names(run, summary)
    printed = [wording.chemical(run.experiment.gas_named[gas]) for gas in names]
    drawn, (ax,) = style.panels([3.1], beside=labels.room_for(printed), above=0.12)
    ends = []
    for n, gas in enumerate(names):
        left = run.remaining(gas, times)
        ax.plot(times / axis.seconds, left, **style.style_of(n))
        ends.append(labels.EndLabel(printed[n], float(left[-1]), style.PALETTE[n]))
    highest = max((float(np.max(run.remaining(gas, times))) for gas in names), default=1.0)
    style.set_time(ax, axis)
    style.set_linear(ax, 0.0, max(highest, 1.0))
    style.label(ax, y="Fraction left, n / n₀")
    labels.at_ends(ax, ends)
    if watched is not None:
        _mark(ax, watched, axis)
        _rest(ax, watched)
    return drawn


def _names(run: Run, summary: RunSummary) -> list[str]:
    names = list(run.consumed)[:MOST_GASES]
    watched = summary.watched_gas
    if watched in names:
        names.remove(watched)
        names.insert(0, watched)
    return names


def _axis(run: Run, watched: GasAnswer | None) -> TimeAxis:
    """The run's time axis, shortened to the marked half-lives where the run goes on for long."""
    axis = time_axis(run)
    done = [t for t in (watched.half_lives_s if watched else []) if t is not None][:MARKED]
    if not done:
        return axis
    end = min(axis.end, 1.4 * sum(done))
    if end <= SPREAD * done[0]:
        return TimeAxis(False, 0.0, end, *unit_for(end))
    return replace(axis, end=end)


def _mark(ax: Axes, watched: GasAnswer, axis: TimeAxis) -> None:
    """A span from the start of each half-life to its end, at the level that it reaches."""
    start = 0.0
    for place, lasted in enumerate(watched.half_lives_s[:MARKED]):
        if lasted is None:
            break
        level, end = 0.5 ** (place + 1), start + lasted
        left, right = max(start, axis.start) / axis.seconds, end / axis.seconds
        ax.plot([left, right], [level, level], color=style.GUIDE, linewidth=0.9, zorder=0.6)
        ax.plot([left], [level], marker="|", color=style.GUIDE, markersize=6, zorder=0.6)
        ax.plot([right], [level], marker="o", color=style.PALETTE[0], markersize=4.5)
        text = f"{ORDINALS[place]}: {wording.duration(lasted)}"
        far = labels.place_of(ax, right) + labels.width_of(ax, text) > 1.02
        ax.annotate(
            text,
            (right, level),
            xytext=(-7, -10) if far else (8, 5),
            textcoords="offset points",
            ha="right" if far else "left",
            fontsize=8.5,
            color=style.INK,
        )
        start = end


def _rest(ax: Axes, watched: GasAnswer) -> None:
    """The level at which equilibrium stops it, where that is above what the half-lives show."""
    if watched.equilibrium_conversion is None:
        return
    left = 1.0 - watched.equilibrium_conversion
    if not 0.02 < left < 1.0:
        return
    ax.axhline(left, color=style.GUIDE, linewidth=0.9, linestyle=(0, (5, 3)), zorder=0.6)
    ax.annotate(
        f"equilibrium: {wording.percent(left)} left",
        (0.015, left),
        xycoords=("axes fraction", "data"),
        xytext=(0, -11),
        textcoords="offset points",
        fontsize=8.5,
        color=style.INK,
    )
    if left > 0.5:
        ax.axhline(0.5, color=style.GUIDE, linewidth=0.9, linestyle=(0, (1, 2)), zorder=0.6)
        ax.annotate(
            "half: not reached",
            (0.015, 0.5),
            xycoords=("axes fraction", "data"),
            xytext=(0, -11),
            textcoords="offset points",
            fontsize=8.5,
            color=style.INK,
        )
