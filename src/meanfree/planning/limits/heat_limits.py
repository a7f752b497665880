"""Limits that follow from heat: adiabatic rise, Frank-Kamenetskii, Semenov."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.constants import R
from meanfree.experiment.temperature import Adiabatic, Exchange
from meanfree.integrate.run import Run
from meanfree.planning.heat import (
    CYLINDER,
    SEMENOV,
    SLAB,
    SPHERE,
    Energies,
    Release,
    adiabatic_end,
    frank_kamenetskii,
    greatest_release,
    semenov,
)
from meanfree.planning.limits.limit import PRACTICE, Fact, Limit, Verdict, judged, unknown
from meanfree.planning.limits.motion import SPHERE_ASSUMED
from meanfree.planning.mixture import Mixture
from meanfree.planning.request import PlanRequest

SHARE_OF_FOLD = 0.1
"""A rise of this share of R T^2/E changes the rate by about as much."""

NOTICEABLE = 4.0
"""From a quarter of the critical delta on the middle is off by more than about 0.3 R T^2/E."""

_RISE = "Adiabatic rise"
_FK = "Frank-Kamenetskii δ"
_SEMENOV = "Semenov parameter"


def heat_limits(run: Run, request: PlanRequest, mixture: Mixture) -> Iterator[Limit]:
    """What the heat of reaction could do."""
    energies = Energies(run.experiment)
    if energies.lacking:
        why = f"Energies of {', '.join(energies.lacking)} are not known."
        yield unknown("adiabatic_rise", _RISE, why)
        yield unknown("frank_kamenetskii", _FK, why)
        yield unknown("semenov", _SEMENOV, why)
        return
    release = greatest_release(run, energies)
    yield rise(run, energies, release)
    if isinstance(run.experiment.temperature, Adiabatic):
        return  # no heat leaves by what the case says, so there is no loss to compare with
    yield slow_conduction(mixture, release)
    yield lumped(run, request, release)


def rise(run: Run, energies: Energies, release: Release) -> Limit:
    """The rise if no heat left, against the rise that changes the rate by a tenth."""
    source = (
        "balance of internal energy (rigid) or enthalpy (piston); R T²/E: Semenov (1928); "
        f"guideline: {PRACTICE}"
    )
    end = adiabatic_end(run, energies)
    if end is None:
        why = "A heat is stated instead of energies, or matter or light comes in."
        return unknown("adiabatic_rise", _RISE, why, source)
    T0 = run.experiment.temperature.initial
    value = end - T0
    facts = [Fact("temperature at the end", end, "temperature")]
    if isinstance(run.experiment.temperature, Adiabatic):
        meaning = "The case is adiabatic: the prediction has this rise in it."
        return Limit(
            "adiabatic_rise",
            _RISE,
            value,
            None,
            Verdict.WITHIN,
            meaning,
            source,
            "temperature difference",
            facts=tuple(facts),
        )
    E = abs(release.energy)
    guideline = SHARE_OF_FOLD * R * T0**2 / E if E > 0 else None
    if E > 0:
        facts.append(Fact("E of the heat release", E, "molar energy"))
    # Whether heat passes in time is for the other rows to say: this one warns, at most.
    small = guideline is None or abs(value) <= guideline
    verdict = Verdict.WITHIN if small else Verdict.CAUTION
    kind = "warm" if value > 0 else "cool"
    if verdict is Verdict.WITHIN:
        meaning = "Even without any loss of heat the gas would hardly change its temperature."
    else:
        meaning = (
            f"With no heat to or from the wall the gas would {kind} enough to change the rate: "
            "the prediction is honest only if heat passes in time, which the rows on heat say."
        )
    if isinstance(run.experiment.temperature, Exchange):
        meaning += " The exchange of heat is part of the prediction."
    return Limit(
        "adiabatic_rise",
        _RISE,
        value,
        guideline,
        verdict,
        meaning,
        source,
        "temperature difference",
        facts=tuple(facts),
    )


def _critical(mixture: Mixture) -> tuple[float, float, str]:
    """(length r [m], critical delta, form). A finite cylinder lies inside a long one and inside a
    slab, so it may be held against whichever of the two allows more."""
    if mixture.length is None:
        form = "sphere" if mixture.form == "sphere" else "sphere of its volume"
        return mixture.radius, SPHERE, form
    half = 0.5 * mixture.length
    if SLAB / half**2 > CYLINDER / mixture.radius**2:
        return half, SLAB, "slab between its ends"
    return mixture.radius, CYLINDER, "long cylinder"


def slow_conduction(mixture: Mixture, release: Release) -> Limit:
    """delta against its critical value: heat that leaves through the gas by conduction alone."""
    source = (
        "Frank-Kamenetskii, Diffusion and Heat Transfer in Chemical Kinetics (1969), chapter 6: "
        "0.878 slab, 2.000 long cylinder, 3.322 sphere"
    )
    if release.power == 0 or (release.power > 0 and release.energy <= 0):
        meaning = _cannot(release)
        return Limit("frank_kamenetskii", _FK, 0.0, None, Verdict.WITHIN, meaning, source)
    if mixture.conductivity is None:
        why = "A mass, diameter or heat capacity of a filled gas is not known."
        return unknown("frank_kamenetskii", _FK, why, source)
    r, critical, form = _critical(mixture)
    value = frank_kamenetskii(release, r, mixture.conductivity)
    verdict = judged(abs(value), critical, near=NOTICEABLE)
    if release.power < 0 and verdict is not Verdict.WITHIN:
        verdict = Verdict.CAUTION
    cold = "Conduction brings the heat in: the gas stays near the wall temperature"
    if verdict is not Verdict.WITHIN:
        cold = "The middle of the gas runs noticeably colder than the wall"
    meaning = (
        cold
        if release.power < 0
        else {
            Verdict.WITHIN: "Conduction through the gas carries the heat away: it stays near the "
            "wall temperature",
            Verdict.CAUTION: "The middle of the gas runs noticeably warmer than the wall",
            Verdict.BEYOND: "Conduction cannot carry the heat away: the gas may run away (thermal "
            "explosion), unless it is used up first or convection helps",
        }[verdict]
    )
    if mixture.form == "assumed":
        meaning += f", {SPHERE_ASSUMED}"
    facts = (
        *_facts(release),
        Fact("conductivity of the gas (W/m/K)", mixture.conductivity),
        Fact(f"radius or half-width ({form})", r, "length"),
    )
    return Limit(
        "frank_kamenetskii", _FK, value, critical, verdict, f"{meaning}.", source, facts=facts
    )


def _cannot(release: Release) -> str:
    if release.power <= 0:
        return "The reaction takes up heat or releases none: it cannot run away."
    return "Heat release does not rise with temperature: it cannot run away."


def _facts(release: Release) -> tuple[Fact, ...]:
    return (
        Fact("heat release (W/m³)", release.power),
        Fact("at", release.time, "time"),
        Fact("E of the heat release", release.energy, "molar energy"),
        Fact("wall temperature", release.temperature, "temperature"),
    )


def lumped(run: Run, request: PlanRequest, release: Release) -> Limit:
    """Semenov's parameter against 1/e: heat that leaves through a stated conductance."""
    source = "Semenov, Z. Phys. 48, 571 (1928)"
    if release.power <= 0 or release.energy <= 0:
        meaning = _cannot(release)
        return Limit("semenov", _SEMENOV, 0.0, SEMENOV, Verdict.WITHIN, meaning, source)
    mode, conductance = run.experiment.temperature, request.conductance
    if conductance is None and isinstance(mode, Exchange):
        conductance = mode.conductance
    if conductance is None:
        why = 'No conductance is stated: give conductance = "0.09 W/K", say, under [plan].'
        return unknown("semenov", _SEMENOV, why, source)
    volume = float(run.volume(release.time)[0])
    value = semenov(release, volume, conductance.value)
    verdict = judged(value, SEMENOV)
    meaning = {
        Verdict.WITHIN: "The stated conductance carries the heat away.",
        Verdict.CAUTION: "The stated conductance carries the heat away with little to spare.",
        Verdict.BEYOND: "The stated conductance cannot carry the heat away: the gas may run away.",
    }[verdict]
    facts = (*_facts(release), Fact("conductance", conductance.value, "conductance"))
    return Limit("semenov", _SEMENOV, value, SEMENOV, verdict, meaning, source, facts=facts)
