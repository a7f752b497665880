"""The figure `schedule`: the signal with its samples, and when every design draws them."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from matplotlib.figure import Figure

from meanfree import units
from meanfree.planning.schedule import Kinds, Schedule
from meanfree.report import wording
from meanfree.report.figures import labels, style
from meanfree.report.sampling import TimeAxis, unit_for


def figure(found: Schedule, chosen: Kinds) -> Figure:
    """Signal above; a row of marks for every design below."""
    names: Mapping[Kinds, str] = {
        kind: f"{kind}-optimal" if len(kind) == 1 else kind for kind in found.plans
    }
    times, plan = found.candidates.times, found.plans[chosen]
    end = float(times[-1])
    axis = TimeAxis(False, 0.0, end, *unit_for(end))
    words = [names[kind] for kind in found.plans]
    drawn, (above, below) = style.panels([2.6, 1.35], beside=labels.room_for(words), above=0.12)
    unit, dimension = _unit(found)
    scale = units.from_si(1.0, unit, dimension)
    above.plot(times / axis.seconds, found.signal * scale, color=style.PALETTE[0])
    above.errorbar(
        plan.times / axis.seconds,
        plan.signal * scale,
        yerr=2 * found.sd * scale,
        fmt="o",
        color=style.PALETTE[1],
        markersize=4.5,
        elinewidth=1.2,
        capsize=2.5,
        zorder=3,
        clip_on=False,
    )
    values = np.concatenate([found.signal, plan.signal]) * scale
    low, high = float(values.min()), float(values.max())
    if low < 0.5 * high:
        style.set_linear(above, 0.0, high + 2 * found.sd * scale)
    else:
        above.margins(y=0.08)
        style.set_linear(above, None, high)
    name = "Total pressure"
    if found.gas:
        gas = wording.chemical(found.experiment.gas_named[found.gas])
        name = f"{found.signal_kind.capitalize()}\nof {gas}"
    style.label(above, y=f"{name} ({wording.pretty_unit(unit)})")
    for row, kind in enumerate(found.plans):
        colour = style.PALETTE[1] if kind == chosen else style.GUIDE
        x = found.plans[kind].times / axis.seconds
        below.plot(x, np.full(len(x), -row), "|", color=colour, markersize=11, markeredgewidth=1.8)
    below.set_ylim(-len(found.plans) + 0.4, 0.6)
    below.set_yticks([])
    below.spines["left"].set_visible(False)
    labels.at_ends(
        below,
        [
            labels.EndLabel(
                names[kind], float(-row), style.PALETTE[1] if kind == chosen else style.INK
            )
            for row, kind in enumerate(found.plans)
        ],
    )
    for ax in (above, below):
        style.set_time(ax, axis)
    above.set_xlabel("")
    return drawn


def _unit(found: Schedule) -> tuple[str, str]:
    shown = wording.units_in_use(found.experiment)
    if found.signal_kind == "concentration":
        return shown.concentration, "concentration"
    return shown.pressure, "pressure"
