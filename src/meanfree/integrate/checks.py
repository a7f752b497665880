"""What every run checks about itself, and what counts as a failure.

Runge-Kutta and multistep methods keep linear invariants; what drifts is the rounding of the
linear algebra, more the stiffer the system. A drift beyond the tolerance means that the equations,
not the solver, are wrong.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree.constants import R
from meanfree.equations import thermal
from meanfree.equations.closed_forms import recognise
from meanfree.equations.system import Floats, System
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.trajectory import Stretch, Trajectory

DRIFT = 10.0
"""An element may drift by this many rtol (and never less than 1e-9) of the most there ever was."""

NEGATIVE = 100.0
"""A negative amount may be this many tolerances deep: the error of one step adds up over many."""


@dataclass(frozen=True)
class Invariants:
    """How well a run kept what it must keep; ratios without unit, None where it does not apply.

    ``elements`` names each element (or "charge") with its largest relative drift; ``energy`` and
    ``volume`` are relative; ``most_negative`` is over the total initial concentration.
    ``closed_form`` names the integrated rate law that the run obeys exactly, where there is one;
    ``closed_form_difference`` is the largest difference from it, over the most of that gas.
    ``failures`` says in words what went beyond its bound.
    """

    elements: dict[str, float]
    energy: float | None
    volume: float | None
    most_negative: float
    closed_form: str = ""
    closed_form_difference: float | None = None
    failures: tuple[str, ...] = ()


def check(
    experiment: Experiment, system: System, trajectory: Trajectory, rtol: float
) -> Invariants:
    """Check a trajectory at every accepted step."""
    states = [np.column_stack(stretch.states) for stretch in trajectory.stretches]
    failures: list[str] = []
    if not all(np.all(np.isfinite(part)) for part in states):
        failures.append("a value is not finite")
    elements = _elements(experiment, system, trajectory.stretches, states)
    for name, drift in elements.items():
        if not drift <= max(1e-9, DRIFT * rtol):
            failures.append(f"{name} drifted by {drift:.1e} of what there was")
    most = np.max([part[: system.n_gases].max(axis=1) for part in states], axis=0)
    least = np.min([part[: system.n_gases].min(axis=1) for part in states], axis=0)
    allowed = NEGATIVE * (rtol * most + 1e-16 * system.total_concentration)
    failures.extend(
        f"{system.gases[i]} went negative, to {least[i]:.1e} mol/m^3"
        for i in np.flatnonzero(least < -allowed)
    )
    energy = _energy(system, trajectory.stretches, states)
    if energy is not None and not energy <= 1e3 * rtol:
        failures.append(f"energy drifted by {energy:.1e}")
    volume = _volume(system, states)
    if volume is not None and not volume <= 1e3 * rtol:
        failures.append(f"the volume left the equation of state by {volume:.1e}")
    form, difference = _closed_form(system, trajectory)
    if difference is not None and not difference <= 1e3 * rtol:
        failures.append(f"the integrated rate law ({form}) was left by {difference:.1e}")
    negative = float(max(0.0, -least.min(initial=0.0))) / system.total_concentration
    return Invariants(elements, energy, volume, negative, form, difference, tuple(failures))


def _closed_form(system: System, trajectory: Trajectory) -> tuple[str, float | None]:
    """Name of the integrated rate law and how far the run left it; "" and None without one."""
    form = recognise(system)
    if form is None:
        return "", None
    t = trajectory.times
    ours = trajectory(t)[system.gases.index(form.gas)]
    return form.name, float(np.max(np.abs(ours - form.amount(t))) / np.max(np.abs(ours)))


def _elements(
    experiment: Experiment, system: System, stretches: tuple[Stretch, ...], states: list[Floats]
) -> dict[str, float]:
    """Relative drift of each element, counting what open steps brought and samples took."""
    names, table = composition(experiment)
    if not names:
        return {}
    brought = np.zeros((len(names), len(system.open_steps)))
    for column, j in enumerate(system.open_steps):
        for gas, number in system.net.row(int(j)):
            brought[:, column] += number * table[:, gas]
    n, opened = system.n_gases, len(system.open_steps)
    scale = np.abs(table) @ system.initial_x
    drift = np.zeros(len(names))
    taken, before = np.zeros(len(names)), system.initial_x
    for stretch, part in zip(stretches, states, strict=True):
        taken = taken + table @ (before * (1 - stretch.segment.retained))
        ledger = brought @ part[n : n + opened]
        there = table @ part[:n]
        scale = np.maximum(scale, (np.abs(table) @ np.abs(part[:n])).max(axis=1))
        change = there - ledger + taken[:, None] - (table @ system.initial_x)[:, None]
        drift = np.maximum(drift, np.abs(change).max(axis=1))
        before = part[:n, -1]
    ratio = np.divide(drift, scale, out=np.zeros_like(drift), where=scale > 0)
    return {name: float(value) for name, value in zip(names, ratio, strict=True)}


def composition(experiment: Experiment) -> tuple[list[str], Floats]:
    """Element names (and "charge") and the table of how much of each a gas holds.

    Labels have no elements; where a step mixes labels with real gases nothing is conserved by
    name, so elements of such mechanisms are left out.
    """
    labels = {gas.name for gas in experiment.gases if gas.is_label}
    used = {gas for step in experiment.steps for gas in step.net}
    if used & labels:
        return [], np.zeros((0, len(experiment.gases)))
    names = sorted({e for g in experiment.gases if g.formula for e, _ in g.formula.elements})
    table = np.zeros((len(names) + 1, len(experiment.gases)))
    for i, gas in enumerate(experiment.gases):
        if gas.formula is not None:
            for element, number in gas.formula.elements:
                table[names.index(element), i] = number
            table[-1, i] = gas.formula.charge
    charged = bool(np.any(table[-1]))
    return [*names, *(["charge"] if charged else [])], table if charged else table[:-1]


def _energy(system: System, stretches: tuple[Stretch, ...], states: list[Floats]) -> float | None:
    """Drift of internal energy (rigid) or enthalpy (piston), over the heat that was turned over.

    None unless the energies of the gases alone decide: stated heats, light and open steps bring
    energy that no property of the gases accounts for.
    """
    if not system.temperature_varies or system.thermal is None:
        return None
    if len(system.open_steps) or np.any(system.photon) or not np.all(np.isnan(system.heat_given)):
        return None
    T_row = system.temperature_index
    values: list[float] = []
    heats: list[float] = []
    with_samples = 0.0  # energy that drawn samples took along
    for stretch, part in zip(stretches, states, strict=True):
        first = len(values)
        for y in part.T:
            T = float(y[T_row])
            of_gases = thermal.properties(system.thermal, T)
            each = of_gases.h
            if not system.volume_varies:
                each = each - R * T
            taken = y[system.volume_index - 1] if system.exchanges_heat else 0.0
            values.append(float(y[: system.n_gases] @ each) + system.wall * T - taken)
            heats.append(float(y[: system.n_gases] @ of_gases.cp) * T)
        if first and stretch.segment.retained < 1:
            with_samples = values[first] - values[first - 1]
        values[first:] = [value - with_samples for value in values[first:]]
    return float(np.max(np.abs(np.array(values) - values[0])) / max(heats))


def _volume(system: System, states: list[Floats]) -> float | None:
    """How far v left (R T/p) sum(x) - dead T, relative; None in a rigid vessel."""
    if not system.volume_varies or system.mode == "program":
        return None
    worst = 0.0
    for part in states:
        T: Floats | float = system.initial_temperature
        if system.temperature_varies:
            T = part[system.temperature_index]
        v = part[system.volume_index]
        expected = R * T / system.held_pressure * part[: system.n_gases].sum(axis=0)
        worst = max(worst, float(np.max(np.abs((v + system.dead * T) / expected - 1))))
    return worst
