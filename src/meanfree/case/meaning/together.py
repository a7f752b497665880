"""What only the whole case shows: energies, dead space, cycles of constants, absurd rates."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np

from meanfree.case.findings import Findings
from meanfree.case.meaning.energies import energies_needed, with_energies
from meanfree.case.meaning.temperature import span
from meanfree.case.schema.tables import GasTable
from meanfree.constants import N_A, R
from meanfree.experiment.equilibrium import ln_K
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import Temperature, has_energy_balance
from meanfree.experiment.vessel import Vessel
from meanfree.gases.gas import Gas
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced
from meanfree.units.dimensions import named

ANY_VESSEL = Vessel("volume", Sourced(1e-3))
"""In the place of one that was refused, while the rest is looked at."""
CLOSES = 0.01  # given constants are quoted to three digits or so
SAME_HEAT = 2e3  # [J/mol]: enthalpies from two tables differ by that much; common practice
NEARBY = 20.0  # [K]: with CLOSES this finds enthalpies that miss by some 1 kJ/mol at 500 K


def check_dead_space(
    vessel: Vessel | None, temperature: Temperature | None, findings: Findings
) -> None:
    """No energy balance of gauge and lines is modelled."""
    if vessel is None or vessel.dead_space is None or temperature is None:
        return
    if has_energy_balance(temperature):
        findings.wrong(
            "vessel.dead_space",
            f'dead space with mode = "{temperature.mode}"',
            'mode = "isothermal" or "program", or no dead_space: gauge and lines have no energy '
            "balance here",
        )


def gases_with_energies(
    gases: Mapping[str, Gas | None],
    tables: Mapping[str, GasTable],
    reversible: Mapping[str, list[str]],
    temperature: Temperature | None,
    findings: Findings,
) -> dict[str, Gas | None]:
    """The gases, each with thermochemistry where the case needs it."""
    balance = ""
    if temperature is not None and has_energy_balance(temperature):
        balance = f'temperature.mode = "{temperature.mode}"'
    found = dict(gases)
    for name, needed_by in energies_needed(gases, reversible, balance).items():
        gas = gases.get(name)
        # A label in a reverse by thermochemistry has been refused at its step.
        if gas is not None and not (gas.is_label and not balance):
            used = None if temperature is None else span(temperature)
            found[name] = with_energies(gas, tables.get(name), used, needed_by, findings)
    return found


def check_amounts(experiment: Experiment, findings: Findings) -> None:
    """Refuse a fill out of all bounds: an absurd pressure at time zero, less than a molecule.

    Each number may be possible by itself: read at 1e-20 K, a torr is 1e22 torr in the oven.
    """
    molecules = sum(experiment.moles.values()) * N_A
    if molecules < 1:
        found = f"a fill of {molecules:.3g} molecules in all"
        findings.wrong("fill", found, "at least one; rate laws need a great many")
    most = named("pressure").highest
    if not experiment.initial_pressure <= most:
        found = f"a fill that has {experiment.initial_pressure:.3g} Pa at time zero"
        findings.wrong("fill", found, f"at most {most:g} Pa")


def check_piston(experiment: Experiment, findings: Findings) -> None:
    """A piston must have room for its gas, and says so where it is brought to another pressure."""
    vessel = experiment.vessel
    if vessel.is_rigid:
        return
    held, T = experiment.held_pressure, experiment.temperature.initial
    if experiment.initial_volume <= 0:
        findings.wrong(
            "vessel.pressure",
            f"{held:g} Pa, at which all the gas is in the dead space",
            "a pressure that leaves gas in the hot part",
        )
        return
    filled = experiment.fill.pressure(vessel, T)
    if vessel.pressure is not None and abs(filled / held - 1) > 1e-6:
        findings.note(
            f"Filled at {filled / 1e5:.4g} bar, the piston is brought to {held / 1e5:.4g} bar at "
            f"time zero: volume {experiment.initial_volume * 1e3:.4g} L."
        )


def check_laws(
    experiment: Experiment, findings: Findings, *, surroundings_known: bool = True
) -> None:
    """What a law finds impossible in its step and vessel, and what it wants to be known.

    Where the vessel or the fill was refused, walls are passed over: all depends on them there.
    """
    for step in experiment.steps:
        if not surroundings_known and isinstance(step.law, Wall):
            continue
        context, address = experiment.context(step), f"steps.{step.name}"
        problems = [problem.under(address) for problem in step.law.problems(context)]
        for problem in problems:
            findings.wrong(problem.key, problem.found, problem.expected)
        if not problems:
            for text in step.law.cautions(context):
                findings.note(f"{address}: {text}")


def check_rates(experiment: Experiment, findings: Findings) -> None:
    """Refuse rate constants that a computer cannot hold; note steps that can never run."""
    for step in experiment.steps:
        for T in sorted(set(span(experiment.temperature))):
            with np.errstate(all="ignore"):
                k = float(step.law.rate_constant(experiment.context(step), T, 1e5, 1.0))
            if not math.isfinite(k) or k < 0:
                found = f"numbers that give k = {k:g} at {T:g} K"
                findings.wrong(f"steps.{step.name}", found, "a finite rate constant")
    _note_idle(experiment, findings)


def _note_idle(experiment: Experiment, findings: Findings) -> None:
    present = {gas for gas, n in experiment.moles.items() if n > 0}
    running: set[str] = set()
    grown = True
    while grown:
        grown = False
        for step in experiment.steps:
            left, right = ({gas for gas, _ in side} for side in (step.reactants, step.products))
            back = step.reverse is not None and right <= present
            if step.name not in running and (left <= present or back):
                running.add(step.name)
                present |= left | right
                grown = True
    for step in experiment.steps:
        if step.name not in running:
            absent = [gas for gas, _ in step.reactants if gas not in present]
            findings.note(
                f"steps.{step.name} never runs: nothing fills or forms {', '.join(absent)}."
            )


def check_given_enthalpies(experiment: Experiment, findings: Findings) -> None:
    """Note where an equilibrium and the balance of heat of one step do not agree on its heat."""
    if not has_energy_balance(experiment.temperature):
        return
    for step in experiment.steps:
        given = step.reverse
        if not isinstance(given, GivenEquilibrium) or given.enthalpy is None:
            continue
        if step.heat is not None:
            used, by = -step.heat.value, "its heat"
        else:
            energies = [
                (n, experiment.gas_named[gas].thermochemistry) for gas, n in step.net.items()
            ]
            used = sum(
                n * float(of.enthalpy(given.at.value)) for n, of in energies if of is not None
            )
            by = "the energies of its gases"
        stated = given.enthalpy.value
        if abs(used - stated) > max(SAME_HEAT, 0.03 * abs(stated)):
            findings.note(
                f"steps.{step.name}: reverse.enthalpy is {stated / 1e3:.4g} kJ/mol, but by {by} "
                f"it is {used / 1e3:.4g} kJ/mol; the equilibrium follows the former, the "
                "temperature the latter."
            )


def check_cycles(
    steps: Sequence[Step],
    gases: Mapping[str, Gas],
    temperature: Temperature,
    findings: Findings,
) -> None:
    """Given constants around a cycle must multiply to 1, or the cycle turns for ever.

    Where the temperature varies their enthalpies must add up to 0 for the same reason.
    """
    reversible = [step for step in steps if step.reverse is not None]
    if not any(isinstance(step.reverse, GivenEquilibrium) for step in reversible):
        return
    T = temperature.initial
    others = {T + NEARBY} if has_energy_balance(temperature) else set(span(temperature))
    names = sorted({gas for step in reversible for gas in step.net})
    rows: list[tuple[np.ndarray, np.ndarray]] = []
    for place, step in enumerate(reversible):
        vector = np.array([step.net.get(gas, 0.0) for gas in names])
        mix = np.zeros(len(reversible))
        mix[place] = 1.0
        for pivot_row, pivot_mix in rows:
            pivot = int(np.argmax(np.abs(pivot_row)))
            factor = vector[pivot] / pivot_row[pivot]
            vector, mix = vector - factor * pivot_row, mix - factor * pivot_mix
        if np.max(np.abs(vector), initial=0.0) > 1e-9:
            rows.append((vector, mix))
        else:
            _check_cycle(reversible, mix, gases, [T, *sorted(others - {T})], findings)


def _check_cycle(
    steps: Sequence[Step],
    mix: np.ndarray,
    gases: Mapping[str, Gas],
    temperatures: Sequence[float],
    findings: Findings,
) -> None:
    """The first of ``temperatures`` [K] is that at time zero; the others show the enthalpies."""
    used = [(step, float(m)) for step, m in zip(steps, mix, strict=True) if abs(m) > 1e-9]
    given = [(step, m) for step, m in used if isinstance(step.reverse, GivenEquilibrium)]
    if not given:
        return
    allowed = CLOSES * max(1.0, *(abs(m) for _, m in used))
    T, *others = temperatures
    excess = sum(m * ln_K(step, gases, T) for step, m in used)
    last, weight = given[-1]
    assert isinstance(last.reverse, GivenEquilibrium)
    around = ", ".join(step.name for step, _ in used)
    if abs(excess) > allowed:
        factor = math.exp(max(-700.0, min(700.0, -excess / weight)))
        findings.wrong(
            f"steps.{last.name}.reverse.{last.reverse.kind}",
            f"constants around the cycle {around} that do not multiply to 1 at {T:g} K",
            f"this one {factor:.4g} times as large, or another of them changed",
        )
        return
    for other in others:
        change = sum(m * ln_K(step, gases, other) for step, m in used) - excess
        if abs(change) > allowed and last.reverse.enthalpy is not None:
            surplus = change * R / (1 / T - 1 / other)
            right = (last.reverse.enthalpy.value - surplus / weight) / 1e3
            findings.wrong(
                f"steps.{last.name}.reverse.enthalpy",
                f"enthalpies around the cycle {around} that do not add up to 0, so that its "
                f"constants do not multiply to 1 at {other:g} K",
                f"{right:.4g} kJ/mol here, or another of them changed",
            )
            return
