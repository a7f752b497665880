"""The short answer of a run: what was asked, in a few lines that need no unit to be looked up."""

from __future__ import annotations

from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.rows import Answer
from meanfree.report.run_models import GasAnswer, RunSummary

HALF_LIVES_SHOWN = 3

NOTICEABLE = 1e-5
"""Conversion that goes back by less than this is not told: more than the integrator's error."""


def answers(run: Run, summary: RunSummary) -> tuple[Answer, ...]:
    """The answers of a run: times, half-lives, how far, pressure or volume, temperature."""
    found: list[Answer] = []
    watched = summary.gas(summary.watched_gas) if summary.watched_gas else None
    if watched is not None:
        found += _times(run, watched)
        found.append(_half_lives(run, watched))
        found.append(_how_far(run, summary, watched))
    else:
        found.append(Answer("How far it goes", "No filled gas is consumed by a step."))
    found += _vessel(run, summary)
    return tuple(found)


def _times(run: Run, gas: GasAnswer) -> list[Answer]:
    name = wording.chemical(run.experiment.gas_named[gas.gas])
    found = []
    times = {round(100 * entry.conversion): entry.time_s for entry in gas.reaction_times}
    quarter = times[50] is None and times[25] is not None
    for level in (10, *((25,) if quarter else ()), 50, 90):
        time = times[level]
        note = ""
        if time is None:
            note = _why_not(gas, level / 100)
        found.append(Answer(f"{level} % of {name} converted", _after(time), note))
    half, most = gas.time_to_half_of_equilibrium_s, gas.time_to_90_percent_of_equilibrium_s
    if gas.time_to_90_percent_s is None and half is not None:
        reached = f"half of the way to equilibrium after {wording.duration(half)}"
        if most is not None:
            reached += f", 90 % of it after {wording.duration(most)}"
        found.append(Answer("On the way", reached))
    return found


def _after(time: float | None) -> str:
    return "not reached" if time is None else f"after {wording.duration(time)}"


def _why_not(gas: GasAnswer, level: float) -> str:
    limit = gas.equilibrium_conversion
    if limit is not None and limit < level:
        return f"equilibrium stops it at {wording.percent(limit)}"
    return _furthest(gas) or f"the run ends at {wording.percent(gas.conversion_at_end)}"


def _furthest(gas: GasAnswer) -> str:
    """The highest conversion where it goes back from there; else nothing."""
    if gas.highest_conversion <= gas.conversion_at_end + NOTICEABLE:
        return ""
    return f"at most {wording.percent(gas.highest_conversion)} on the way"


def _half_lives(run: Run, gas: GasAnswer) -> Answer:
    name = wording.chemical(run.experiment.gas_named[gas.gas])
    done = [time for time in gas.half_lives_s if time is not None]
    if not done:
        return Answer(f"Half-life of {name}", "not reached", _why_not(gas, 0.5))
    shown = " · ".join(wording.duration(time) for time in done[:HALF_LIVES_SHOWN])
    if len(done) == 1:
        return Answer(f"Half-life of {name}", shown)
    return Answer(f"Half-lives of {name}", shown, "one after the other")


def _how_far(run: Run, summary: RunSummary, gas: GasAnswer) -> Answer:
    end = wording.duration(summary.length_s)
    reached = f"{wording.percent(gas.conversion_at_end)} converted after {end}"
    if gas.equilibrium_conversion is not None:
        note = f"equilibrium at {wording.percent(gas.equilibrium_conversion)}"
    else:
        note = f"no equilibrium to state ({wording.clean(summary.equilibrium.why_none or '')})"
    if furthest := _furthest(gas):
        note = f"{furthest}; {note}"
    ended = wording.reaction(summary.message, run.experiment)
    return Answer("How far it goes", reached, f"{note}; {ended}")


def _vessel(run: Run, summary: RunSummary) -> list[Answer]:
    vessel, shown = summary.vessel, wording.units_in_use(run.experiment)
    found: list[Answer] = []
    filling = wording.pressure(vessel.filling_pressure_Pa, shown)
    if run.experiment.vessel.is_rigid:
        text = _from_to(
            vessel.initial_pressure_Pa, vessel.final_pressure_Pa, shown.pressure, "pressure"
        )
        at = wording.temperature(run.experiment.fill.temperature(vessel.initial_temperature_K))
        note = f"filled to {filling} at {at}" if run.experiment.fill.at is not None else ""
        if vessel.highest_pressure_Pa > 1.001 * max(
            vessel.final_pressure_Pa, vessel.initial_pressure_Pa
        ):
            most = wording.pressure(vessel.highest_pressure_Pa, shown)
            note = f"at most {most}" + (f"; {note}" if note else "")
        found.append(Answer("Pressure", text, note))
        found += _gauge(summary, shown)
    else:
        text = _from_to(vessel.initial_volume_m3, vessel.final_volume_m3, shown.volume, "volume")
        held = wording.pressure(run.experiment.held_pressure, shown)
        found.append(Answer("Volume", text, f"the piston holds {held}"))
    spread = vessel.highest_temperature_K - vessel.lowest_temperature_K
    if spread > 0.01:
        start = wording.temperature(vessel.initial_temperature_K)
        end = wording.temperature(vessel.final_temperature_K)
        note = ""
        if vessel.highest_temperature_K > vessel.final_temperature_K + 0.1:
            note = f"at most {wording.temperature(vessel.highest_temperature_K)}"
        found.append(Answer("Temperature", f"{start} → {end}", note))
    return found


def _gauge(summary: RunSummary, shown: wording.UnitsInUse) -> list[Answer]:
    """dp/dt at the start beside what a gauge of the stated resolution sees of it."""
    vessel = summary.vessel
    slope, resolution = vessel.initial_pressure_slope_Pa_per_s, vessel.gauge_resolution_Pa
    if resolution is None or slope is None:
        return []
    text = "does not move"
    if slope != 0:
        text = f"{'rises' if slope > 0 else 'falls'} by {wording.slope(abs(slope), shown)}"
    gauge = wording.quantity(resolution, shown.pressure, "pressure")
    first = vessel.gauge_first_shows_it_s
    note = f"a gauge good to {gauge} never shows a change"
    if first is not None:
        note = f"a gauge good to {gauge} first shows a change after {wording.duration(first)}"
    return [Answer("Pressure at the start", text, note)]


def _from_to(before: float, after: float, unit: str, dimension: str) -> str:
    start = wording.quantity(before, unit, dimension, 4)
    if abs(after - before) < 5e-6 * abs(before):
        return f"{start}, unchanged"
    end = wording.quantity(after, unit, dimension, 4)
    return f"{start} → {end} ({wording.change(before, after)})"
