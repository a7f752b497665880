"""A step of three bodies at its low-pressure limit: its rate grows with [M] without end.

Written ``A + B + M -> AB + M``, M is the concentration of all gases, weighted with the
efficiencies of ``partners``; with a third gas named instead, only that gas counts.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import ClassVar

from meanfree.errors import Problem
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.law import StepContext
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Termolecular(Arrhenius):
    """``law = "termolecular"``: k = A (T/T_ref)^n exp(-Ea/RT) of third order, (m^3/mol)^2/s.

    Source: IUPAC Gold Book, "molecularity" and "modified Arrhenius equation".
    """

    Ea: Sourced = Sourced(0.0, "J/mol", dimension="molar energy", default=True)
    word: ClassVar[str] = "termolecular"

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """Other than three bodies."""
        bodies = context.order + (1.0 if context.has_bath else 0.0)
        if bodies != 3:
            with_M = ", M among them" if context.has_bath else ""
            expected = "three, such as H + O2 + M or 2 NO + O2"
            yield Problem("reaction", f"{bodies:g} bodies on the left{with_M}", expected)
