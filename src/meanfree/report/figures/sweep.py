"""Figures of a sweep: a map of the median over two numbers, or a curve with its band over each."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from matplotlib.colors import LinearSegmentedColormap, LogNorm, Normalize
from matplotlib.figure import Figure
from matplotlib.ticker import NullLocator

from meanfree.campaigns.bins import Bins
from meanfree.campaigns.digest import Curve, Map
from meanfree.experiment.experiment import Experiment
from meanfree.report.figures import style
from meanfree.report.planning.naming import axis_label

SHADES = LinearSegmentedColormap.from_list("meanfree", ["#f6efdf", "#a9cbe6", "#0088ff", "#002299"])
"""From light to dark, so that a grey print keeps the order."""

FAR = 30.0
"""Values that span more than this factor are drawn by their logarithm."""


def mapped(found: Map, experiment: Experiment, label: str) -> Figure:
    """The median of one observable over two addresses; white: no run reached it."""
    width, height, left, below, beside, above = 6.4, 4.3, 0.88, 0.55, 1.35, 0.15
    drawn = Figure(figsize=(width, height))
    box = (left / width, below / height)
    ax = drawn.add_axes((*box, (width - left - beside) / width, (height - below - above) / height))
    values = np.ma.masked_invalid(found.median)
    x, y = (_outlines(bins) for bins in found.bins)
    norm = _norm(values.compressed())
    mesh = ax.pcolormesh(x, y, values, cmap=SHADES, norm=norm, rasterized=True)
    for bins, set_scale, axis in zip(
        found.bins, (ax.set_xscale, ax.set_yscale), (ax.xaxis, ax.yaxis), strict=True
    ):
        if bins.logarithmic:
            set_scale("log")
            style.plain_decades(axis)
    side = drawn.add_axes(
        ((width - beside + 0.15) / width, box[1], 0.16 / width, (height - below - above) / height)
    )
    bar = drawn.colorbar(mesh, cax=side)
    if isinstance(norm, LogNorm):
        style.plain_decades(bar.ax.yaxis)
        if norm.vmax is not None and norm.vmin is not None and norm.vmax / norm.vmin > 1e3:
            bar.ax.yaxis.set_minor_locator(NullLocator())
    bar.set_label(label)
    style.label(ax, x=axis_label(found.across, experiment), y=axis_label(found.up, experiment))
    return drawn


def marginal(curves: Sequence[Curve], experiment: Experiment, label: str) -> Figure:
    """One panel for each address: the median and the band that holds two conditions in three."""
    columns = min(len(curves), 2)
    rows = -(-len(curves) // columns)
    width = style.WIDTH if columns > 1 else 4.2
    height, gap = 2.35, 0.72
    whole = rows * height + (rows - 1) * 0.25 + 0.15
    drawn = Figure(figsize=(width, whole))
    each = (width - style.LEFT - 0.15 - (columns - 1) * gap) / columns
    every = np.concatenate([curve.quantiles.ravel() for curve in curves])
    every = every[np.isfinite(every)]
    logarithmic = _is_far(every)
    for place, curve in enumerate(curves):
        row, column = divmod(place, columns)
        bottom = whole - 0.15 - (row + 1) * height - row * 0.25 + 0.52
        at = style.LEFT + column * (each + gap)
        ax = drawn.add_axes((at / width, bottom / whole, each / width, (height - 0.52) / whole))
        low, middle, high = curve.quantiles
        x = curve.bins.centres
        many = len(x) > 1
        ax.fill_between(x, low, high, color=style.PALETTE[0], alpha=0.22, linewidth=0)
        ax.plot(x, middle, "-" if many else "o", color=style.PALETTE[0])
        if curve.bins.logarithmic:
            ax.set_xscale("log")
            style.plain_decades(ax.xaxis)
        if len(every):
            _scaled(ax, float(every.min()), float(every.max()), logarithmic)
        style.label(ax, x=axis_label(curve.address, experiment), y="" if column else label)
        ax.yaxis.label.set_fontsize(8.5)
    return drawn


def _scaled(ax: Any, low: float, high: float, logarithmic: bool) -> None:
    if logarithmic:
        style.set_logarithmic(ax, low / 1.15, high * 1.15)
    else:
        room = 0.06 * (high - low) or 0.06 * abs(high) or 1.0
        ax.set_ylim(low - room, high + room)


def _is_far(values: Any) -> bool:
    return bool(len(values) and values.min() > 0 and values.max() > FAR * values.min())


def _norm(values: Any) -> Normalize:
    if not len(values):
        return Normalize(0.0, 1.0)
    low, high = float(values.min()), float(values.max())
    if _is_far(values):
        return LogNorm(low, high)
    if low == high:
        return Normalize(low - 0.5 * (abs(low) or 1.0), high + 0.5 * (abs(high) or 1.0))
    return Normalize(low, high)


def _outlines(bins: Bins) -> Any:
    """Outer edges of cells about their centres."""
    centres = np.asarray(bins.centres, float)
    if len(centres) == 1:
        half = 0.05 * abs(float(centres[0])) or 0.5
        return np.array([centres[0] - half, centres[0] + half])
    inner = bins.edges
    if bins.logarithmic:
        first = centres[0] ** 2 / inner[0]
        last = centres[-1] ** 2 / inner[-1]
    else:
        first, last = 2 * centres[0] - inner[0], 2 * centres[-1] - inner[-1]
    assert math.isfinite(first) and math.isfinite(last)
    return np.concatenate([[first], inner, [last]])
