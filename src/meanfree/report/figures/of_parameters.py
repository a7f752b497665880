"""The figures `profiles` and `correlations`: how well each number is known, and with whom."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from matplotlib.ticker import MaxNLocator

from meanfree.measured.fits import Estimate, Fit
from meanfree.report import wording
from meanfree.report.figures import style

ACROSS: Final[int] = 2
LONGEST: Final[int] = 34


def profiles(fit: Fit) -> Figure | None:
    """Square root of the excess against each parameter: straight lines where intervals are even."""
    shown = [one for one in fit.estimates if one.profile is not None]
    if not shown:
        return None
    drawn, axes = _grid(len(shown))
    for ax, one in zip(axes, shown, strict=True):
        _profile(ax, one)
    return drawn


def _grid(count: int) -> tuple[Figure, list[Axes]]:
    across = min(ACROSS, count)
    down = -(-count // across)
    height, above, below, between, left = 1.75, 0.2, 0.52, 0.62, 0.62
    whole = down * height + (down - 1) * between + above + below
    figure = Figure(figsize=(style.WIDTH, whole))
    width = (style.WIDTH - across * left - 0.35) / across if across > 1 else 3.6
    axes = []
    for n in range(count):
        row, column = divmod(n, across)
        x = left + column * (width + left)
        y = whole - above - (row + 1) * height - row * between
        box = (x / style.WIDTH, y / whole, width / style.WIDTH, height / whole)
        axes.append(figure.add_axes(box))
    return figure, axes


def _profile(ax: Axes, one: Estimate) -> None:
    profile, parameter = one.profile, one.parameter
    assert profile is not None
    goal = np.sqrt(profile.threshold)
    root = np.sqrt(np.maximum(profile.excess, 0.0))
    near = root <= 2.5 * goal
    power = np.floor(np.log10(abs(one.value))) if one.value != 0 else 0.0
    scale = 10.0**power if not -3 < power < 5 else 1.0
    x = np.array([parameter.outer(float(u)) for u in profile.at[near]]) / scale
    ax.plot(x, root[near], color=style.PALETTE[0], marker="o", markersize=3, linewidth=1.4)
    ax.axhline(goal, color=style.GUIDE, linewidth=0.8, linestyle=(0, (4, 2)))
    for end in (one.low, one.high):
        if (np.isfinite(end) and end > 0) or (np.isfinite(end) and not parameter.logarithmic):
            ax.axvline(
                end / scale, ymax=0.9, color=style.GUIDE, linewidth=0.8, linestyle=(0, (1, 2))
            )
    ax.set_ylim(0.0, 1.6 * goal)
    ax.xaxis.set_major_locator(MaxNLocator(4, steps=[1, 2, 2.5, 5, 10]))
    ax.yaxis.set_major_locator(MaxNLocator(4))
    unit = wording.pretty_unit(parameter.unit)
    if scale != 1.0:
        unit = f"{wording.power_of_ten(scale)} {unit}".strip()
    name = short(parameter.address)
    style.label(ax, x=f"{name} ({unit})" if unit else name, y="√ excess")
    ax.xaxis.label.set_fontsize(8.5)


def short(address: str) -> str:
    """An address that fits under a panel."""
    text = wording.clean(address).removeprefix("steps.").removeprefix("data.")
    return text if len(text) <= LONGEST else f"…{text[-LONGEST + 1 :]}"


def correlations(fit: Fit) -> Figure | None:
    """The correlation matrix as shades with its numbers; None for a single parameter."""
    n = len(fit.parameters)
    if n < 2 or n > 20:
        return None
    names = [short(parameter.address) for parameter in fit.parameters]
    cell = 0.55 if n <= 8 else 0.24
    left = 0.3 + 0.078 * max(len(name) for name in names)
    side = n * cell
    height = side + 0.25 + left
    figure = Figure(figsize=(style.WIDTH, height))
    box = (left / style.WIDTH, (height - side - 0.15) / height, side / style.WIDTH, side / height)
    ax = figure.add_axes(box)
    _cells(ax, np.where(np.isfinite(fit.correlation), fit.correlation, 0.0))
    if n <= 8:
        _numbers(ax, fit.correlation)
    ax.set_xticks(range(n), names, rotation=90)
    ax.set_yticks(range(n), names)
    ax.tick_params(length=0)
    for spine in ax.spines.values():
        spine.set_visible(False)
    return figure


def _cells(ax: Axes, matrix: np.ndarray) -> None:
    """A shade a cell, as shapes: a page that allows no pictures from elsewhere shows them too."""
    shades = _shades()
    n = len(matrix)
    for i, row in enumerate(matrix):
        for j, value in enumerate(row):
            color = shades(0.5 + 0.5 * float(value))
            ax.add_patch(Rectangle((j - 0.5, i - 0.5), 1, 1, facecolor=color, linewidth=0))
    ax.set_xlim(-0.5, n - 0.5)
    ax.set_ylim(n - 0.5, -0.5)


def _shades() -> Any:
    from matplotlib.colors import LinearSegmentedColormap

    return LinearSegmentedColormap.from_list("signs", ["#cc7700", "#ffffff", "#002299"])


def _coefficient(value: float) -> str:
    """Two decimals, and more for what is nearly 1: all but 1 says that two go together.

    >>> _coefficient(0.314), _coefficient(-0.99863), _coefficient(1.0), _coefficient(float("nan"))
    ('0.31', '−0.9986', '1', '–')
    """
    if not np.isfinite(value):
        return "–"
    if abs(value) > 1 - 1e-12:
        return "1" if value > 0 else "−1"
    digits = 2
    while digits < 6 and abs(round(value, digits)) == 1:
        digits += 1
    digits += digits > 2
    return f"{value:.{digits}f}".replace("-", "−")


def _numbers(ax: Axes, matrix: np.ndarray) -> None:
    for i, row in enumerate(matrix):
        for j, value in enumerate(row):
            text = _coefficient(float(value))
            dark = np.isfinite(value) and value > 0.6
            color = "white" if dark else style.INK
            ax.text(j, i, text, ha="center", va="center", fontsize=8, color=color)
