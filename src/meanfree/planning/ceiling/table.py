"""The ceiling table: every encounter of a mechanism, and its reverse, against its most.

Over a range of temperatures: k, the collision rate constant Z of hard spheres, the long-range
ceiling where enough is known for one, what k is against them, and where k would cross them.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

from meanfree.equations.build import REVERSE_SUFFIX
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.experiment.rate_constants import (
    encounter,
    order_of,
    own_diameter,
)
from meanfree.experiment.temperature import known_range
from meanfree.gases.gas import Gas
from meanfree.planning.ceiling.encounters import Crossing, Curve, Known, Level, Look
from meanfree.rates.attraction import Attraction, attraction_of
from meanfree.rates.ceiling import ceiling

WIDER = 1.25
"""Without a stated range: from the run's temperature over this to it times this."""

BEYOND = 3.0
"""Crossings are looked for from the lowest temperature over this to the highest times this."""


@dataclass(frozen=True)
class StepCeiling:
    """One encounter over its range.

    ``span`` [K] is what it is looked at over and ``span_basis`` why; ``searched`` [K] is where
    crossings were looked for. ``attraction`` is a phrase where no long-range ceiling is known.
    """

    step: Step
    back: bool
    partners: tuple[Gas, ...]
    span: tuple[float, float]
    span_basis: str
    searched: tuple[float, float]
    levels: tuple[Level, ...]
    curve: Curve
    crossings: tuple[Crossing, ...]
    attraction: Attraction | str
    remarks: tuple[str, ...] = ()

    @property
    def name(self) -> str:
        """The name of the step, marked where it is the reverse."""
        return self.step.name + (REVERSE_SUFFIX if self.back else "")

    @property
    def at_run(self) -> Level:
        """The level at the run's temperature; the middle one where the range does not hold it."""
        run = [level for level in self.levels if level.is_run]
        return run[0] if run else self.levels[len(self.levels) // 2]

    @property
    def worst(self) -> Level:
        """The level that asks for most of its ceiling."""
        return max(self.levels, key=lambda level: level.k / level.ceiling)


@dataclass(frozen=True)
class LeftOut:
    """A step that has no ceiling, and why."""

    name: str
    why: str


@dataclass(frozen=True)
class CeilingTable:
    """Every encounter of an experiment, and the steps that are none."""

    experiment: Experiment
    between: tuple[float, float] | None
    steps: tuple[StepCeiling, ...]
    left_out: tuple[LeftOut, ...] = field(default=())


def ceiling_table(
    experiment: Experiment, between: tuple[float, float] | None = None
) -> CeilingTable:
    """Every bimolecular step, and every reverse by detailed balance, against its ceilings.

    ``between`` [K] is the range for every step; without one it is the step's ``valid``, or else
    a quarter to both sides of the run's temperature.
    """
    found: list[StepCeiling] = []
    left_out: list[LeftOut] = []
    for step in experiment.steps:
        for back in (False, True) if step.reverse is not None else (False,):
            one = _one(experiment, step, back, between)
            if isinstance(one, StepCeiling):
                found.append(one)
            else:
                left_out.append(LeftOut(step.name + (REVERSE_SUFFIX if back else ""), one))
    return CeilingTable(experiment, between, tuple(found), tuple(left_out))


def _one(
    experiment: Experiment, step: Step, back: bool, between: tuple[float, float] | None
) -> StepCeiling | str:
    partners = encounter(experiment, step, back)
    order = order_of(step, back)
    if order != 2 or (len(partners) != 2 and step.bath is None):
        return "no encounter of two molecules"
    if len(partners) != 2:
        return "its partner M is a mixture"
    diameter = None if back else own_diameter(experiment, step)
    asked, basis = _asked(experiment, step, between)
    attraction = attraction_of(partners, None if back else step.law)
    if ceiling(partners, asked[0], diameter) is None and isinstance(attraction, str):
        return f"{_not_known(partners)}; {attraction}"
    known = Known(experiment, step, back)
    span = known.part_of(*asked)
    if span is None:
        return f"k is not known from {asked[0]:g} to {asked[1]:g} K"
    if span != asked:
        basis += ", as far as k is known"
    look = Look(experiment, step, back, partners, diameter, attraction)
    searched = known.part_of(span[0] / BEYOND, span[1] * BEYOND, around=span) or span
    return StepCeiling(
        step,
        back,
        partners,
        span,
        basis,
        searched,
        tuple(look.level(T, is_run) for T, is_run in _temperatures(experiment, span)),
        look.curve(*span),
        tuple(look.crossings(searched, span)),
        attraction,
        tuple(_remarks(experiment, step)),
    )


def _asked(
    experiment: Experiment, step: Step, between: tuple[float, float] | None
) -> tuple[tuple[float, float], str]:
    if between is not None:
        return between, "as asked"
    if step.valid is not None:
        return (step.valid[0].value, step.valid[1].value), "where the step is valid"
    low, high = known_range(experiment.temperature)
    return (low / WIDER, high * WIDER), "a quarter around the run's temperature"


def _not_known(partners: tuple[Gas, ...]) -> str:
    for word, key in (("mass", "molar_mass"), ("diameter", "diameter")):
        names = dict.fromkeys(gas.name for gas in partners if getattr(gas, key) is None)
        if names:
            return f"{word} of {' and '.join(names)} not known"
    return "a mass or a diameter is not known"


def _remarks(experiment: Experiment, step: Step) -> Iterator[str]:
    if step.law.bath_inside:
        yield "k is that in the bath as filled, at every temperature here."


def _temperatures(
    experiment: Experiment, span: tuple[float, float]
) -> Iterator[tuple[float, bool]]:
    """Both ends and, between them, the run's temperature (the highest known of a program)."""
    low, high = span
    run = known_range(experiment.temperature)[1]
    near = 1e-9 * high
    yield low, abs(run - low) <= near
    if low + near < run < high - near:
        yield run, True
    elif not low - near <= run <= high + near:
        # A round number between them.
        yield float(round(0.5 * (low + high))) if high - low > 2 else 0.5 * (low + high), False
    if high > low + near:
        yield high, abs(run - high) <= near
