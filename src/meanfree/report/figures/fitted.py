"""The figure `fit`: readings with bars, the fitted curve with its band, and what is left over."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from meanfree import units
from meanfree.equations.system import Floats
from meanfree.measured.fits import Fit
from meanfree.measured.misfit import curve
from meanfree.measured.runs import MeasuredRun
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.sampling import unit_for

POINTS: Final[int] = 120
MOST_RUNS: Final[int] = 8


def groups(fit: Fit) -> list[tuple[str, list[int]]]:
    """Runs that share a pair of axes: (what was read, places of the runs)."""
    found: dict[str, list[int]] = {}
    for place, run in enumerate(fit.request.runs):
        readings = run.readings
        if not readings.signal.is_rate_constant:
            found.setdefault(f"{readings.signal.words}|{readings.unit}", []).append(place)
    return [
        (key.partition("|")[0], places[i : i + MOST_RUNS])
        for key, places in found.items()
        for i in range(0, len(places), MOST_RUNS)
    ]


def figure(fit: Fit, places: Sequence[int]) -> Figure:
    """Readings and curves of some runs, residuals in standard deviations below."""
    runs = [fit.request.runs[place] for place in places]
    names = [wording.clean(run.name) for run in runs] if len(runs) > 1 else []
    drawn, (above, below) = style.panels(
        [3.2, 1.3], beside=labels.room_for(names) if names else 0.25, above=0.12
    )
    longest = max(float(run.readings.times[-1]) for run in runs)
    unit, seconds = unit_for(longest)
    ends = []
    for n, (run, place) in enumerate(zip(runs, places, strict=True)):
        color = style.PALETTE[n % len(style.PALETTE)]
        end = _run(above, fit, run, place, n, seconds)
        _residuals(below, fit, run, place, color, seconds)
        ends.append(labels.EndLabel(wording.clean(run.name), end, color))
    _axes(above, below, runs, longest / seconds, unit)
    if names:
        labels.at_ends(above, ends)
    return drawn


def _run(ax: Axes, fit: Fit, run: MeasuredRun, place: int, n: int, seconds: float) -> float:
    """Points, curve and band of one run; returns where its curve ends."""
    readings = run.readings
    color = style.PALETTE[n % len(style.PALETTE)]
    t = np.linspace(0.0, float(readings.times[-1]), POINTS)
    middle, half = band(fit, run, place, t)
    shown = readings.shown(middle)
    ax.plot(t / seconds, shown, **style.style_of(n) | {"linewidth": 1.4})
    if np.all(np.isfinite(half)):
        low, high = readings.shown(middle - half), readings.shown(middle + half)
        ax.fill_between(t / seconds, low, high, color=color, alpha=0.18, linewidth=0)
    values = readings.shown(readings.values)
    bars = readings.shown(readings.values + fit.misfit.deviation(place)) - values
    ax.errorbar(
        readings.times / seconds,
        values,
        yerr=bars,
        fmt=_MARKS[n % len(_MARKS)],
        color=color,
        markersize=4,
        markerfacecolor="white",
        elinewidth=0.8,
        capsize=1.5,
        linestyle="none",
    )
    return float(shown[-1])


_MARKS: Final[str] = "osD^vP<>"


def band(fit: Fit, run: MeasuredRun, place: int, t: Floats) -> tuple[Floats, Floats]:
    """The fitted curve [SI] and the half-width of its 95 % band, both [shape of t]."""
    parameters, inner = fit.parameters, fit.inner

    def at(u: Floats) -> Floats:
        return curve(run, place, parameters, fit.misfit.natural(u), t)

    middle = at(inner)
    gradient = np.zeros((len(inner), len(t)))
    for i, parameter in enumerate(parameters):
        if place not in parameter.runs or not np.isfinite(fit.covariance[i, i]):
            continue
        h = 1e-4 if parameter.logarithmic else 1e-4 * max(abs(float(inner[i])), 1e-3)
        up, down = inner.copy(), inner.copy()
        up[i], down[i] = inner[i] + h, inner[i] - h
        gradient[i] = (at(up) - at(down)) / (2 * h)
    used = np.any(gradient != 0, axis=1)
    cov = fit.covariance[np.ix_(used, used)]
    variance = np.einsum("it,ij,jt->t", gradient[used], cov, gradient[used])
    return middle, np.asarray(fit.quantile * np.sqrt(np.maximum(variance, 0.0)))


def _residuals(
    ax: Axes, fit: Fit, run: MeasuredRun, place: int, color: str, seconds: float
) -> None:
    n = list(style.PALETTE).index(color)
    ax.plot(
        run.readings.times / seconds,
        fit.residuals_of(place),
        _MARKS[n % len(_MARKS)],
        color=color,
        markersize=4,
        markerfacecolor="white",
    )


def _axes(above: Axes, below: Axes, runs: Sequence[MeasuredRun], longest: float, unit: str) -> None:
    readings = runs[0].readings
    low, high = above.get_ylim()
    lowest = min(float(readings.shown(run.readings.values).min()) for run in runs)
    style.set_linear(above, 0.0 if 0 <= lowest < 0.4 * high else low, high / 1.06)
    name = readings.signal.words
    shown = wording.pretty_unit(readings.unit)
    head = name[:1].upper() + name[1:]
    style.label(above, y=f"{wording.clean(head)} ({shown})" if shown else wording.clean(head))
    above.set_xlim(-0.02 * longest, 1.03 * longest)
    reach = max(3.0, 1.15 * float(np.max(np.abs(below.get_ylim()))))
    below.set_ylim(-reach, reach)
    below.axhline(0.0, color=style.GUIDE, linewidth=0.8)
    style.label(below, x=f"Time ({unit})", y="Residual / σ")


def rate_unit(order: float, unit: str) -> str:
    """The unit a rate constant is drawn in: that of the readings, else litres and moles."""
    if unit:
        return unit
    return {1.0: "1/s", 2.0: "L/mol/s"}.get(order, units.si_unit(units.rate_constant(order)))
