"""The figure `window`: contours of the time to a goal, and what forbids a run, shaded and named."""

from __future__ import annotations

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Patch

from meanfree.equations.system import Floats
from meanfree.experiment.experiment import Experiment
from meanfree.planning.window import Window
from meanfree.planning.window_reasons import Axis
from meanfree.report import wording
from meanfree.report.figures import style
from meanfree.report.planning.naming import axis_label

SHADES: dict[str, tuple[str, str]] = {
    "shorter than mixing": ("#8888bb", "...."),
    "shorter than the warm-up": ("#cc7700", "////"),
    "longer than patience": ("#442255", "\\\\\\\\"),
    "stopped by equilibrium": ("#0088ff", "----"),
    "above the rated pressure": ("#883300", "xxxx"),
    "above the collision limit": ("#552222", "++++"),
    "condensing": ("#aa8877", "oooo"),
}
"""Colour and hatching of each region: they differ in grey print too."""

NICE = (
    *(1e-6, 1e-5, 1e-4, 1e-3, 1e-2, 0.1, 1.0, 10.0, 60.0, 600.0, 3600.0),
    *(4 * 3600.0, 8 * 3600.0, 86400.0, 7 * 86400.0, 30 * 86400.0, 365.25 * 86400.0),
)
"""Times that contours are drawn for [s], where the map has at least `FEW` of them."""

FEW, LINES = 3, 6
"""Fewer lines than this do not show how the time goes; then there are about so many, rounded."""

FLAT = 1e-3
"""Times that differ by less are one time."""

UNREACHED = ("#777777", "|||")
"""Colour and hatching of what is not reached for no reason that is known."""


def figure(found: Window, experiment: Experiment) -> Figure:
    """The map with its legend beside it."""
    width, height, left, beside, below, above = 7.4, 4.6, 0.88, 2.25, 0.55, 0.15
    drawn = Figure(figsize=(width, height))
    box = (left / width, below / height)
    size = ((width - left - beside) / width, (height - below - above) / height)
    ax = drawn.add_axes((*box, *size))
    x, y = found.across.values, found.up.values
    ax.set_xlim(float(x[0]), float(x[-1]))
    ax.set_ylim(float(y[0]), float(y[-1]))
    for axis, set_scale, places in (
        (found.across, ax.set_xscale, ax.xaxis),
        (found.up, ax.set_yscale, ax.yaxis),
    ):
        if axis.is_geometric:
            set_scale("log")
            style.plain_decades(places)
    handles: list[Artist] = [
        _shade(ax, found, margin, name, *SHADES[name]) for name, margin in found.margins.items()
    ]
    if found.unreached.any():
        words = f"not reached in {wording.duration(found.until)}"
        handles.append(_shade(ax, found, np.where(found.unreached, 0.5, -0.5), words, *UNREACHED))
    _contours(ax, found)
    inside = [
        _within(value, axis)
        for value, axis in zip(found.base, (found.across, found.up), strict=True)
    ]
    if all(inside):
        (point,) = ax.plot(
            *found.base,
            "o",
            markerfacecolor="white",
            markeredgecolor=style.INK,
            markeredgewidth=1.5,
            markersize=13,
            linestyle="none",
            label="the case",
            zorder=5,
        )
        handles.append(point)
    if found.middle is not None:
        row, column = found.middle
        (point,) = ax.plot(
            [x[column]],
            [y[row]],
            "*",
            color=style.PALETTE[0],
            markersize=11,
            linestyle="none",
            label="middle of the window",
            zorder=6,
        )
        handles.append(point)
    ax.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(1.02, 1.01),
        frameon=False,
        fontsize=8.5,
        handlelength=1.8,
        handleheight=1.4,
        borderaxespad=0.0,
    )
    style.label(ax, x=axis_label(found.across.address, experiment))
    style.label(ax, y=axis_label(found.up.address, experiment))
    return drawn


def _within(value: float, axis: Axis) -> bool:
    return bool(axis.values[0] <= value <= axis.values[-1])


def _shade(ax: Axes, found: Window, margin: Floats, name: str, colour: str, hatch: str) -> Patch:
    x, y = found.across.values, found.up.values
    top = float(margin.max()) + 1.0
    ax.contourf(x, y, margin, levels=[0.0, top], colors=[colour], alpha=0.22, zorder=1)
    hatched = ax.contourf(x, y, margin, levels=[0.0, top], colors="none", hatches=[hatch])
    hatched.set_edgecolor(colour)
    hatched.set_linewidth(0.0)
    if margin.min() < 0:
        ax.contour(x, y, margin, levels=[0.0], colors=[colour], linewidths=1.4, zorder=2)
    return Patch(facecolor=(*_rgb(colour), 0.22), edgecolor=colour, hatch=hatch, label=name)


def _rgb(colour: str) -> tuple[float, float, float]:
    red, green, blue = (int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5))
    return red, green, blue


def _contours(ax: Axes, found: Window) -> None:
    """Lines of equal time, each with its time written on it."""
    time = np.ma.masked_invalid(found.time)
    if time.count() == 0:
        return
    low, high = float(time.min()), float(time.max())
    levels = _levels(low, high)
    if not levels:
        words = f"{wording.duration(low)} everywhere"
        ax.text(0.02, 0.03, words, transform=ax.transAxes, fontsize=8.5, zorder=4)
        return
    lines = ax.contour(
        found.across.values,
        found.up.values,
        np.ma.log(time),
        levels=np.log(levels),
        colors=style.INK,
        linewidths=1.0,
        linestyles="solid",
        zorder=3,
    )
    texts = ax.clabel(
        lines,
        fontsize=8.5,
        fmt={float(level): wording.duration(float(np.exp(level))) for level in lines.levels},
    )
    for text in texts:
        text.set_bbox({"facecolor": "white", "alpha": 0.8, "edgecolor": "none", "pad": 1.0})
        text.set_zorder(4)


def _levels(low: float, high: float) -> list[float]:
    """Times between two others that lines are drawn for [s]: familiar ones, or rounded ones."""
    levels = [level for level in NICE if low < level < high]
    if len(levels) >= FEW or not high > low * (1 + FLAT):
        return levels
    for digits in (1, 2, 3):
        even = np.geomspace(low, high, LINES + 2)[1:-1]
        rounded = sorted({float(f"{value:.{digits}g}") for value in even})
        levels = [level for level in rounded if low < level < high]
        if len(levels) >= FEW:
            break
    return levels
