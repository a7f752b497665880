"""What a reader of collision numbers must know before trusting them: cautions and conventions."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

from meanfree.collisions import PairCollisions
from meanfree.gases.condensation import condenses
from meanfree.report import wording
from meanfree.report.pair.question import PairQuestion

DENSE: Final[float] = 0.01
"""Share of the room filled by molecules above which the dilute-gas formulas are said to be low."""

CONVENTIONS: Final[tuple[str, ...]] = (
    "Molecules are hard, smooth bodies of the stated diameters that attract nothing; the gas is "
    "ideal, dilute and at one temperature.",
    "The threshold counts only the part of the relative kinetic energy along the line of centres; "
    "the steric factor is 1.",
)
ON_SURFACE: Final[str] = (
    "On the surface the molecules move freely, as discs of a gas of two dimensions: no hopping "
    "between sites, no exchange with the gas above."
)


def cautions_of(question: PairQuestion, pair: PairCollisions) -> Iterator[str]:
    """The cautions of a pair, the gravest first."""
    for gas in dict.fromkeys(question.gases if not pair.same_gas else question.gases[:1]):
        if gas.charge:
            yield (
                f"{wording.chemical(gas)} is an ion: its charge draws partners in from further "
                "than hard spheres touch, so Z is no ceiling here."
            )
        yield from (f"{wording.chemical(gas)}: {text}" for text in gas.cautions)
    yield from _too_much(question, pair)
    if question.barrier.below_half_rt:
        yield (
            "Ea lies below RT/2, which no threshold along the line of centres can give; "
            "E0 is taken as 0, so k = Z."
        )


def _too_much(question: PairQuestion, pair: PairCollisions) -> Iterator[str]:
    """Where the gas is too dense for these formulas, or would be no gas at all."""
    crowd = pair.crowd
    if crowd is None:
        return
    if question.pressure is not None:
        for place, gas in enumerate(question.gases[: 1 if pair.same_gas else 2]):
            partial = crowd.mole_fractions[place] * question.pressure.value
            if condenses(gas, pair.temperature, partial):
                yield (
                    f"{wording.chemical(gas)} would condense: at "
                    f"{wording.temperature(pair.temperature)} its vapour pressure is below "
                    f"{wording.quantity(partial, 'kPa', 'pressure')}."
                )
    if crowd.filled_fraction > DENSE:
        # Contact value of the pair distribution to first order in the filled share:
        # 1 + 5/2 phi for spheres, 1 + 1.56 phi for discs.
        slope = 1.56 if pair.in_plane else 2.5
        room = "surface" if pair.in_plane else "volume"
        yield (
            f"The molecules fill {wording.percent(crowd.filled_fraction)} of the {room}: no "
            "longer a dilute gas. Encounters are more frequent than stated, by at least "
            f"{wording.percent(slope * crowd.filled_fraction, 2)}, and free paths shorter."
        )


def half_in_words(question: PairQuestion) -> str:
    """Whether the half of like partners is in Z, k and the density, and what that means."""
    first = wording.chemical(question.gases[0])
    second = wording.chemical(question.gases[1])
    constant = "k" if question.has_threshold else "Z"
    if question.same_gas:
        return (
            f"Like partners: Z{', k' if question.has_threshold else ''} and the collision density "
            f"carry the ½, so that each encounter counts once; −d[{first}]/dt = "
            f"2 {constant} [{first}]²."
        )
    return (
        f"Unlike partners: no ½; −d[{first}]/dt = −d[{second}]/dt = {constant} [{first}][{second}]."
    )
