"""A step that light drives: first order, constant while the lamp is on."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, ClassVar

from meanfree.constants import N_A, R
from meanfree.errors import Problem
from meanfree.rates.law import Functions, Law, StepContext
from meanfree.sourced import Sourced

THIN = 0.05
"""Largest share by which the mean light may be below that at the window; common practice."""


@dataclass(frozen=True)
class Photolysis(Law):
    """``law = "photolysis"``: r = J c while the lamp is on.

    ``J`` [1/s] counts events. ``on`` and ``off`` [s] are the times at which the lamp is switched,
    in turn; it is on from time zero where no ``on`` comes before the first ``off``. With
    ``absorption`` (cross-section of a molecule [m^2], to base e) and ``path`` [m] the absorbance is
    worked out, for J is the same everywhere only in an optically thin gas.

    Source: Atkins and de Paula, Physical Chemistry, 8th ed. (2006), section 23.7; Beer-Lambert.
    """

    J: Sourced
    on: tuple[Sourced, ...] = ()
    off: tuple[Sourced, ...] = ()
    absorption: Sourced | None = None
    path: Sourced | None = None
    word: ClassVar[str] = "photolysis"
    slots: ClassVar[tuple[str, ...]] = ("J",)
    counted: ClassVar[str] = "J"

    @staticmethod
    def coefficient(fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """J itself."""
        return numbers[0]

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(J,)"""
        return (self.J.value,)

    def switch_times(self) -> tuple[float, ...]:
        """Times at which the lamp is switched [s], zero left out."""
        return tuple(sorted({t.value for t in (*self.on, *self.off)} - {0.0}))

    def is_on(self, t: float) -> bool:
        """Whether the lamp is on just after a time [s]."""
        switched = [(when.value, True) for when in self.on]
        switched += [(when.value, False) for when in self.off]
        past = [change for change in switched if change[0] <= t]
        if past:
            return max(past)[1]
        first_on = min((when.value for when in self.on), default=math.inf)
        first_off = min((when.value for when in self.off), default=math.inf)
        return not self.on or first_off < first_on

    def absorbance(self, context: StepContext) -> float | None:
        """sigma n L at the start, to base e; None where it is not known."""
        if self.absorption is None or self.path is None or not context.pressure:
            return None
        share = (context.bath or {}).get(context.reactants[0].name, 0.0)
        T = 298.15 if context.temperatures is None else context.temperatures[0]
        density = share * context.pressure / (R * T) * N_A
        return self.absorption.value * density * self.path.value

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """Not one molecule to first order; switches that do not alternate; half of the data."""
        if len(context.reactants) != 1 or context.order != 1:
            found = " + ".join(gas.name for gas in context.reactants) or "nothing"
            expected = "one molecule that takes in the light, to first order"
            yield Problem("reaction", f"{found} on the left", expected)
        switches = [(t.value, "on") for t in self.on] + [(t.value, "off") for t in self.off]
        ordered = sorted(switches)
        for (t0, first), (t1, second) in pairwise(ordered):
            if first == second or t0 == t1:
                found = f"{first} at {t0:g} s and {second} at {t1:g} s"
                yield Problem(second, found, "a lamp that is switched on and off in turn")
        if (self.absorption is None) != (self.path is None):
            missing, given = ("path", "absorption") if self.path is None else ("absorption", "path")
            yield Problem(missing, f"{given} without {missing}", "both, or neither")

    def cautions(self, context: StepContext) -> Iterator[str]:
        """That the gas is not optically thin."""
        depth = self.absorbance(context)
        if not depth:
            return
        mean = -math.expm1(-depth) / depth
        if 1 - mean > THIN:
            name = context.reactants[0].name
            yield (
                f"the gas is not optically thin: its {name} takes {-math.expm1(-depth):.0%} of the "
                f"light at the start, and the mean over the path is {mean:.0%} of that at the "
                "window, so J is not the same everywhere and will rise as the gas goes."
            )
