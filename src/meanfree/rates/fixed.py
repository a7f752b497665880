"""A rate constant that is given as a number and does not change with temperature."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

from meanfree.rates.law import Functions, Law, StepContext
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Fixed(Law):
    """``law = "fixed"``: r = k times the concentrations.

    k is per event, (m^3/mol)^(order-1)/s; its ``per`` remembers the file's counting.
    """

    k: Sourced
    word: ClassVar[str] = "fixed"
    slots: ClassVar[tuple[str, ...]] = ("k",)
    counted: ClassVar[str] = "k"

    @staticmethod
    def coefficient(fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """k itself."""
        return numbers[0]

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(k,)"""
        return (self.k.value,)
