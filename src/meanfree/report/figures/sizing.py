"""The figures of `size`: time against the number that is varied, and the way to a goal."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree.experiment.experiment import Experiment
from meanfree.integrate.run import Run
from meanfree.planning.best_stop import Peak
from meanfree.planning.goal import Goal
from meanfree.planning.sizing import GEOMETRIC, Sizing
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.planning.naming import at_address, axis_label
from meanfree.report.sampling import time_axis, unit_for

POINTS = 400


def goal_words(goal: Goal, experiment: Experiment) -> str:
    """``25 % of NOCl`` or ``a yield of 0.3 NO for each NOCl``."""
    gas = wording.chemical(experiment.gas_named[goal.gas])
    if goal.kind == "conversion":
        return f"{wording.percent(goal.level)} of {gas}"
    basis = wording.chemical(experiment.gas_named[goal.basis])
    return f"a yield of {wording.number(goal.level)} {gas} for each {basis}"


def sizing_figure(sizing: Sizing, experiment: Experiment) -> Figure:
    """Above, the time to the goal; below, what is reached within the time; roots on both."""
    drawn, (above, below) = style.panels([2.4, 1.7], beside=0.35, above=0.32)
    x, times = sizing.values, sizing.times
    unit, seconds = unit_for(sizing.within)
    above.plot(x, times / seconds, "-", color=style.PALETTE[0])
    known = times[np.isfinite(times)]
    low = min([*known, sizing.within]) / seconds
    high = max([*known, sizing.within]) / seconds
    above.axhline(sizing.within / seconds, color=style.GUIDE, linewidth=1.0, linestyle=(0, (5, 3)))
    style.set_logarithmic(above, low / 2, high * 2)
    style.label(above, y=f"Time to the goal ({unit})")
    above.annotate(
        f"wanted: {wording.duration(sizing.within)}",
        (0.01, sizing.within / seconds),
        xycoords=("axes fraction", "data"),
        xytext=(0, 4),
        textcoords="offset points",
        fontsize=8.5,
        color=style.INK,
    )
    _unreached(above, x, times)
    below.plot(x, sizing.reached, "-", color=style.PALETTE[1])
    below.axhline(sizing.goal.level, color=style.GUIDE, linewidth=1.0, linestyle=(0, (5, 3)))
    top = max(float(np.nanmax(sizing.reached)), sizing.goal.level)
    style.set_linear(below, 0.0, top)
    word = "Conversion" if sizing.goal.kind == "conversion" else "Yield"
    style.label(below, y=f"{word} within\n{wording.duration(sizing.within)}")
    style.label(below, x=axis_label(sizing.address, experiment))
    for ax in (above, below):
        ax.set_xlim(float(x[0]), float(x[-1]))
        if x[0] > 0 and x[-1] / x[0] > GEOMETRIC:
            ax.set_xscale("log")
            style.plain_decades(ax.xaxis)
    _roots(above, below, sizing, experiment)
    return drawn


def _roots(above: Axes, below: Axes, sizing: Sizing, experiment: Experiment) -> None:
    seconds = unit_for(sizing.within)[1]
    marks = []
    for root in sizing.roots:
        above.plot([root.value], [sizing.within / seconds], "o", color=style.INK, markersize=5)
        below.plot([root.value], [sizing.goal.level], "o", color=style.INK, markersize=5)
        below.axvline(root.value, color=style.GUIDE, linewidth=0.8, linestyle=(0, (1, 2)))
        marks.append((root.value, at_address(root.value, sizing.address, experiment, 4)))
    labels.along_top(above, marks)


def _unreached(ax: Axes, x: np.ndarray, times: np.ndarray) -> None:
    """Shade where the goal is not reached in any time that was looked at."""
    missing = ~np.isfinite(times)
    for i in np.flatnonzero(missing):
        left = x[i] if i == 0 else 0.5 * (x[i - 1] + x[i])
        right = x[i] if i == len(x) - 1 else 0.5 * (x[i] + x[i + 1])
        ax.axvspan(left, right, color=style.GUIDE, alpha=0.18, linewidth=0)
    if missing.any():
        at = float(np.mean(x[missing]))
        ax.text(
            at,
            0.92,
            "not reached",
            transform=ax.get_xaxis_transform(),
            ha="center",
            va="top",
            fontsize=8.5,
            color=style.INK,
        )


def progress_figure(run: Run, goal: Goal, time: float | None, peaks: list[Peak]) -> Figure:
    """The goal's quantity against time with its level, and the gases that rise and fall."""
    axis = time_axis(run)
    times = axis.times(POINTS)
    experiment = run.experiment
    names = [wording.chemical(experiment.gas_named[peak.gas]) for peak in peaks]
    word = "conversion" if goal.kind == "conversion" else "yield"
    beside = labels.room_for([word, *names])
    heights = [2.6, 1.7] if peaks else [2.6]
    drawn, axes = style.panels(heights, beside=beside, above=0.32)
    values = goal.value(run, times)
    axes[0].plot(times / axis.seconds, values, **style.style_of(0))
    axes[0].axhline(goal.level, color=style.GUIDE, linewidth=1.0, linestyle=(0, (5, 3)))
    style.set_linear(axes[0], 0.0, max(float(values.max()), goal.level))
    gas = wording.chemical(experiment.gas_named[goal.gas])
    style.label(axes[0], y=f"{word.capitalize()} of {gas}")
    if peaks:
        ends = []
        for n, peak in enumerate(peaks):
            share = run.amounts(times)[run.index(peak.gas)] / peak.amount
            axes[1].plot(times / axis.seconds, share, **style.style_of(n + 1))
            colour = style.PALETTE[(n + 1) % len(style.PALETTE)]
            axes[1].plot([peak.time / axis.seconds], [1.0], "o", color=colour, markersize=5)
            ends.append(labels.EndLabel(names[n], float(share[-1]), colour))
        style.set_linear(axes[1], 0.0, 1.0)
        style.label(axes[1], y="Amount over\nits most")
        labels.at_ends(axes[1], ends)
    for ax in axes:
        style.set_time(ax, axis)
    for ax in axes[:-1]:
        ax.set_xlabel("")
    if time is not None:
        axes[0].plot([time / axis.seconds], [goal.level], "o", color=style.INK, markersize=5)
        labels.along_top(axes[0], [(time / axis.seconds, wording.duration(time))])
    return drawn
