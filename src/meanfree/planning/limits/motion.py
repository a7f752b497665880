"""Limits that follow from how molecules move: mixing, warming, free paths, walls."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from meanfree.experiment.temperature import Adiabatic, Program
from meanfree.integrate.run import Run
from meanfree.planning.limits.limit import PRACTICE, Fact, Limit, Verdict, judged, unknown
from meanfree.planning.mixture import Mixture, Molecule
from meanfree.planning.own_time import OwnTime
from meanfree.planning.request import PlanRequest

SHARE_OF_TIME = 0.1
"""A process counts as instant where it takes less than this share of the reaction's own time."""

CONTINUUM, FREE = 0.01, 0.1
"""Knudsen numbers below which a gas flows as a continuum, and above which it no longer does."""

SHARE_OF_LOSS = 0.01
"""A loss on the wall does not matter where it is below this share of the loss by reaction."""

SPHERE_ASSUMED = "taking the vessel for a sphere of its volume, for no form is stated"


def motion_limits(
    run: Run, request: PlanRequest, mixture: Mixture, own: OwnTime | None
) -> Iterator[Limit]:
    """Mixing, warming, mean free path, walls."""
    yield mixing(run, mixture, own)
    yield warming(run, request, own)
    yield conduction(mixture, own)
    yield knudsen(request, mixture)
    yield walls(run, mixture, own)


def _why_unknown(mixture: Mixture) -> str:
    if not mixture.filled:
        return "Nothing is filled."
    return f"A mass or a diameter of {', '.join(mixture.lacking)} is not known."


def _form(mixture: Mixture) -> str:
    return f", {SPHERE_ASSUMED}" if mixture.form == "assumed" else ""


def mixing(run: Run, mixture: Mixture, own: OwnTime | None) -> Limit:
    """Lambda^2/D of the filled gas that diffuses slowest, against the reaction's own time."""
    name = "Mixing by diffusion"
    source = f"Λ²/D of the lowest mode of diffusion; guideline: {PRACTICE}"
    if not mixture.known:
        return unknown("mixing", name, _why_unknown(mixture), source)
    filled = {gas.name for gas in mixture.filled}
    slow = min((m for m in mixture.molecules if m.gas in filled), key=lambda m: m.diffusion)
    time = mixture.diffusion_length_squared / slow.diffusion
    facts: tuple[Fact, ...] = (
        Fact("mixing time", time, "time"),
        Fact(f"D of {slow.gas}", slow.diffusion, "diffusivity"),
        Fact("Λ", math.sqrt(mixture.diffusion_length_squared), "length"),
    )
    if own is None:
        return Limit(
            "mixing", name, None, None, Verdict.UNKNOWN, NOTHING_MOVES, source, facts=facts
        )
    share = time / own.seconds
    facts += (Fact(own.words, own.seconds, "time"),)
    verdict = judged(share, SHARE_OF_TIME)
    if len(filled) == 1:
        verdict = Verdict.WITHIN
        meaning = "One gas is filled: there is nothing to mix at the start"
    elif verdict is Verdict.WITHIN:
        meaning = "The gas mixes much faster than it reacts, even without convection"
    else:
        meaning = (
            "By diffusion alone the gas is not mixed before it reacts: fill the gases premixed, or "
            "stir; convection in a heated vessel mixes faster"
        )
    meaning += f"{_form(mixture)}."
    return Limit("mixing", name, share, SHARE_OF_TIME, verdict, meaning, source, facts=facts)


NOTHING_MOVES = "No filled gas is consumed, so there is no time to hold it against."


def warming(run: Run, request: PlanRequest, own: OwnTime | None) -> Limit:
    """The stated or programmed warm-up against the reaction's own time."""
    name, source = "Warm-up", f"guideline: {PRACTICE}"
    mode = run.experiment.temperature
    time = None if request.warm_up is None else request.warm_up.value
    if isinstance(mode, Program):
        meaning = "The temperature program is part of the prediction, so the warm-up is in it."
        last = max(mode.breaks, default=0.0)
        share = last / own.seconds if own is not None else None
        program = (Fact("last point of the program", last, "time"),)
        return Limit("warm_up", name, share, None, Verdict.WITHIN, meaning, source, facts=program)
    if time is None:
        why = 'Not stated: give warm_up = "4 min", say, under [plan].'
        return unknown("warm_up", name, why, source)
    if own is None:
        return unknown("warm_up", name, NOTHING_MOVES, source)
    share = time / own.seconds
    verdict = judged(share, SHARE_OF_TIME)
    meaning = "The vessel is at temperature before much has reacted."
    if verdict is not Verdict.WITHIN:
        meaning = (
            "A good part reacts while the vessel warms: run colder, or put the warm-up into the "
            "case as a temperature program."
        )
    facts = (Fact("warm-up", time, "time"), Fact(own.words, own.seconds, "time"))
    return Limit("warm_up", name, share, SHARE_OF_TIME, verdict, meaning, source, facts=facts)


def conduction(mixture: Mixture, own: OwnTime | None) -> Limit:
    """Lambda^2/alpha: how long the gas itself takes to come to the temperature of the wall."""
    name = "Warming of the gas by conduction"
    source = f"Λ²/α, conductivity from kinetic theory; guideline: {PRACTICE}"
    if not mixture.known:
        return unknown("conduction", name, _why_unknown(mixture), source)
    if mixture.thermal_diffusivity is None or mixture.conductivity is None:
        why = "A heat capacity of a filled gas is not known."
        return unknown("conduction", name, why, source)
    if own is None:
        return unknown("conduction", name, NOTHING_MOVES, source)
    time = mixture.diffusion_length_squared / mixture.thermal_diffusivity
    share = time / own.seconds
    if isinstance(mixture.experiment.temperature, Adiabatic):
        return _no_conduction(mixture, own, time, source)
    verdict = judged(share, SHARE_OF_TIME)
    meaning = "The gas follows the wall's temperature much faster than it reacts"
    if verdict is not Verdict.WITHIN:
        meaning = "The gas is not at the wall's temperature while it reacts"
    facts = (
        Fact("time to warm", time, "time"),
        Fact("thermal diffusivity", mixture.thermal_diffusivity, "diffusivity"),
        Fact(own.words, own.seconds, "time"),
    )
    meaning += f"{_form(mixture)}."
    return Limit("conduction", name, share, SHARE_OF_TIME, verdict, meaning, source, facts=facts)


def _no_conduction(mixture: Mixture, own: OwnTime, time: float, source: str) -> Limit:
    """The same for an adiabatic case, where heat is not to reach the wall while the gas reacts."""
    value, guideline = time / own.seconds, 1 / SHARE_OF_TIME
    verdict = judged(value, guideline, above=True)
    meaning = "Heat does not reach the wall while the gas reacts, as the case takes it"
    if verdict is not Verdict.WITHIN:
        meaning = "Heat reaches the wall while the gas reacts: the vessel is not adiabatic"
    meaning += f"{_form(mixture)}."
    facts = (Fact("time to cool", time, "time"), Fact(own.words, own.seconds, "time"))
    name = "Cooling of the gas by conduction"
    return Limit(
        "conduction", name, value, guideline, verdict, meaning, source, above=True, facts=facts
    )


def knudsen(request: PlanRequest, mixture: Mixture) -> Limit:
    """The longest mean free path over the stated narrowest width, else over the vessel's."""
    name = "Knudsen number"
    source = (
        "mean free path in the mixture: Chapman and Cowling (1970), chapter 5; guideline: "
        f"{PRACTICE}"
    )
    if not mixture.known:
        return unknown("knudsen", name, _why_unknown(mixture), source)
    longest = max(mixture.molecules, key=lambda m: m.free_path)
    stated = request.narrowest
    width = 2 * mixture.radius if stated is None else stated.value
    value = longest.free_path / width
    over = "the width of the vessel" if stated is None else "the narrowest passage"
    verdict = judged(value, FREE, near=FREE / CONTINUUM)
    meaning = {
        Verdict.WITHIN: f"Molecules meet each other long before they cross {over}",
        Verdict.CAUTION: f"Molecules meet each other only some ten times while they cross {over}: "
        "flow and diffusion begin to slip",
        Verdict.BEYOND: f"Molecules cross {over} and hardly meet each other: diffusion and wall "
        "loss are no longer those of a continuum",
    }[verdict]
    if stated is None:
        meaning += _form(mixture)
    facts = (
        Fact(f"mean free path of {longest.gas}", longest.free_path, "length"),
        Fact(over, width, "length"),
    )
    return Limit("knudsen", name, value, FREE, verdict, f"{meaning}.", source, facts=facts)


@dataclass(frozen=True)
class WallShare:
    """How one gas sees the wall.

    ``per_collision`` wall collisions per gas collision [1]; ``harmless`` the uptake probability
    below which the wall takes less than `SHARE_OF_LOSS` of what reaction takes; None where even
    an uptake of 1 does not matter, or where there is no time to compare with.
    """

    molecule: Molecule
    per_collision: float
    harmless: float | None
    diffusion_alone: float


def wall_shares(mixture: Mixture, own: OwnTime | None) -> list[WallShare]:
    """Every gas against the wall.

    1/k_w = Lambda^2/D + 2 V (2 - gamma)/(gamma v S). Source: P. J. Chantry, J. Appl. Phys. 62,
    1141 (1987).
    """
    found = []
    for molecule in mixture.molecules:
        ratio = molecule.wall_collisions / molecule.gas_collisions
        delay = mixture.diffusion_length_squared / molecule.diffusion
        harmless = None
        if own is not None:
            allowed = SHARE_OF_LOSS * math.log(2) / own.seconds
            # (2 - g)/g = (1/k_w - delay) 2 w with w = v S/(4 V), the frequency on the wall.
            rest = 2 * molecule.wall_collisions * (1 / allowed - delay)
            harmless = 2 / (1 + rest) if rest > 1 else None
        found.append(WallShare(molecule, ratio, harmless, delay))
    return found


def walls(run: Run, mixture: Mixture, own: OwnTime | None) -> Limit:
    """Wall collisions per gas collision, and the uptake below which walls do not matter."""
    name = "Wall collisions per gas collision"
    source = (
        "v̄S/4V against the collision frequency: Chapman and Cowling (1970), chapter 5; uptake: "
        f"Chantry, J. Appl. Phys. 62, 1141 (1987); guideline: {PRACTICE}"
    )
    if not mixture.known:
        return unknown("walls", name, _why_unknown(mixture), source)
    shares = wall_shares(mixture, own)
    most = max(shares, key=lambda share: share.per_collision)
    facts = [
        Fact(f"wall collisions of {most.molecule.gas}", most.molecule.wall_collisions, "frequency"),
        Fact(f"gas collisions of {most.molecule.gas}", most.molecule.gas_collisions, "frequency"),
    ]
    watched = run.experiment.watched
    mine = next((share for share in shares if share.molecule.gas == watched), None)
    meaning = "Molecules meet each other far more often than the wall"
    if mine is not None and mine.harmless is not None:
        facts.append(Fact(f"uptake of {watched} below which walls do not matter", mine.harmless))
        meaning += (
            f"; still the wall matters if it takes up {watched} with a higher probability than "
            "the one stated here"
        )
    elif mine is not None and own is not None:
        meaning += f"; the wall cannot matter for {watched}, whatever it takes up"
    verdict = judged(most.per_collision, FREE, near=FREE / CONTINUUM)
    if verdict is not Verdict.WITHIN:
        meaning = meaning.replace("far more often than", "not much more often than")
    meaning += f"{_form(mixture)}."
    value = most.per_collision
    return Limit("walls", name, value, FREE, verdict, meaning, source, facts=tuple(facts))
