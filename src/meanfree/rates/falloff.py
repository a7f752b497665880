"""Steps between their low- and high-pressure limits: Lindemann, and the broadened forms.

k = k0 [M] / (1 + Pr) F with Pr = k0 [M]/kinf. F = 1 is Lindemann's; the broadened forms have
log10 F = log10 Fc / (1 + (log10 Pr/N)^2).

Sources: F. A. Lindemann, Trans. Faraday Soc. 17, 598 (1922); J. Troe, J. Phys. Chem. 83, 114
(1979); the two widths N as in the IUPAC and JPL evaluations of atmospheric kinetics.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar, Literal

import numpy as np

from meanfree.errors import Problem
from meanfree.rates.law import NUMBERS, Formula, Functions, Law, StepContext
from meanfree.rates.limits import Limit, PowerLaw
from meanfree.sourced import Sourced

Broadening = Literal["none", "unit width", "width from Fc"]

LEAST_CENTRE = 0.1
"""Below this Fc the broadened form is not what its authors fitted (Troe 1979: 0.1 to 1)."""

_FLOOR = 1e-200
"""Keeps log10 Pr finite where there is no M at all; it acts at Pr below 1e-100."""


@dataclass(frozen=True)
class CentreTerm:
    """One term of Fc(T): weight exp(-T/scale), which falls, or weight exp(-scale/T), which rises.

    ``weight`` [1], ``scale`` [K].
    """

    weight: Sourced
    scale: Sourced
    rises: bool = False


@dataclass(frozen=True)
class Centre:
    """Fc, the broadening factor at Pr = 1: a constant and any number of terms in T."""

    constant: Sourced = Sourced(0.0, default=True)
    terms: tuple[CentreTerm, ...] = ()

    @property
    def ordered(self) -> tuple[CentreTerm, ...]:
        """Falling terms first, as the formula takes them."""
        return tuple(sorted(self.terms, key=lambda term: term.rises))

    @property
    def n_rising(self) -> int:
        """Number of terms that rise with T."""
        return sum(term.rises for term in self.terms)

    def __call__(self, T: Any) -> Any:
        """Fc at T [K]."""
        numbers = [value for t in self.ordered for value in (t.weight.value, t.scale.value)]
        n_falling = len(self.terms) - self.n_rising
        return _centre(NUMBERS, T, self.constant.value, numbers, n_falling)


def _centre(fn: Functions, T: Any, constant: Any, terms: Sequence[Any], n_falling: int) -> Any:
    total = constant
    for i, (weight, scale) in enumerate(zip(terms[::2], terms[1::2], strict=True)):
        total = total + weight * fn.exp(-T / scale if i < n_falling else -scale / T)
    return total


@dataclass(frozen=True)
class FalloffFormula(Formula):
    """The formula for a kind of broadening and numbers of terms in Fc."""

    broadening: Broadening
    n_falling: int = 0
    n_rising: int = 0
    word: ClassVar[str] = "falloff"

    @property
    def slots(self) -> tuple[str, ...]:
        """A, n, T_ref and E of k0 and of kinf; Fc's constant; weight and scale of each term."""
        limits = ("A_0", "n_0", "T_0", "E_0", "A_inf", "n_inf", "T_inf", "E_inf")
        if self.broadening == "none":
            return limits
        each = range(1, self.n_falling + self.n_rising + 1)
        return (*limits, "F_0", *(f"{part}_{i}" for i in each for part in ("a", "b")))

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """k0 M/(1 + Pr) F"""
        A0, n0, T0, E0, Ai, ni, Ti, Ei = numbers[:8]
        # One exponential of the difference: both limits may be too small to hold when cold.
        ratio = A0 / Ai * (T / T0) ** n0 / (T / Ti) ** ni * fn.exp(-(E0 - Ei) / (fn.R * T))
        reduced = ratio * M
        high = Ai * (T / Ti) ** ni * fn.exp(-Ei / (fn.R * T))
        lindemann = high * reduced / (1 + reduced)
        if self.broadening == "none":
            return lindemann
        centre = fn.log10(_centre(fn, T, numbers[8], numbers[9:], self.n_falling))
        width = 1.0 if self.broadening == "unit width" else 0.75 - 1.27 * centre
        # The square also stands where the integrator tries an M a rounding below zero.
        place = 0.5 * fn.log10(reduced * reduced + _FLOOR) / width
        return lindemann * fn.exp(_LN_10 * centre / (1 + place * place))


_LN_10 = float(np.log(10.0))


@dataclass(frozen=True)
class Falloff(Law):
    """``law = "falloff"``: a step written with ``+ M`` from third-body control to its limit.

    ``k0`` has one order more than ``kinf``: it multiplies [M], the concentration of all gases
    weighted with the efficiencies of ``partners``. ``broadening`` is "none" (Lindemann),
    "unit width" (N = 1) or "width from Fc" (N = 0.75 - 1.27 log10 Fc); the latter two
    take ``Fc``.
    """

    k0: Limit
    kinf: PowerLaw
    broadening: Broadening = "none"
    Fc: Centre | None = None
    word: ClassVar[str] = "falloff"
    counted: ClassVar[str] = "kinf.A"
    bath_inside: ClassVar[bool] = True

    def template(self, context: StepContext) -> Formula:
        """The formula of this broadening."""
        if self.broadening == "none" or self.Fc is None:
            return FalloffFormula("none")
        n_rising = self.Fc.n_rising
        return FalloffFormula(self.broadening, len(self.Fc.terms) - n_rising, n_rising)

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(A, n, T_ref, E) of both limits [SI], then Fc's numbers."""
        limits = (*self.k0.numbers(context), *self.kinf.numbers(context))
        if self.broadening == "none" or self.Fc is None:
            return limits
        terms = (value for t in self.Fc.ordered for value in (t.weight.value, t.scale.value))
        return (*limits, self.Fc.constant.value, *terms)

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """No M; limits that cannot be; Fc missing, not wanted, or outside 0.1 to 1 in the run."""
        if not context.has_bath:
            expected = 'a step with "+ M": falloff is a matter of collisions with the bath'
            yield Problem("reaction", "falloff without M", expected)
        yield from self.k0.problems("k0", context)
        yield from self.kinf.problems("kinf", context)
        if self.kinf.A.value <= 0:
            yield Problem("kinf.A", f"{self.kinf.A.value:g}", "a limit above 0")
        if self.broadening == "none":
            if self.Fc is not None:
                expected = 'broadening = "unit width" or "width from Fc", or no Fc'
                yield Problem("Fc", "Fc without broadening", expected)
            return
        if self.Fc is None:
            yield Problem("Fc", "nothing", f"Fc, which broadening = {self.broadening!r} needs")
            return
        yield from self._centre_in_range(self.Fc, context)

    def _centre_in_range(self, centre: Centre, context: StepContext) -> Iterator[Problem]:
        for i, term in enumerate(centre.terms):
            if term.scale.value <= 0:
                yield Problem(f"Fc.{i}", f"{term.scale.value:g} K", "a temperature above 0 K")
                return
        for bad, at in self._strained(centre, *(context.temperatures or (298.15, 298.15))):
            expected = "0.1 to 1 wherever the run goes: the broadened form holds there"
            yield Problem("Fc", f"Fc = {bad:.3g} at {at:g} K", expected)

    @staticmethod
    def _strained(centre: Centre, low: float, high: float) -> Iterator[tuple[float, float]]:
        """The first (Fc, T) of the smallest and the largest Fc that lies outside 0.1 to 1."""
        T = np.linspace(low, high, 1 if low == high else 101)
        values = np.broadcast_to(centre(T), T.shape)
        for place in (int(values.argmin()), int(values.argmax())):
            if not LEAST_CENTRE <= values[place] <= 1.0:
                yield float(values[place]), float(T[place])
                return

    def strains(self, low: float, high: float) -> Iterator[tuple[str, bool]]:
        """Fc outside 0.1 to 1 at temperatures that the run reached."""
        if self.broadening == "none" or self.Fc is None:
            return
        for bad, at in self._strained(self.Fc, low, high):
            yield f"Fc is {bad:.3g} at {at:.0f} K; the broadened form holds from 0.1 to 1.", True

    def cautions(self, context: StepContext) -> Iterator[str]:
        """What an estimated k0 rests on."""
        yield from self.k0.cautions(context)
