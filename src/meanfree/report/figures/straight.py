"""Straight lines through points: k against something, and Arrhenius under its ceiling."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree import units
from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.gases.gas import Gas
from meanfree.measured.arrhenius_lines import TemperatureSeries
from meanfree.measured.straight_lines import Line
from meanfree.rates.ceiling import ceiling
from meanfree.report import wording
from meanfree.report.figures import labels, style

POINTS: Final[int] = 120


def line_figure(
    line: Line,
    x_label: str,
    y_label: str,
    *,
    x_scale: float = 1.0,
    y_scale: float = 1.0,
    from_zero: bool = True,
) -> Figure:
    """Points with bars, the line, and its 95 % band; the axes in SI over the scales."""
    drawn, (ax,) = style.panels([3.0], beside=0.25, above=0.12)
    low, high = float(line.x.min()), float(line.x.max())
    room = 0.05 * (high - low)
    start = 0.0 if from_zero and low >= 0 else low - room
    x = np.linspace(start, high + room, POINTS)
    y, half = line.at(x), line.quantile * line.error_at(x)
    ax.plot(x / x_scale, y / y_scale, color=style.PALETTE[0], linewidth=1.4)
    if np.all(np.isfinite(half)):
        ax.fill_between(
            x / x_scale,
            (y - half) / y_scale,
            (y + half) / y_scale,
            color=style.PALETTE[0],
            alpha=0.18,
            linewidth=0,
        )
    bars = None if line.sd is None else line.sd / y_scale
    ax.errorbar(
        line.x / x_scale,
        line.y / y_scale,
        yerr=bars,
        fmt="o",
        color=style.PALETTE[1],
        markersize=4.5,
        markerfacecolor="white",
        elinewidth=0.8,
        capsize=1.5,
    )
    bottom, top = ax.get_ylim()
    style.set_linear(ax, min(0.0, bottom) if from_zero and low >= 0 else bottom, top / 1.06)
    if top <= 0:  # logarithms, say: there is nothing to see up to zero
        ax.set_ylim(bottom, top)
    ax.set_xlim(start / x_scale, (high + room) / x_scale)
    style.label(ax, x=x_label, y=y_label)
    return drawn


def arrhenius_figure(
    series: TemperatureSeries,
    order: float,
    unit: str,
    partners: tuple[Gas, ...],
    diameter: float | None,
) -> Figure:
    """k against 1000 K / T with band, the line of centres, and the ceiling where there is one."""
    T = np.array([point.temperature for point in series.points])
    low, high = 1e3 / T.max(), 1e3 / T.min()
    room = 0.06 * (high - low)
    x = np.linspace(low - room, high + room, POINTS)
    temperatures = 1e3 / x
    dimension = units.rate_constant(order)

    def shown(k: Floats) -> Floats:
        return k * units.from_si(1.0, unit, dimension)

    curves: list[tuple[str, Floats]] = [("fit", shown(series.k(temperatures)))]
    limits = [ceiling(partners, float(one), diameter) for one in temperatures]
    if series.centres is not None and all(limit is not None for limit in limits):
        Z = np.array([limit.Z for limit in limits if limit is not None])
        energy = np.exp(-series.centres.threshold.value / (R * temperatures))
        curves.append(("Z exp(−E0/RT)", shown(Z * energy)))
        curves.append(("Z, the ceiling", shown(Z)))
    drawn, (ax,) = style.panels([3.6], labels.room_for([name for name, _ in curves]), 0.5)
    ends = []
    for n, (name, values) in enumerate(curves):
        look = style.style_of(n) | {"linewidth": 1.4}
        ax.plot(x, values, **look)
        ends.append(labels.EndLabel(name, float(values[-1]), look["color"]))
    bottom, top = series.band(temperatures)
    ax.fill_between(x, shown(bottom), shown(top), color=style.PALETTE[0], alpha=0.18, linewidth=0)
    _points(ax, series, T, shown)
    everything = np.concatenate([values for _, values in curves])
    style.set_logarithmic(ax, _decade(everything.min(), -1), _decade(everything.max(), 1))
    ax.set_xlim(float(x[0]), float(x[-1]))
    style.label(ax, x="1000 K / T", y=f"k per event ({wording.pretty_unit(unit)})")
    _along_top(ax, T)
    labels.at_ends(ax, ends)
    return drawn


def _points(ax: Axes, series: TemperatureSeries, T: Floats, shown: object) -> None:
    assert callable(shown)
    k = shown(np.array([point.k for point in series.points]))
    errors = np.array([point.error for point in series.points])
    bars = None
    if np.all(np.isfinite(errors)):
        bars = np.stack([k * (1 - np.exp(-errors)), k * (np.exp(errors) - 1)])
    ax.errorbar(
        1e3 / T,
        k,
        yerr=bars,
        fmt="o",
        color=style.PALETTE[1],
        markersize=4.5,
        markerfacecolor="white",
        elinewidth=0.8,
        capsize=1.5,
        zorder=5,
    )


def _decade(value: float, side: int) -> float:
    log = np.log10(value) + 0.15 * side
    return float(10.0 ** (np.floor(log) if side < 0 else np.ceil(log)))


def _along_top(ax: Axes, T: Sequence[float] | Floats) -> None:
    """Round temperatures along the top edge."""
    span = float(np.max(T) - np.min(T))
    step = next(s for s in (10, 20, 25, 50, 100, 200, 250, 500, 1000, 2000) if span / s <= 6)
    first = int(np.ceil(float(np.min(T)) / step)) * step
    marks = list(range(first, int(np.max(T)) + 1, step))
    top = ax.twiny()
    top.set_xlim(ax.get_xlim())
    top.set_xticks([1e3 / mark for mark in marks], [f"{mark} K" for mark in marks])
    top.tick_params(length=3, labelsize=8.5)
    top.spines["top"].set_visible(True)
