"""What may condense, burn or poison, as sentences; what is not known is said to be not known."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from meanfree.experiment.experiment import Experiment
from meanfree.gases.condensation import condenses, saturation
from meanfree.gases.gas import Gas
from meanfree.gases.hazards import OXIDISERS, Hazards, hazards_of
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.sourced import Sourced

OF_LIMIT = 0.25
"""Share of the lower limit in air from which a mixture is warned of; common practice, no source."""


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
    yield from _mixture(run.experiment, known)
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
            saturated = saturation(gas, temperature, partial)
            assert saturated is not None, "a gas that condenses has more than some pressure"
            shown = wording.units_in_use(experiment)
            there = wording.pressure(partial, shown)
            limit = wording.pressure(saturated.value, shown)
            yield (
                f"{wording.chemical(gas)} would condense {where}: {there} of it at "
                f"{wording.temperature(temperature)}, against a vapour pressure of {limit} "
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


def _mixture(experiment: Experiment, known: Mapping[str, Hazards]) -> Iterator[str]:
    """A filled mixture that may burn; far below its limit in air it is left alone."""
    total = sum(experiment.moles.values())
    share = {gas: n / total for gas, n in experiment.moles.items() if n > 0}
    fuels = []
    for gas in experiment.gases:
        danger = known.get(gas.name)
        limit = None if danger is None else danger.lower_flammable
        if limit is not None and share.get(gas.name, 0.0) > OF_LIMIT * limit.value:
            fuels.append(wording.chemical(gas))
    oxidisers = [
        wording.chemical(gas)
        for gas in experiment.gases
        if gas.name in share and gas.formula is not None and gas.formula.hill in OXIDISERS
    ]
    if fuels and oxidisers:
        yield (
            f"{', '.join(fuels)} filled together with {', '.join(oxidisers)}: the mixture may "
            "ignite; no ignition or explosion is predicted here."
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
        yield f"{wording.chemical(gas)} has exposure limits: {', '.join(limits)} ({source})."


def _concentration(value: Sourced) -> str:
    """Mole fractions in ppm, mass concentrations in mg/m^3: both are 1e6 times the SI value."""
    return f"{wording.given(1e6 * value.value, 4)} {wording.pretty_unit(value.unit)}"
