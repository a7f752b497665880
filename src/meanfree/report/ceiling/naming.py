"""How an encounter is written: its reaction, its unit, and what may be wrong with it."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree import units
from meanfree.experiment.mechanism import side
from meanfree.planning.ceiling import Crossing, Level, StepCeiling
from meanfree.rates.attraction import Attraction
from meanfree.rates.ceiling import OVER
from meanfree.report import wording

ORDER = 2.0
_CALLED = {"hard spheres": "Z", "long range": "the long-range ceiling"}
DEFAULT_UNIT = "L/mol/s"


def reaction(one: StepCeiling) -> str:
    """The reaction one way, as text of the case."""
    step = one.step
    bath = " + M" if step.bath is not None else ""
    left, right = (step.products, step.reactants) if one.back else (step.reactants, step.products)
    return f"{side(left)}{bath} → {side(right)}{bath}"


def unit_of(one: StepCeiling) -> str:
    """The unit of the step's rate constant where that is of second order, else a common one."""
    law = one.step.law
    counted = getattr(law, law.counted, None) if law.counted and not one.back else None
    unit: str = getattr(counted, "unit", "")
    if not unit:
        return DEFAULT_UNIT
    dimension: str = getattr(counted, "dimension", "")
    return unit if dimension == units.rate_constant(ORDER) else DEFAULT_UNIT


def kelvins(span: tuple[float, float]) -> str:
    """``384 to 600 K``"""
    low, high = (wording.temperature(T) for T in span)
    return f"{low.removesuffix(' K')} to {high}"


def crossing(found: Crossing) -> str:
    """``above Z from 1230 K on`` or ``above Z up to 210 K``"""
    name = _CALLED[found.ceiling]
    at = f"{found.temperature:.0f} K" if found.temperature >= 100 else f"{found.temperature:.3g} K"
    return f"above {name} {'from' if found.rising else 'below'} {at}{' on' if found.rising else ''}"


def crossings(one: StepCeiling) -> str:
    """Where k is above its ceilings, in words, and over what that was looked for."""
    searched = kelvins((round(one.searched[0]), round(one.searched[1])))
    crossed = {found.ceiling for found in one.crossings}
    level = one.levels[0]
    Z = None if level.limit is None else level.limit.Z
    said = [crossing(found) for found in one.crossings]
    for ceiling, value in (("hard spheres", Z), ("long range", level.long_range)):
        if ceiling not in crossed and value is not None and level.k > value * (1 + OVER):
            said.append(f"above {_CALLED[ceiling]} everywhere from {searched}")
    return "; ".join(said) or f"nowhere from {searched}"


def wrongs(one: StepCeiling) -> Iterator[str]:
    """What must be looked at, in whole sentences: a rate constant that nothing known explains."""
    bad = [level for level in one.levels if level.standing.may_be_wrong]
    if not bad:
        return
    level = max(bad, key=lambda found: _demand(found) / found.ceiling)
    name, at = wording.clean(one.name), wording.temperature(level.temperature)
    times = wording.number(_demand(level) / level.ceiling)
    text = f"{name} at {at} asks for {times} times its ceiling"
    if level.k <= level.ceiling:
        text += " where only encounters with the energy count"
    if one.back:
        yield (
            f"{text}. The reverse is the forward rate constant over Kc: its barrier is wrong, or "
            "the thermochemistry is."
        )
    elif level.long_range is None and level.limit is not None:
        lacking = wording.clean(one.attraction)  # a phrase where no attraction is known
        yield (
            f"{text}. A long-range attraction might explain it ({lacking}); else the barrier, "
            "the factor or what k counts is wrong."
        )
    else:
        jump = level.limit is not None and not any(gas.charge for gas in one.partners)
        yield f"{text}. Its {wording.clean(_word(one))} does not explain it" + (
            "; an electron that jumps between the two (a harpoon) might." if jump else "."
        )


def _word(one: StepCeiling) -> str:
    pull = one.attraction
    return pull.word if isinstance(pull, Attraction) else "attraction"


def _demand(level: Level) -> float:
    """k; what it would be without its barrier where only that is above [m^3/mol/s]."""
    judged = level.judgement
    if judged is None or judged.steric is None or level.k > level.ceiling:
        return level.k
    return max(level.k, judged.steric * judged.Z)
