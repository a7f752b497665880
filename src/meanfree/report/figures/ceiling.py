"""The figure `ceiling`: k against 1/T of every encounter, what lies above its ceiling shaded."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree import units
from meanfree.planning.ceiling import StepCeiling
from meanfree.report import wording
from meanfree.report.ceiling.naming import ORDER, unit_of
from meanfree.report.figures import labels, style
from meanfree.report.figures.arrhenius import LEAST, temperatures_along_top

PANELS = 4
"""Encounters in one figure; further ones go to the next."""

HEIGHT = 2.1
NAMES = ("k", "Z", "long range")
FORBIDDEN = "#883300"


def figure(steps: Sequence[StepCeiling]) -> Figure:
    """A panel for each of some encounters over one range; the run's temperature is dotted."""
    drawn, axes = style.panels([HEIGHT] * len(steps), labels.room_for(NAMES), 0.62)
    low, high = steps[0].span
    if high <= low * (1 + 1e-9):
        low, high = low / 1.05, high * 1.05
    axes[0].set_xlim(1e3 / high, 1e3 / low)
    for ax, one in zip(axes, steps, strict=True):
        _panel(ax, one)
    axes[-1].set_xlabel("1000 K / T")
    temperatures_along_top(axes[0], low, high)
    return drawn


def grouped(steps: Sequence[StepCeiling]) -> list[list[StepCeiling]]:
    """Encounters as they share a figure: one range each, at most `PANELS`, in the order given."""
    groups: list[list[StepCeiling]] = []
    for one in steps:
        fits = [group for group in groups if group[0].span == one.span and len(group) < PANELS]
        if fits:
            fits[0].append(one)
        else:
            groups.append([one])
    return groups


def _panel(ax: Axes, one: StepCeiling) -> None:
    curve, unit = one.curve, unit_of(one)
    factor = units.from_si(1.0, unit, units.rate_constant(ORDER))
    x = 1e3 / curve.temperatures
    k = np.where(curve.k * factor >= LEAST, curve.k * factor, np.nan)
    top = curve.ceiling * factor
    known = [line * factor for line in (curve.Z, curve.long_range) if line is not None]
    seen = np.concatenate([k[np.isfinite(k)], *known])
    lowest, highest = float(seen.min()), float(seen.max())
    room = 10.0 ** max(1.0, 0.25 * np.log10(highest / lowest))
    style.set_logarithmic(ax, lowest / room**0.4, highest * room)
    ax.fill_between(x, top, highest * room, color=FORBIDDEN, alpha=0.12, linewidth=0)
    lines = [("k", k, style.style_of(0))]
    if curve.Z is not None:
        lines.append(("Z", curve.Z * factor, style.style_of(1)))
    if curve.long_range is not None:
        lines.append(("long range", curve.long_range * factor, style.style_of(3)))
    ends = []
    for name, values, look in lines:
        ax.plot(x, values, **look, marker="o" if len(set(x)) == 1 else None)
        good = values[np.isfinite(values)]
        if good.size:
            # Temperatures rise, so the left end of 1/T is last and the right end first.
            ends.append(labels.EndLabel(name, float(good[0]), look["color"]))
    for crossing in one.crossings:
        if crossing.inside:
            at = float(np.interp(crossing.temperature, curve.temperatures, top))
            ax.plot([1e3 / crossing.temperature], [at], "o", color=style.INK, fillstyle="none")
    run = [level.temperature for level in one.levels if level.is_run]
    for T in run:
        ax.axvline(1e3 / T, color=style.GUIDE, linewidth=0.8, linestyle=(0, (1, 2)), zorder=0.5)
    style.label(ax, y=f"k ({wording.pretty_unit(unit)})")
    labels.at_ends(ax, ends)
    _title(ax, one)


def _title(ax: Axes, one: StepCeiling) -> None:
    """The name of the step, in the shaded band: nothing else is drawn there."""
    name, longest = wording.clean(one.name), 52
    text = name if len(name) <= longest else name[: longest - 1] + "…"
    ax.text(
        0.015,
        0.975,
        text,
        transform=ax.transAxes,
        ha="left",
        va="top",
        fontsize=9,
        color=style.INK,
    )
