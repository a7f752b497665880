"""The figure `rates`: how fast each step runs, forward and reverse in one colour."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree.equations.build import REVERSE_SUFFIX
from meanfree.equations.system import Floats
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.sampling import figure_times, time_axis

MOST_STEPS = 8
FAINT = 1e-3
"""Ratio of the smallest to the largest peak below which rates are shown logarithmic."""

_PREFIXES = (
    (1.0, "mol/m³/s"),
    (1e-3, "mmol/m³/s"),
    (1e-6, "µmol/m³/s"),
    (1e-9, "nmol/m³/s"),
    (1e-12, "pmol/m³/s"),
)


def figure(run: Run) -> Figure:
    """Rates of the fastest steps against time; a reverse step is the thin line of its forward."""
    axis = time_axis(run)
    times = figure_times(run, axis)
    rates = run.rates(times) if run.system.n_steps else np.zeros((0, len(times)))
    pairs = _pairs(run, rates)
    words = [_short(wording.clean(run.system.steps[j])) for pair in pairs for j in pair]
    drawn, (ax,) = style.panels([3.1], beside=labels.room_for(words), above=0.12)
    peaks = np.array([rates[j].max() for pair in pairs for j in pair], float)
    highest = float(peaks.max(initial=0.0))
    faint = bool(np.any(peaks > 0)) and float(peaks[peaks > 0].min()) < FAINT * highest
    size, unit = next((p for p in _PREFIXES if highest >= 0.3 * p[0]), _PREFIXES[-1])
    ends: list[labels.EndLabel] = []
    for n, pair in enumerate(pairs):
        for which, j in enumerate(pair):
            values = np.where(rates[j] > 0, rates[j], np.nan) if faint else rates[j]
            look = style.style_of(n) | {"linewidth": 1.8 if which == 0 else 1.0}
            ax.plot(times / axis.seconds, values / size, **look)
            name = _short(wording.clean(run.system.steps[j]))
            end = float(np.nan_to_num(values[-1])) / size
            ends.append(labels.EndLabel(name, end, style.PALETTE[n % len(style.PALETTE)]))
    style.set_time(ax, axis)
    _set_rate(ax, faint, peaks / size, highest / size)
    style.label(ax, y=f"Rate ({unit})")
    labels.at_ends(ax, ends)
    return drawn


def _set_rate(ax: Axes, faint: bool, peaks: Floats, highest: float) -> None:
    if faint:
        low = max(float(peaks[peaks > 0].min()) * 1e-2, highest * 1e-15)
        style.set_logarithmic(ax, low, 3 * highest)
    else:
        style.set_linear(ax, 0.0, highest)


def _short(name: str) -> str:
    return "reverse" if name.endswith(REVERSE_SUFFIX) else name


def _pairs(run: Run, rates: Floats) -> list[list[int]]:
    """Places of each forward step with its reverse, the fastest if there are many."""
    steps = run.system.steps
    pairs: list[list[int]] = []
    for j, name in enumerate(steps):
        if name.endswith(REVERSE_SUFFIX) and pairs and steps[j - 1] + REVERSE_SUFFIX == name:
            pairs[-1].append(j)
        else:
            pairs.append([j])
    most = MOST_STEPS if not any(len(pair) > 1 for pair in pairs) else MOST_STEPS // 2
    fastest = sorted(pairs, key=lambda pair: -float(rates[pair].max()))[:most]
    return [pair for pair in pairs if pair in fastest]
