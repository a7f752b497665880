"""Figures of sensitivity and uncertainty: ranked bars, curves against time, bands, convergence."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.figure import Figure

from meanfree.experiment.experiment import Experiment
from meanfree.integrate.run import Run
from meanfree.planning.sensitivity import Sensitivities
from meanfree.planning.uncertainty import Uncertainty
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.sampling import TimeAxis, unit_for

MOST_BARS = 20
MOST_CURVES = 8
SMALL = 1e-3
"""Sensitivities below this share of the largest are not drawn."""


def ranked(found: Sensitivities, names: Sequence[str], experiment: Experiment) -> Figure:
    """Bars of d ln(first reading)/d ln(input), the largest on top."""
    values = found.values[0][:, 0]
    largest = np.nanmax(np.abs(values), initial=0.0)
    order = [
        i
        for i in np.argsort(-np.abs(values))
        if np.isfinite(values[i]) and abs(values[i]) > SMALL * largest
    ][:MOST_BARS]
    height = 0.27 * max(len(order), 1) + 0.75
    left = 0.3 + 0.075 * max((len(names[i]) for i in order), default=10)
    drawn = Figure(figsize=(style.WIDTH, height))
    box = (left / style.WIDTH, 0.52 / height, (style.WIDTH - left - 0.3) / style.WIDTH)
    ax = drawn.add_axes((*box, (height - 0.62) / height))
    span = float(largest) or 1.0
    for place, i in enumerate(order):
        value = float(values[i])
        colour = style.PALETTE[0] if value > 0 else style.PALETTE[1]
        ax.barh(-place, value, height=0.62, color=colour)
        ax.annotate(
            wording.number(value),
            (value, -place),
            xytext=(4 if value > 0 else -4, 0),
            textcoords="offset points",
            ha="left" if value > 0 else "right",
            va="center",
            fontsize=8.5,
            color=style.INK,
        )
    ax.axvline(0.0, color=style.INK, linewidth=0.8)
    low = min([float(values[i]) for i in order], default=0.0)
    high = max([float(values[i]) for i in order], default=0.0)
    ax.set_xlim(low - 0.22 * span if low < 0 else 0.0, high + 0.22 * span if high > 0 else 0.0)
    ax.set_ylim(-max(len(order), 1) + 0.4, 0.6)
    ax.set_yticks([-place for place in range(len(order))])
    ax.set_yticklabels([names[i] for i in order], fontsize=8.5)
    ax.tick_params(axis="y", length=0)
    style.label(ax, x="d ln(time) / d ln(input)")
    return drawn


def against_time(found: Sensitivities, names: Sequence[str], experiment: Experiment) -> Figure:
    """d ln(conversion)/d ln(input) against time, the largest curves."""
    place = next(r for r, reading in enumerate(found.readings) if reading.times)
    reading, values = found.readings[place], found.values[place]
    times = np.array(reading.times)
    axis = TimeAxis(False, 0.0, float(times[-1]), *unit_for(float(times[-1])))
    size = np.nanmax(np.abs(values), axis=1)
    order = [i for i in np.argsort(-size) if size[i] > SMALL * np.nanmax(size)][:MOST_CURVES]
    # A temperature follows by tens where rates follow by one: a panel of its own.
    hot = [i for i in order if found.knobs[i].kind == "temperature"]
    cool = [i for i in order if i not in hot]
    groups = [group for group in (cool, hot) if group]
    room = labels.room_for([names[i] for i in order])
    heights = [2.5, 1.6][: len(groups)]
    drawn, axes = style.panels(heights, beside=room, above=0.12)
    gas = wording.chemical(experiment.gas_named[reading.gas])
    symbol = "X" if reading.kind == "conversion" else "Y"
    for ax, group in zip(axes, groups, strict=True):
        ends = []
        for i in group:
            place = order.index(i)
            ax.plot(times / axis.seconds, values[i], **style.style_of(place))
            colour = style.PALETTE[place % len(style.PALETTE)]
            ends.append(labels.EndLabel(names[i], float(values[i][-1]), colour))
        ax.axhline(0.0, color=style.GUIDE, linewidth=0.8)
        ax.margins(y=0.08)
        style.set_linear(ax, None, 1.0)
        style.set_time(ax, axis)
        labels.at_ends(ax, ends)
    for ax in axes[:-1]:
        ax.set_xlabel("")
    style.label(axes[0], y=f"d ln {symbol}({gas}) / d ln(input)")
    return drawn


def bands(found: Uncertainty, run: Run) -> Figure:
    """Median and bands of the conversion against time."""
    reading, quantiles = found.readings[1], found.quantiles[1]
    times = np.array(reading.times)
    axis = TimeAxis(False, 0.0, float(times[-1]), *unit_for(float(times[-1])))
    drawn, (ax,) = style.panels([2.9], beside=0.3, above=0.12)
    x = times / axis.seconds
    ax.fill_between(x, quantiles[0], quantiles[4], color=style.PALETTE[0], alpha=0.16, linewidth=0)
    ax.fill_between(x, quantiles[1], quantiles[3], color=style.PALETTE[0], alpha=0.28, linewidth=0)
    ax.plot(x, quantiles[2], color=style.PALETTE[0])
    style.set_time(ax, axis)
    style.set_linear(ax, 0.0, float(np.nanmax(quantiles)))
    gas = wording.chemical(run.experiment.gas_named[reading.gas])
    style.label(ax, y=f"{reading.kind.capitalize()} of {gas}")
    return drawn


def convergence(found: Uncertainty) -> Figure:
    """Quantiles of the first reading against the number of runs."""
    growing = found.growing[0][:, :, 0]
    drawn, (ax,) = style.panels([2.0], beside=0.85, above=0.12)
    finite = growing[np.isfinite(growing)]
    seconds = 1.0
    if len(finite):
        unit, seconds = unit_for(float(np.median(finite)))
        style.label(ax, y=f"Time to the goal ({unit})")
    ends = []
    for row, name in ((4, "97.5 %"), (3, "84 %"), (2, "median"), (1, "16 %"), (0, "2.5 %")):
        colour = style.PALETTE[0] if row == 2 else style.GUIDE
        ax.plot(found.counts, growing[:, row] / seconds, "o-", color=colour, markersize=3.5)
        if np.isfinite(growing[-1, row]):
            ends.append(labels.EndLabel(name, float(growing[-1, row] / seconds), colour))
    ax.set_xscale("log", base=2)
    ax.set_xticks(found.counts)
    ax.set_xticklabels([str(count) for count in found.counts])
    ax.minorticks_off()
    if len(finite) and finite.max() > 8 * finite.min():
        style.set_logarithmic(ax, finite.min() / seconds / 1.5, finite.max() / seconds * 1.5)
    style.label(ax, x="Runs")
    labels.at_ends(ax, ends)
    return drawn
