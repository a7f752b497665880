"""The Arrhenius law, with an optional power of temperature."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

from meanfree.rates.law import Functions, Law, StepContext
from meanfree.sourced import Sourced

NO_POWER = Sourced(0.0, default=True)
ONE_KELVIN = Sourced(1.0, "K", dimension="temperature", default=True)


@dataclass(frozen=True)
class Arrhenius(Law):
    """``law = "arrhenius"``: k = A (T/T_ref)^n exp(-Ea/RT).

    A is per event, (m^3/mol)^(order-1)/s; Ea [J/mol]; T_ref [K] is 1 where n = 0 and
    required otherwise. With n != 0 the ``Ea`` of the file is the E of the exponential;
    the activation energy at T is then E + nRT.

    Source: IUPAC Gold Book, "modified Arrhenius equation".
    """

    A: Sourced
    Ea: Sourced
    n: Sourced = NO_POWER
    T_ref: Sourced = ONE_KELVIN
    word: ClassVar[str] = "arrhenius"
    slots: ClassVar[tuple[str, ...]] = ("A", "n", "T_ref", "E")
    counted: ClassVar[str] = "A"

    @staticmethod
    def coefficient(fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """A (T/T_ref)^n exp(-E/RT)."""
        A, n, T_ref, E = numbers
        return A * (T / T_ref) ** n * fn.exp(-E / (fn.R * T))

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(A, n, T_ref, Ea)"""
        return (self.A.value, self.n.value, self.T_ref.value, self.Ea.value)
