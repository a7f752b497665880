"""A rate constant given at several temperatures, with ln k linear in 1/T between them.

Two neighbouring points are joined by the Arrhenius line through them, so a table of an
Arrhenius law gives that law back.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, ClassVar

from meanfree.errors import Problem
from meanfree.rates.law import Formula, Functions, Law, StepContext
from meanfree.sourced import Sourced

MARGIN = 5.0
"""Kelvin outside the table that are allowed and said; common practice, no source."""


@dataclass(frozen=True)
class TablePoint:
    """The rate constant ``k`` [(m^3/mol)^(order-1)/s, per event] at ``T`` [K]."""

    T: Sourced
    k: Sourced


@dataclass(frozen=True)
class BrokenArrhenius(Formula):
    """The formula of a table with ``n_points`` points: temperatures, then rate constants."""

    n_points: int
    word: ClassVar[str] = "table"

    @property
    def slots(self) -> tuple[str, ...]:
        """``T_1, …, T_n, k_1, …, k_n``"""
        each = range(1, self.n_points + 1)
        return (*(f"T_{i}" for i in each), *(f"k_{i}" for i in each))

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """exp of the broken line through (1/T_i, ln k_i); the outer pieces go on."""
        n = self.n_points
        # 1/T grows where T falls, and the broken line wants growing arguments.
        at = [1 / hot for hot in reversed(numbers[:n])]
        logs = [fn.log(k) for k in reversed(numbers[n:])]
        return fn.exp(fn.piecewise_linear(1 / T, at, logs))


@dataclass(frozen=True)
class Table(Law):
    """``law = "table"``: k at two or more temperatures, in rising order.

    ``extrapolate`` allows temperatures outside the table (beyond `MARGIN` kelvin), where the
    outer Arrhenius lines go on.
    """

    points: tuple[TablePoint, ...]
    extrapolate: bool = False
    word: ClassVar[str] = "table"
    counted: ClassVar[str] = "points.0.k"

    def template(self, context: StepContext) -> Formula:
        """The formula for this number of points."""
        return BrokenArrhenius(len(self.points))

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(T_1, …, T_n, k_1, …, k_n)"""
        return (*(p.T.value for p in self.points), *(p.k.value for p in self.points))

    def strains(self, low: float, high: float) -> Iterator[tuple[str, bool]]:
        """Temperatures outside the table: an error beyond `MARGIN`, unless allowed."""
        first, last = self.points[0].T.value, self.points[-1].T.value
        if low < first or high > last:
            span = f"{low:g} K" if low == high else f"{low:g} to {high:g} K"
            far = low < first - MARGIN or high > last + MARGIN
            yield (
                f"the table of k covers {first:g} to {last:g} K and the run {span}: "
                "outside it the outer Arrhenius lines are continued.",
                far and not self.extrapolate,
            )

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """Too few points, points out of order, a k that has no logarithm, a run outside."""
        if len(self.points) < 2:
            yield Problem("points", f"{len(self.points)} points", "two or more points [T, k]")
            return
        kelvins = [point.T.value for point in self.points]
        for i, (low, high) in enumerate(pairwise(kelvins), start=1):
            if not high > low:
                found = f"{high:g} K after {low:g} K"
                yield Problem(f"points.{i}", found, "temperatures in rising order, each once")
        for i, point in enumerate(self.points):
            if not point.k.value > 0:
                expected = "a rate constant above 0: ln k is what is interpolated"
                yield Problem(f"points.{i}", f"k = {point.k.value:g}", expected)
        if context.temperatures is None or self.extrapolate:
            return
        low, high = context.temperatures
        if low < kelvins[0] - MARGIN or high > kelvins[-1] + MARGIN:
            span = f"{low:g} K" if low == high else f"{low:g} to {high:g} K"
            expected = f"a run within {kelvins[0]:g} to {kelvins[-1]:g} K, or extrapolate = true"
            yield Problem("points", f"a run at {span}", expected)

    def cautions(self, context: StepContext) -> Iterator[str]:
        """That the run leaves the table, where that is allowed."""
        if context.temperatures is not None:
            yield from (text for text, _ in self.strains(*context.temperatures))
