"""How fast a gas diffuses to the wall, where nobody has measured it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from meanfree.gases.gas import Gas
from meanfree.gases.transport import binary_diffusion, mixture_diffusion
from meanfree.rates.law import StepContext


@dataclass(frozen=True)
class Diffusivity:
    """D = ``value`` (T/``temperature``)^``power`` ``pressure``/p [m^2/s; K, 1, Pa]."""

    value: float
    temperature: float
    pressure: float
    power: float

    def __call__(self, T: float, p: float) -> float:
        """D at T [K] and p [Pa]."""
        return float(self.value * (T / self.temperature) ** self.power * self.pressure / p)

    def __str__(self) -> str:
        square_cm = self(self.temperature, 101325.0) * 1e4
        return f"{square_cm:.3g} cm²/s at {self.temperature:g} K and 1 atm"


def estimated_diffusivity(context: StepContext, T: float, power: float) -> Diffusivity | None:
    """D of the step's one reactant in the initial mixture at T [K], by kinetic theory.

    None where a mass or a diameter is not known, or the vessel is empty. Where the gas is
    alone, it is the self-diffusion coefficient.
    """
    gas, gases = context.reactants[0], context.gases
    if gases is None or context.bath is None:
        return None
    bath = {name: x for name, x in context.bath.items() if x > 0 and name != gas.name}
    if not bath:
        bath = {gas.name: 1.0}
    each = [_binary(gas, gases[name], T) for name in bath]
    known = [D for D in each if D is not None]
    if not known or len(known) < len(each):
        return None
    value = float(mixture_diffusion(list(bath.values()), known))
    return Diffusivity(value, T, _PRESSURE, power)


_PRESSURE = 1e5


def _binary(first: Gas, second: Gas, T: float) -> float | None:
    if first.molar_mass is None or second.molar_mass is None:
        return None
    if first.diameter is None or second.diameter is None:
        return None
    depths: Mapping[str, float] = {}
    if first.well_depth is not None and second.well_depth is not None:
        depths = {"well_depth_1": first.well_depth.value, "well_depth_2": second.well_depth.value}
    return float(
        binary_diffusion(
            T,
            _PRESSURE,
            first.molar_mass.value,
            second.molar_mass.value,
            first.diameter.value,
            second.diameter.value,
            **depths,
        )
    )
