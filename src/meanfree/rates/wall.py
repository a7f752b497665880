"""Loss of a gas on the wall: diffusion to it, and the chance of uptake on striking it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar, Literal

from meanfree.constants import R
from meanfree.errors import Problem
from meanfree.gases.gas import Gas
from meanfree.rates.law import Formula, Functions, Interior, Law, StepContext
from meanfree.rates.wall_diffusion import Geometry, eigenvalue_over_biot
from meanfree.rates.wall_estimate import Diffusivity, estimated_diffusivity
from meanfree.sourced import Sourced

Form = Literal["exact", "quick", "uptake only"]
FIRST_ZERO = 2.404825557695773
"""First zero of the Bessel function J0."""


def mean_speed(fn: Functions, T: Any, molar_mass: Any) -> Any:
    """sqrt(8 R T/(pi M)) [m/s]"""
    return fn.sqrt(8 * fn.R * T / (fn.pi * molar_mass))


@dataclass(frozen=True)
class UptakeOnly(Formula):
    """gamma v S/(4 V): the gas is as dense at the wall as elsewhere, and flies to it freely."""

    word: ClassVar[str] = "wall"

    @property
    def slots(self) -> tuple[str, ...]:
        """``gamma, M, S_over_V``"""
        return ("gamma", "M_gas", "S_over_V")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """gamma v S/(4 V)"""
        gamma, molar_mass, surface = numbers
        return 0.25 * gamma * mean_speed(fn, T, molar_mass) * surface


_DIFFUSION = ("gamma", "M_gas", "D_0", "T_0", "p_0", "m")


@dataclass(frozen=True)
class DiffusionAndUptake(Formula):
    """Diffusion D = D_0 (T/T_0)^m p_0/p to a wall that takes gamma of what strikes it.

    The gas at the wall moves towards it, so the flux into the wall is not gamma v n/4 but
    h n with h = gamma v/(2 (2 - gamma)) (P. J. Chantry, J. Appl. Phys. 62, 1141 (1987)).
    """

    form: Literal["exact", "quick"]
    geometry: Literal["sphere", "cylinder"]
    finite: bool
    word: ClassVar[str] = "wall"

    @property
    def slots(self) -> tuple[str, ...]:
        """gamma, M, D_0, T_0, p_0, m, radius, and the length of a finite cylinder"""
        return (*_DIFFUSION, "r", "L") if self.finite else (*_DIFFUSION, "r")

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """The decay constant of the slowest mode [1/s]"""
        gamma, molar_mass, D0, T0, p0, m, r = numbers[:7]
        h = gamma * mean_speed(fn, T, molar_mass) / (2 * (2 - gamma))
        # 1/D, and not D, so that an empty vessel (p = 0) divides by nothing
        slowness = p / (p0 * D0) * (T0 / T) ** m
        if self.form == "exact":
            # The modes of a finite cylinder are products, so their decay constants add.
            total = _mode(h, r, slowness, self.geometry)
            return total + _mode(h, numbers[7] / 2, slowness, "slab") if self.finite else total
        edge = math.pi if self.geometry == "sphere" else FIRST_ZERO
        curvature = (edge / r) ** 2
        surface = (3 if self.geometry == "sphere" else 2) / r
        if self.finite:
            curvature = curvature + (fn.pi / numbers[7]) ** 2
            surface = surface + 2 / numbers[7]
        free = h * surface
        return free / (1 + free * slowness / curvature)


def _mode(h: Any, half_width: Any, slowness: Any, geometry: Geometry) -> Any:
    """x^2 D/a^2 = (h/a) x^2/B [1/s]."""
    return h / half_width * eigenvalue_over_biot(h * half_width * slowness, geometry)


@dataclass(frozen=True)
class Wall(Law):
    """``law = "wall"``: first-order loss k_w of the one gas on the left, such as ``H -> 0.5 H2``.

    ``uptake`` gamma [1] is the share of molecules striking the wall that is lost. ``form``:

    - "exact": the slowest mode of diffusion, in a sphere or a cylinder;
    - "quick": 1/k_w = L^2/D + 2 V (2 - gamma)/(gamma v S), up to about 10 % low in between;
    - "uptake only": k_w = gamma v S/(4 V), where diffusion is no hindrance.

    Left out, it is "exact" where the form of the vessel is known and the mean free path 3 D/v is
    shorter than its width, else "uptake only". ``diffusion`` [m^2/s] holds at ``diffusion_at`` [K]
    and ``diffusion_pressure`` [Pa], and goes as T^m/p with m = ``diffusion_power`` (1.75 after
    Fuller, Schettler and Giddings, Ind. Eng. Chem. 58 (5), 18 (1966)); left out, it is
    estimated from the gases' diameters. ``area`` [m^2] is the surface, where the vessel's shape
    does not say it, and that of a piston.
    """

    uptake: Sourced
    form: Form | None = None
    diffusion: Sourced | None = None
    diffusion_at: Sourced | None = None
    diffusion_pressure: Sourced | None = None
    diffusion_power: Sourced = Sourced(1.75, default=True)
    area: Sourced | None = None
    word: ClassVar[str] = "wall"

    def template(self, context: StepContext) -> Formula:
        """The formula of the form in use."""
        form = self.form_in_use(context)
        if form == "uptake only":
            return UptakeOnly()
        inside = _interior(context)
        assert inside is not None, "problems() asks for a shape"
        finite = inside.form == "cylinder" and inside.length is not None
        return DiffusionAndUptake(form, inside.form, finite)

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """(gamma, M [kg/mol], …): S/V [1/m], or D_0, T_0, p_0, m, r and the length [SI]."""
        gas = context.reactants[0]
        assert gas.molar_mass is not None, "problems() asks for the mass"
        first = (self.uptake.value, gas.molar_mass.value)
        if self.form_in_use(context) == "uptake only":
            surface = self.surface_to_volume(context)
            assert surface is not None, "problems() asks for a surface"
            return (*first, surface)
        inside, D = _interior(context), self.diffusivity(context)
        assert inside is not None and D is not None, "problems() asks for both"
        sizes = (inside.radius,) if inside.length is None else (inside.radius, inside.length)
        if inside.form == "sphere":
            sizes = (inside.radius,)
        return (*first, D.value, D.temperature, D.pressure, D.power, *sizes)

    def form_in_use(self, context: StepContext) -> Form:
        """The form that was asked for, or the one that suits the vessel and its filling."""
        if self.form is not None:
            return self.form
        inside, path = _interior(context), self.mean_free_path(context)
        if self.area is not None or inside is None or path is None:
            return "uptake only"
        return "uptake only" if path > 2 * inside.radius else "exact"

    def mean_free_path(self, context: StepContext) -> float | None:
        """3 D/v at the start [m], None where D or the pressure is not known.

        Source: P. Atkins and J. de Paula, Physical Chemistry, 8th ed. (2006), section 21.4.
        """
        D, gas = self.diffusivity(context), context.reactants[0]
        if D is None or not context.pressure or gas.molar_mass is None:
            return None
        T = _start(context)
        return 3 * D(T, context.pressure) / math.sqrt(8 * R * T / (math.pi * gas.molar_mass.value))

    def diffusivity(self, context: StepContext) -> Diffusivity | None:
        """The diffusion coefficient: as stated, or estimated; None where it cannot be."""
        if self.diffusion is not None:
            T0 = 298.15 if self.diffusion_at is None else self.diffusion_at.value
            p0 = 1e5 if self.diffusion_pressure is None else self.diffusion_pressure.value
            return Diffusivity(self.diffusion.value, T0, p0, self.diffusion_power.value)
        return estimated_diffusivity(context, _start(context), self.diffusion_power.value)

    def surface_to_volume(self, context: StepContext) -> float | None:
        """S/V at filling [1/m]."""
        vessel = context.surroundings
        if vessel is None:
            return None
        if self.area is not None:
            return self.area.value / vessel.filling_volume
        return vessel.surface_to_volume

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """Not one gas to first order; no mass, surface, shape or D; gamma outside 0 to 1."""
        gas = context.reactants[0] if len(context.reactants) == 1 else None
        if gas is None or context.order != 1 or context.has_bath:
            found = " + ".join(g.name for g in context.reactants) or "nothing"
            expected = "one molecule, to first order and without M, such as H -> 0.5 H2"
            yield Problem("reaction", f"{found} on the left", expected)
            return
        if not 0 < self.uptake.value <= 1:
            yield Problem("uptake", f"{self.uptake.value:g}", "a probability above 0, at most 1")
        if gas.molar_mass is None:
            found = f"the label {gas.name}, which has no mass"
            yield Problem("law", found, "a gas with a mass: how often it strikes the wall")
        if self.surface_to_volume(context) is None:
            yield Problem("area", "nothing", "an area here, or a shape under [vessel]")
            return
        yield from self._diffusion_problems(gas, context)

    def _diffusion_problems(self, gas: Gas, context: StepContext) -> Iterator[Problem]:
        for key in ("diffusion_at", "diffusion_pressure"):
            if (self.diffusion is None) != (getattr(self, key) is None):
                given = "nothing" if self.diffusion is not None else f"{key} without diffusion"
                yield Problem(key, given, "diffusion, diffusion_at and diffusion_pressure together")
        if self.form in (None, "uptake only"):
            return
        if _interior(context) is None or self.area is not None:
            expected = 'form = "uptake only", or a sphere or cylinder under [vessel] and no area'
            yield Problem("form", f'"{self.form}" without the form of the vessel', expected)
        elif gas.molar_mass is not None and self.diffusivity(context) is None:
            expected = f"diffusion of {gas.name}, or diameters of it and of the other gases"
            yield Problem("diffusion", "nothing", expected)

    def cautions(self, context: StepContext) -> Iterator[str]:
        """Which form is used and why; an estimated D; the middle between the two ends; a piston."""
        form, gas = self.form_in_use(context), context.reactants[0]
        path, inside = self.mean_free_path(context), _interior(context)
        yield _FORMS[form].format(gas=gas.name)
        if form != "uptake only" and self.diffusion is None:
            D = self.diffusivity(context)
            if D is not None:
                yield f"D of {gas.name} is estimated, {D}: good to about 10 %."
        if path is not None and inside is not None and path > 0.2 * inside.radius:
            place = "longer than" if path > 2 * inside.radius else "not short against"
            yield (
                f"the mean free path of {gas.name}, {path * 1e3:.3g} mm at the start, is {place} "
                f"the width of the vessel, {inside.radius * 2e3:.3g} mm."
            )
        if context.surroundings is not None and not context.surroundings.is_rigid:
            yield (
                "the surface of the piston over its volume is kept at what it is at filling: k of "
                "the wall is off by about as much as the volume changes."
            )


_FORMS: dict[str, str] = {
    "exact": "wall loss of {gas}: the slowest mode of diffusion with uptake, exactly.",
    "quick": "wall loss of {gas}: the quick sum of two resistances, up to about 10 % low.",
    "uptake only": "wall loss of {gas}: γ v S/(4 V), with no hindrance by diffusion.",
}


def _interior(context: StepContext) -> Interior | None:
    return None if context.surroundings is None else context.surroundings.interior


def _start(context: StepContext) -> float:
    """The temperature at which things are judged before the run [K]."""
    return 298.15 if context.temperatures is None else context.temperatures[0]
