"""A gas that is let in at a constant rate, whatever is in the vessel."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

from meanfree.errors import Problem
from meanfree.rates.law import Functions, Law, StepContext
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Source(Law):
    """``law = "source"``: zero order, ``-> X``; r = ``rate`` [mol/m^3/s] of the vessel's volume."""

    rate: Sourced
    word: ClassVar[str] = "source"
    slots: ClassVar[tuple[str, ...]] = ("rate",)
    counted: ClassVar[str] = "rate"

    @staticmethod
    def coefficient(fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """The rate itself."""
        return numbers[0]

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(rate,)"""
        return (self.rate.value,)

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """Something on the left."""
        if context.reactants or context.has_bath:
            found = " + ".join([g.name for g in context.reactants] + ["M"] * context.has_bath)
            yield Problem("reaction", f"{found} on the left", 'nothing: a source is "-> X"')
