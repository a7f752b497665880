"""The figure `profiles`: concentrations against time, and whatever else moves.

Pressure, volume and temperature each have a panel of their own below, where they change.
"""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree import units
from meanfree.equations.system import Floats
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.run_models import RunSummary
from meanfree.report.sampling import TimeAxis, figure_times, time_axis

FAINT = 0.03
"""Ratio of the smallest to the largest peak below which concentrations are shown logarithmic."""

MOST_GASES = 16
"""More gases than this are not drawn; `profiles.csv` has them all."""

MOVES = 1e-3
"""Relative change above which pressure, volume or temperature has a panel."""

_PREFIXES = ((1.0, "mol/m³"), (1e-3, "mmol/m³"), (1e-6, "µmol/m³"), (1e-9, "nmol/m³"))


def drawn_gases(run: Run) -> list[str]:
    """The gases that take part in a step and are ever there, the most plentiful if many."""
    times = run.trajectory.times
    peak = run.concentrations(times).max(axis=1)
    net = {
        int(i) for i, n in zip(run.system.net.column, run.system.net.value, strict=True) if n != 0
    }
    taking_part = [i for i in range(run.system.n_gases) if i in net and peak[i] > 0]
    chosen = sorted(taking_part, key=lambda i: -peak[i])[:MOST_GASES]
    return [run.system.gases[i] for i in sorted(chosen)]


def figure(run: Run, summary: RunSummary) -> Figure:
    """Species against time, with a panel for everything else that moves."""
    axis = time_axis(run)
    times = figure_times(run, axis)
    others = _moving(run, times)
    names = drawn_gases(run)
    room = labels.room_for([wording.chemical(run.experiment.gas_named[name]) for name in names])
    drawn, axes = style.panels([3.3, *[1.25] * len(others)], beside=room, above=0.32)
    _species(axes[0], run, names, times, axis)
    for ax, (title, values) in zip(axes[1:], others, strict=True):
        ax.plot(times / axis.seconds, values, color=style.INK, linewidth=1.5)
        style.set_linear(ax, None, 1.0)
        ax.margins(y=0.12)
        style.label(ax, y=title)
    for ax in axes:
        style.set_time(ax, axis)
    for ax in axes[:-1]:
        ax.set_xlabel("")
    _name(axes[0], run, names)
    labels.along_top(axes[0], _marks(summary, axis))
    return drawn


def _moving(run: Run, times: Floats) -> list[tuple[str, Floats]]:
    """(axis label, values) of pressure, volume and temperature, each where it changes."""
    shown = wording.units_in_use(run.experiment)
    found: list[tuple[str, Floats]] = []
    for name, unit, dimension, values in (
        ("Pressure", shown.pressure, "pressure", run.pressure(times)),
        ("Volume", shown.volume, "volume", run.volume(times)),
        ("Temperature", "K", "temperature", run.temperature(times)),
    ):
        if np.ptp(values) > MOVES * abs(values[0]):
            scale = np.array([units.from_si(float(v), unit, dimension) for v in (0.0, 1.0)])
            converted = scale[0] + (scale[1] - scale[0]) * values
            found.append((f"{name}\n({wording.pretty_unit(unit)})", converted))
    return found


def _unit(run: Run, peak: float) -> tuple[float, str]:
    """mol/m^3 in one unit of the axis, and its name."""
    unit = wording.units_in_use(run.experiment).concentration
    if unit != "mol/m^3":
        return 1.0 / units.from_si(1.0, unit, "concentration"), wording.pretty_unit(unit)
    return next((p for p in _PREFIXES if peak >= 0.3 * p[0]), _PREFIXES[-1])


def _species(ax: Axes, run: Run, names: list[str], times: Floats, axis: TimeAxis) -> None:
    rows = [run.index(name) for name in names]
    c = run.concentrations(times)[rows]
    peaks = c.max(axis=1, initial=0.0)
    highest = float(peaks.max(initial=0.0))
    size, unit = _unit(run, highest)
    faint = float(peaks.min(initial=highest)) < FAINT * highest
    for n, values in enumerate(c):
        shown = np.where(values > 0, values, np.nan) if faint else values
        name = wording.chemical(run.experiment.gas_named[names[n]])
        ax.plot(times / axis.seconds, shown / size, label=_literal(name), **style.style_of(n))
    if faint:
        low = max(float(peaks[peaks > 0].min()) * 5e-4, highest * 1e-20)
        style.set_logarithmic(ax, low / size, 3 * highest / size)
    else:
        style.set_linear(ax, 0.0, highest / size)
    style.label(ax, y=f"Concentration ({unit})")


def _literal(name: str) -> str:
    """A legend entry; matplotlib leaves out labels that begin with an underscore."""
    return f" {name}" if name.startswith("_") else name


def _name(ax: Axes, run: Run, names: list[str]) -> None:
    if len(names) > labels.MOST_LABELS:
        labels.legend_beside(ax)
        return
    labels.at_ends(
        ax,
        [
            labels.EndLabel(
                wording.chemical(run.experiment.gas_named[name]),
                float(np.asarray(line.get_ydata())[-1]),
                str(line.get_color()),
            )
            for name, line in zip(names, ax.get_lines(), strict=False)
        ],
    )


def _marks(summary: RunSummary, axis: TimeAxis) -> list[tuple[float, str]]:
    """Half-lives of the watched gas; where none is reached, half of the way to equilibrium."""
    watched = summary.gas(summary.watched_gas) if summary.watched_gas else None
    if watched is None:
        return []
    marks: list[tuple[float, str]] = []
    elapsed = 0.0
    for lasted, left in zip(watched.half_lives_s, ("½", "¼", "⅛"), strict=False):
        if lasted is None:
            break
        elapsed += lasted
        text = left if marks else f"t{left} = {wording.duration(lasted)}"
        marks.append((elapsed / axis.seconds, text))
    half = watched.time_to_half_of_equilibrium_s
    if not marks and half is not None:
        marks.append((half / axis.seconds, f"half-way {wording.duration(half)}"))
    return marks
