"""Limits of the substances: what condenses, burns or poisons. Not known is never safe."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.constants import R
from meanfree.gases.condensation import condenses, saturation
from meanfree.gases.gas import Gas
from meanfree.gases.hazards import OXIDISERS, Hazards, hazards_of
from meanfree.integrate.run import Run
from meanfree.planning.limits.limit import Fact, Limit, Verdict, judged, unknown
from meanfree.sourced import Sourced

ROOM = 293.15
"""Temperature of the air into which a vessel would empty itself [K]."""
ROOM_PRESSURE = 101325.0

LABORATORY = 50.0
"""Air of a small laboratory [m^3]; common practice, no source."""

_MOST_NAMED = 6


def substance_limits(run: Run) -> Iterator[Limit]:
    """Condensation, fire, poison."""
    yield from condensation(run)
    real = [gas for gas in run.experiment.gases if not gas.is_label]
    known = {gas.name: hazards_of(gas) for gas in real}
    yield from fire(run, real, known)
    yield from poison(run, real, known)
    silent = [gas.name for gas in real if not known[gas.name].anything_known]
    if silent:
        names = ", ".join(silent[:_MOST_NAMED]) + (" and more" if len(silent) > _MOST_NAMED else "")
        why = f"Nothing is known here of the dangers of {names}; that is not the same as safe."
        yield unknown("dangers", "Dangers of the other gases", why)


def _states(run: Run, gas: Gas) -> list[tuple[str, float, float]]:
    """(where, temperature [K], partial pressure [Pa]) where a gas might condense."""
    experiment = run.experiment
    initial = experiment.temperature.initial
    share = experiment.mole_fractions.get(gas.name, 0.0)
    filling = experiment.fill.pressure(experiment.vessel, initial)
    times = run.trajectory.times
    T, p = run.temperature(times), run.partial_pressures(times)[run.index(gas.name)]
    states = [("at filling", experiment.fill.temperature(initial), share * filling)]
    places = dict.fromkeys((int(T.argmin()), int(p.argmax()), len(T) - 1))
    states += [("in the run", float(T[i]), float(p[i])) for i in places]
    dead = experiment.vessel.dead_space
    if dead is not None:
        states.append(("in the dead space", dead.temperature.value, float(p.max())))
    return [state for state in states if state[2] > 0]


def condensation(run: Run) -> Iterator[Limit]:
    """Partial over vapour pressure: the worst of every gas that comes near, else of all."""
    name = "Partial over vapour pressure"
    found: list[tuple[float, Limit]] = []
    lacking = []
    for gas in run.experiment.gases:
        worst: tuple[float, str, float, float, Sourced] | None = None
        answered = False
        for where, T, p in _states(run, gas):
            if condenses(gas, T, p) is None:
                continue
            answered = True
            saturated = saturation(gas, T, p)
            if saturated is not None and (worst is None or p / saturated.value > worst[0]):
                worst = (p / saturated.value, where, T, p, saturated)
        if worst is not None:
            found.append((worst[0], _condensing(gas, *worst)))
        elif not answered and not gas.is_label and _states(run, gas):
            lacking.append(gas.name)
    near = [limit for value, limit in found if value > 0.1]
    if near:
        yield from near
    elif found:
        yield max(found, key=lambda pair: pair[0])[1]
    if lacking:
        why = f"Vapour pressures of {', '.join(lacking[:_MOST_NAMED])} are not known there."
        yield unknown("condensation", name, why)


def _condensing(
    gas: Gas, value: float, where: str, T: float, p: float, saturated: Sourced
) -> Limit:
    verdict = Verdict.BEYOND if value > 1 else Verdict.CAUTION if value > 0.5 else Verdict.WITHIN
    meaning = {
        Verdict.BEYOND: f"{gas.name} would condense {where}: fill less of it, or warm that place.",
        Verdict.CAUTION: f"{gas.name} comes close to condensing {where}.",
        Verdict.WITHIN: f"{gas.name} stays a gas; it comes closest to condensing {where}.",
    }[verdict]
    facts = (
        Fact("partial pressure", p, "pressure"),
        Fact("vapour pressure", saturated.value, "pressure"),
        Fact("at", T, "temperature"),
    )
    key, name = f"condensation.{gas.name}", f"{gas.name} over its vapour pressure"
    return Limit(key, name, value, 1.0, verdict, meaning, saturated.source, facts=facts)


def fire(run: Run, real: list[Gas], known: dict[str, Hazards]) -> Iterator[Limit]:
    """Flammable gases: share against the lower limit, temperature against autoignition."""
    times = run.trajectory.times
    partial, hottest = run.partial_pressures(times), float(run.temperature(times).max())
    shares = partial / partial.sum(axis=0)
    burns = [
        gas.name
        for gas in real
        if gas.formula is not None
        and gas.formula.hill in OXIDISERS
        and float(shares[run.index(gas.name)].max()) > 1e-3
    ]
    for gas in real:
        hazards = known[gas.name]
        share = float(shares[run.index(gas.name)].max())
        if hazards.lower_flammable is not None and share > 0:
            yield _flammable(gas, hazards, share, burns)
        if hazards.autoignition is not None and share > 0:
            yield _ignition(gas, hazards.autoignition, hottest, burns)


def _flammable(gas: Gas, hazards: Hazards, share: float, burns: list[str]) -> Limit:
    lower, upper = hazards.lower_flammable, hazards.upper_flammable
    assert lower is not None, "the caller has looked"
    facts = [Fact("lower limit in air", lower.value, "fraction")]
    if upper is not None:
        facts.append(Fact("upper limit in air", upper.value, "fraction"))
    verdict = Verdict.CAUTION
    if burns and share > lower.value:
        verdict = Verdict.BEYOND
        meaning = (
            f"{gas.name} stands together with {', '.join(burns)} above its lower limit in air: the "
            "mixture may ignite, and no ignition is predicted here."
        )
    elif share > lower.value:
        meaning = (
            f"What leaks out can burn in air until it is diluted below the limit of {gas.name}."
        )
    else:
        verdict = Verdict.WITHIN
        meaning = f"Too little {gas.name} to burn even before it is diluted with air."
    name = f"Share of {gas.name}, flammable in air"
    key = f"flammability.{gas.name}"
    value = lower.value
    return Limit(
        key, name, share, value, verdict, meaning, lower.source, "fraction", facts=tuple(facts)
    )


def _ignition(gas: Gas, ignition: Sourced, hottest: float, burns: list[str]) -> Limit:
    verdict = Verdict.WITHIN
    meaning = f"The run stays below the temperature at which {gas.name} ignites by itself in air."
    if hottest > ignition.value:
        verdict = Verdict.BEYOND if burns else Verdict.CAUTION
        meaning = f"{gas.name} ignites by itself in air at this temperature: let no air in or out."
    name, key = f"Autoignition of {gas.name} in air", f"autoignition.{gas.name}"
    value = ignition.value
    source = ignition.source
    return Limit(key, name, hottest, value, verdict, meaning, source, "temperature")


def poison(run: Run, real: list[Gas], known: dict[str, Hazards]) -> Iterator[Limit]:
    """Gases with an exposure limit: how much air dilutes all there ever is of one to it."""
    amounts = run.amounts(run.trajectory.times)
    for gas in real:
        hazards = known[gas.name]
        limits = [
            (value, words)
            for value, words in (
                (hazards.ceiling, "at any time"),
                (hazards.short_term, "over 15 min"),
                (hazards.time_weighted, "over 8 h"),
            )
            if value is not None
        ]
        most = float(amounts[run.index(gas.name)].max())
        if not limits or most <= 0:
            continue
        limit, words = limits[-1]
        allowed = _concentration(limit, gas)
        if allowed is None:
            continue
        facts = [Fact("most there is of it", most, "amount")]
        for value, other in limits:
            c = _concentration(value, gas)
            if c is not None:
                fraction = c * R * ROOM / ROOM_PRESSURE
                facts.append(Fact(f"limit {other} (ppm)", 1e6 * fraction))
        yield Limit(
            f"exposure.{gas.name}",
            f"Air that dilutes {gas.name} to its limit",
            most / allowed,
            LABORATORY,
            judged(most / allowed, LABORATORY, near=LABORATORY),
            f"If the vessel broke, so much air would dilute its {gas.name} to the limit {words}; "
            "the guideline is the air of a small laboratory.",
            limit.source,
            "volume",
            facts=tuple(facts),
        )


def _concentration(limit: Sourced, gas: Gas) -> float | None:
    """An exposure limit as a concentration in air of the room [mol/m^3]."""
    if limit.unit == "ppm":
        return limit.value * ROOM_PRESSURE / (R * ROOM)
    if gas.molar_mass is None:
        return None
    return limit.value / gas.molar_mass.value
