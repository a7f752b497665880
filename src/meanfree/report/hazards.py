"""What may condense, burn or poison, as sentences; what is not known is said to be not known."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.experiment.experiment import Experiment
from meanfree.gases.condensation import condenses, vapour_pressure
from meanfree.gases.gas import Gas
from meanfree.gases.hazards import Hazards, hazards_of
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.sourced import Sourced

OXIDISERS = frozenset({"O2", "O3", "N2O", "NO2", "N2O4", "F2", "Cl2", "ClO2", "ClF3"})
"""Formulas (Hill order) with which a flammable gas may burn; common practice, no source."""


def condensation_in(run: Run) -> Iterator[str]:
    """Gases that would condense at filling or in the run."""
    for gas in run.experiment.gases:
        yield from _condensation(run, gas)


def dangers_in(run: Run) -> Iterator[str]:
    """Cautions about fire first, then about poison, then what is not known."""
    real = [gas for gas in run.experiment.gases if not gas.is_label]
    known = {gas.name: hazards_of(gas) for gas in real}
    burning = [gas for gas in real if known[gas.name].lower_flammable is not None]
    for gas in burning:
        yield from _fire(run, gas, known[gas.name])
    yield from _mixture(run.experiment, burning)
    for gas in real:
        yield from _poison(gas, known[gas.name])
    silent = [wording.chemical(gas) for gas in real if not known[gas.name].anything_known]
    if silent:
        yield f"Dangers of {', '.join(silent)}: none on record here, which does not say none."


def _condensation(run: Run, gas: Gas) -> Iterator[str]:
    experiment = run.experiment
    total = sum(experiment.moles.values())
    share = experiment.moles[gas.name] / total if total > 0 else 0.0
    initial = experiment.temperature.initial
    filling = experiment.fill.temperature(initial)
    filled = share * experiment.fill.pressure(experiment.vessel, initial)
    times = run.trajectory.times
    T, p = run.temperature(times), run.partial_pressures(times)[run.index(gas.name)]
    # The coldest moment and the one of most gas are where it would condense first.
    moments = {(float(T[i]), float(p[i])) for i in (int(T.argmin()), int(p.argmax()), len(T) - 1)}
    for where, temperature, partial in (
        ("at filling", filling, filled),
        *(("in the run", *moment) for moment in sorted(moments)),
    ):
        if partial > 0 and condenses(gas, temperature, partial):
            saturated = vapour_pressure(gas, temperature)
            assert saturated is not None, "a gas that condenses has a vapour pressure"
            shown = wording.units_in_use(experiment)
            there = wording.pressure(partial, shown)
            limit = wording.pressure(saturated.value, shown)
            yield (
                f"{wording.chemical(gas)} would condense {where}: {there} of it at "
                f"{wording.temperature(temperature)}, where its vapour pressure is {limit} "
                f"({saturated.source})."
            )
            return


def _fire(run: Run, gas: Gas, known: Hazards) -> Iterator[str]:
    assert known.lower_flammable is not None
    limits = f"from {wording.percent(known.lower_flammable.value)}"
    if known.upper_flammable is not None:
        limits += f" to {wording.percent(known.upper_flammable.value)}"
    text = f"{wording.chemical(gas)} is flammable: {limits} in air ({known.lower_flammable.source})"
    hottest = float(run.temperature(run.trajectory.times).max())
    if known.autoignition is not None and hottest > known.autoignition.value:
        ignition = wording.temperature(known.autoignition.value)
        text += f"; the run is above its autoignition temperature in air, {ignition}"
    yield f"{text}."


def _mixture(experiment: Experiment, burning: list[Gas]) -> Iterator[str]:
    filled = {gas for gas, n in experiment.moles.items() if n > 0}
    fuels = [gas for gas in burning if gas.name in filled]
    oxidisers = [
        gas
        for gas in experiment.gases
        if gas.name in filled and gas.formula is not None and gas.formula.hill in OXIDISERS
    ]
    if fuels and oxidisers:
        fuel, oxidiser = wording.chemical(fuels[0]), wording.chemical(oxidisers[0])
        yield (
            f"{fuel} is filled together with {oxidiser}: the mixture may ignite; "
            "no ignition or explosion is predicted here."
        )


def _poison(gas: Gas, known: Hazards) -> Iterator[str]:
    limits = [
        f"{_concentration(value)} {name}"
        for value, name in (
            (known.ceiling, "at any time"),
            (known.short_term, "over 15 min"),
            (known.time_weighted, "over 8 h"),
        )
        if value is not None
    ]
    if limits:
        source = next(
            v.source
            for v in (known.ceiling, known.short_term, known.time_weighted)
            if v is not None
        )
        yield f"{wording.chemical(gas)} is toxic: exposure limits {', '.join(limits)} ({source})."


def _concentration(value: Sourced) -> str:
    """Mole fractions in ppm, mass concentrations in mg/m^3: both are 1e6 times the SI value."""
    return f"{1e6 * value.value:.4g} {wording.pretty_unit(value.unit)}"
