"""A rate constant from the reactive cross-section as a function of collision energy.

k is the Maxwell-Boltzmann average of cross-section times relative speed, in closed form for
every shape that is offered.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any, ClassVar, Literal

from meanfree.errors import Problem
from meanfree.rates import energy_integrals
from meanfree.rates.encounter import masses_known, reduced_mass, speed_factor, symmetry
from meanfree.rates.law import Formula, Functions, Law, StepContext
from meanfree.sourced import Sourced

Shape = Literal["line of centres", "constant above threshold", "points"]
Beyond = Literal["constant", "zero", "linear", "falling as 1/E"]


@dataclass(frozen=True)
class EnergyPoint:
    """The cross-section [m^2] at a relative kinetic energy [J/mol]."""

    energy: Sourced
    cross_section: Sourced


@dataclass(frozen=True)
class LineOfCentres(Formula):
    """sigma_0 (1 - E0/E) above E0: the average is sigma_0 v_rel exp(-E0/RT)."""

    word: ClassVar[str] = "cross-section"

    @property
    def slots(self) -> tuple[str, ...]:
        """``s, mu, sigma_0, E0``"""
        return ("s", "mu", "sigma_0", "E0")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """s sigma_0 sqrt(8 k_B T/pi mu) N_A exp(-E0/RT)"""
        s, mu, sigma, E0 = numbers
        return s * sigma * speed_factor(fn, T, mu) * fn.exp(-E0 / (fn.R * T))


@dataclass(frozen=True)
class ConstantAboveThreshold(Formula):
    """sigma_0 above E0: the average is sigma_0 v_rel (1 + E0/RT) exp(-E0/RT)."""

    word: ClassVar[str] = "cross-section"

    @property
    def slots(self) -> tuple[str, ...]:
        """``s, mu, sigma_0, E0``"""
        return ("s", "mu", "sigma_0", "E0")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """s sigma_0 sqrt(8 k_B T/pi mu) N_A (1 + E0/RT) exp(-E0/RT)"""
        s, mu, sigma, E0 = numbers
        return s * sigma * speed_factor(fn, T, mu) * energy_integrals.step_up(fn, E0 / (fn.R * T))


@dataclass(frozen=True)
class BrokenLine(Formula):
    """Straight lines through ``n_points`` points, nothing below the first, ``beyond`` the last."""

    n_points: int
    beyond: Beyond
    word: ClassVar[str] = "cross-section"

    @property
    def slots(self) -> tuple[str, ...]:
        """``s, mu, E_1, …, E_n, sigma_1, …, sigma_n``"""
        each = range(1, self.n_points + 1)
        return ("s", "mu", *(f"E_{i}" for i in each), *(f"sigma_{i}" for i in each))

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """s v_rel N_A times the integral of sigma(u) u exp(-u), piece by piece, u = E/RT."""
        s, mu = numbers[:2]
        n = self.n_points
        u = [energy / (fn.R * T) for energy in numbers[2 : 2 + n]]
        sigma = numbers[2 + n :]
        total: Any = self._tail(fn, u, sigma)
        for (a, b), (low, high) in zip(pairwise(u), pairwise(sigma), strict=True):
            total = total + energy_integrals.piece(fn, a, b, low, high)
        return s * speed_factor(fn, T, mu) * total

    def _tail(self, fn: Functions, u: Sequence[Any], sigma: Sequence[Any]) -> Any:
        last = u[-1]
        if self.beyond == "zero":
            return 0.0
        if self.beyond == "falling as 1/E":
            return sigma[-1] * energy_integrals.falling(fn, last)
        level = sigma[-1] * energy_integrals.step_up(fn, last)
        if self.beyond == "constant":
            return level
        slope = (sigma[-1] - sigma[-2]) / (u[-1] - u[-2])
        return level + slope * energy_integrals.ramp_up(fn, last)


@dataclass(frozen=True)
class CrossSection(Law):
    """``law = "cross-section"``: the average of sigma(E) times the relative speed.

    k = s N_A sqrt(8/(pi mu (k_B T)^3)) times the integral of sigma(E) E exp(-E/k_B T) dE; s is
    1/2 for like partners. ``shape`` "line of centres" and "constant above threshold" take
    ``cross_section`` [m^2] and ``threshold`` [J/mol]; "points" takes ``points`` in rising
    energy: straight lines between them, zero below the first, and what ``beyond`` says after
    the last ("linear" continues the last line, "falling as 1/E" is sigma_n E_n/E).

    Source: Levine, Molecular Reaction Dynamics, 2005, section 3.1.
    """

    shape: Shape
    cross_section: Sourced | None = None
    threshold: Sourced | None = None
    points: tuple[EnergyPoint, ...] = ()
    beyond: Beyond | None = None
    word: ClassVar[str] = "cross-section"
    pair_needed: ClassVar[bool] = True

    def template(self, context: StepContext) -> Formula:
        """The formula of this shape."""
        if self.shape == "line of centres":
            return LineOfCentres()
        if self.shape == "constant above threshold":
            return ConstantAboveThreshold()
        assert self.beyond is not None, "problems() asks for it"
        return BrokenLine(len(self.points), self.beyond)

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(s, mu [kg], …) and then (sigma_0 [m^2], E0 [J/mol]) or energies and cross-sections."""
        pair = (symmetry(context), reduced_mass(context))
        if self.shape != "points":
            assert self.cross_section is not None
            threshold = 0.0 if self.threshold is None else self.threshold.value
            return (*pair, self.cross_section.value, threshold)
        energies = (point.energy.value for point in self.points)
        return (*pair, *energies, *(point.cross_section.value for point in self.points))

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """No encounter, no masses, numbers missing or impossible for the shape."""
        yield from super().problems(context)
        yield from masses_known(context)
        if self.shape != "points":
            if self.cross_section is None:
                expected = 'cross_section = "0.4 nm^2", say'
                yield Problem("cross_section", "nothing", expected)
            if self.threshold is not None and self.threshold.value < 0:
                yield Problem("threshold", "an energy below 0", "a threshold of at least 0 J/mol")
            return
        yield from self._problems_of_points()

    def _problems_of_points(self) -> Iterator[Problem]:
        if len(self.points) < 2:
            found = f"{len(self.points)} points"
            yield Problem("points", found, "two or more points [energy, cross-section]")
            return
        for i, (low, high) in enumerate(pairwise(self.points), start=1):
            if not high.energy.value > low.energy.value:
                found = f"{high.energy.value:g} J/mol after {low.energy.value:g} J/mol"
                yield Problem(f"points.{i}", found, "energies in rising order, each once")
        for i, point in enumerate(self.points):
            if point.energy.value < 0 or point.cross_section.value < 0:
                yield Problem(f"points.{i}", "a number below 0", "energies and areas of at least 0")
        if self.beyond is None:
            words = '"constant", "zero", "linear" or "falling as 1/E"'
            yield Problem("beyond", "nothing", f"what sigma does after the last point: {words}")
        last, before = self.points[-1].cross_section.value, self.points[-2].cross_section.value
        if self.beyond == "linear" and last < before:
            expected = "another word: a line that falls goes below zero"
            yield Problem("beyond", '"linear" after a last piece that falls', expected)

    def cautions(self, context: StepContext) -> Iterator[str]:
        """That much of k comes from energies beyond the last point."""
        if self.shape != "points" or self.beyond in (None, "zero") or context.temperatures is None:
            return
        hot = context.temperatures[1]
        whole = self.rate_constant(context, hot)
        inside = replace(self, beyond="zero").rate_constant(context, hot)
        share = 1.0 - inside / whole if whole > 0 else 0.0
        if share > 0.05:
            yield (
                f"at {hot:g} K {share:.0%} of k comes from energies beyond the last point of the "
                f"cross-section, where it is taken as {self.beyond}."
            )
