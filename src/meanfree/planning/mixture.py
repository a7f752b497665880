"""The filled mixture as kinetic theory sees it: free paths, diffusion, conduction, walls.

Every property is worked out at the start of the run; None where a mass, a diameter or a heat
capacity is not known.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from meanfree.collisions import mixtures, speeds
from meanfree.constants import R
from meanfree.experiment.experiment import Experiment
from meanfree.gases import transport
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.gas import Gas

Floats = NDArray[np.float64]

FIRST_ZERO = 2.404825557695773
"""First zero of the Bessel function J0 (scipy.special.jn_zeros(0, 1))."""


@dataclass(frozen=True)
class Molecule:
    """One gas in the mixture, at the start of the run.

    ``free_path`` [m], ``diffusion`` [m^2/s] of the gas in the filled mixture, ``speed`` the mean
    speed [m/s], ``gas_collisions`` and ``wall_collisions`` of one molecule [1/s].
    """

    gas: str
    free_path: float
    diffusion: float
    speed: float
    gas_collisions: float
    wall_collisions: float


class Mixture:
    """What is filled, at the run's temperature at time zero."""

    def __init__(self, experiment: Experiment) -> None:
        self.experiment = experiment
        self.T = experiment.temperature.initial
        self.p = experiment.initial_pressure
        self.filled: tuple[Gas, ...] = tuple(
            gas for gas in experiment.gases if experiment.moles[gas.name] > 0
        )
        shares = np.array([experiment.moles[gas.name] for gas in self.filled])
        self.shares = shares / shares.sum() if len(shares) else shares

    @cached_property
    def lacking(self) -> tuple[str, ...]:
        """Filled gases whose mass or diameter is not known: with one, nothing follows."""
        return tuple(g.name for g in self.filled if g.molar_mass is None or g.diameter is None)

    @property
    def known(self) -> bool:
        """True where masses and diameters of all that is filled are known."""
        return bool(self.filled) and not self.lacking

    @cached_property
    def molecules(self) -> tuple[Molecule, ...]:
        """Every gas of known mass and diameter in the filled mixture, filled or not."""
        if not self.known:
            return ()
        gases = [g for g in self.experiment.gases if g.molar_mass and g.diameter]
        masses, sizes = _masses(gases), _sizes(gases)
        total = self.p / (R * self.T)
        share = dict(zip((g.name for g in self.filled), self.shares, strict=True))
        c = np.array([total * share.get(gas.name, 0.0) for gas in gases])
        paths = mixtures.mixture_mean_free_paths(masses, sizes, c)
        frequencies = mixtures.mixture_collision_frequencies(masses, sizes, c, self.T).sum(axis=1)
        # S/V as it is in the vessel at time zero: a piston's has moved since filling.
        walls = self.surface / self.volume
        found = []
        for gas, path, frequency in zip(gases, paths, frequencies, strict=True):
            assert gas.molar_mass is not None
            speed = float(speeds.mean_speed(gas.molar_mass.value, self.T))
            found.append(
                Molecule(
                    gas.name,
                    float(path),
                    self._diffusion(gas),
                    speed,
                    float(frequency),
                    0.25 * speed * walls,
                )
            )
        return tuple(found)

    def _diffusion(self, gas: Gas) -> float:
        """Of a trace of a gas in the filled mixture [m^2/s], its own kind included."""
        pairs = [_binary(gas, other, self.T, self.p) for other in self.filled]
        return float(transport.mixture_diffusion(self.shares, np.array(pairs)))

    @cached_property
    def conductivity(self) -> float | None:
        """Thermal conductivity of the mixture [W/m/K]."""
        capacities = self.heat_capacities
        if capacities is None or not self.known:
            return None
        masses = _masses(self.filled)
        etas = np.array([_viscosity(gas, self.T) for gas in self.filled])
        lambdas = transport.thermal_conductivity(etas, masses, capacities)
        return float(transport.mixture_thermal_conductivity(self.shares, lambdas, etas, masses))

    @cached_property
    def heat_capacities(self) -> Floats | None:
        """Cp of every filled gas [J/mol/K, shape (n_filled,)]."""
        found = [thermochemistry_of(gas, self.T, self.T) for gas in self.filled]
        values = [float(t.heat_capacity(self.T)) for t in found if t is not None]
        return np.array(values) if len(values) == len(found) and values else None

    @cached_property
    def thermal_diffusivity(self) -> float | None:
        """lambda / (c Cp) [m^2/s]."""
        if self.conductivity is None or self.heat_capacities is None:
            return None
        capacity = float(self.shares @ self.heat_capacities) * self.p / (R * self.T)
        return self.conductivity / capacity

    # The vessel

    @property
    def volume(self) -> float:
        """Volume at time zero [m^3]."""
        return self.experiment.initial_volume

    @property
    def form(self) -> str:
        """ "sphere" or "cylinder" as stated, or "assumed" where no form is stated."""
        inside = self.experiment.vessel.interior
        return "assumed" if inside is None else inside.form

    @cached_property
    def radius(self) -> float:
        """Inner radius [m]; of the sphere of the same volume where no form is stated."""
        inside = self.experiment.vessel.interior
        return math.cbrt(0.75 * self.volume / math.pi) if inside is None else inside.radius

    @property
    def length(self) -> float | None:
        """Inner length of a cylinder [m], None for a sphere."""
        inside = self.experiment.vessel.interior
        return None if inside is None else inside.length

    @property
    def surface(self) -> float:
        """Inner surface [m^2]; of the sphere of the same volume where none is stated."""
        shape = self.experiment.vessel.shape
        return 4 * math.pi * self.radius**2 if shape is None else shape.area(self.volume)

    @cached_property
    def diffusion_length_squared(self) -> float:
        """Lambda^2 [m^2]: Lambda^2/D is the time of the slowest mode of diffusion to the wall.

        Sphere (r/pi)^2; cylinder 1/Lambda^2 = (2.405/r)^2 + (pi/L)^2. Source: P. M. Morse and
        H. Feshbach, Methods of Theoretical Physics, 1953 (lowest modes; from memory).
        """
        if self.length is None:
            return (self.radius / math.pi) ** 2
        return 1.0 / ((FIRST_ZERO / self.radius) ** 2 + (math.pi / self.length) ** 2)


def _masses(gases: tuple[Gas, ...] | list[Gas]) -> Floats:
    return np.array([gas.molar_mass.value for gas in gases if gas.molar_mass is not None])


def _sizes(gases: tuple[Gas, ...] | list[Gas]) -> Floats:
    return np.array([gas.diameter.value for gas in gases if gas.diameter is not None])


def _binary(one: Gas, two: Gas, T: float, p: float) -> float:
    assert one.molar_mass is not None and two.molar_mass is not None
    assert one.diameter is not None and two.diameter is not None
    wells = one.well_depth is not None and two.well_depth is not None
    return float(
        transport.binary_diffusion(
            T,
            p,
            one.molar_mass.value,
            two.molar_mass.value,
            one.diameter.value,
            two.diameter.value,
            well_depth_1=one.well_depth.value if wells and one.well_depth else None,
            well_depth_2=two.well_depth.value if wells and two.well_depth else None,
        )
    )


def _viscosity(gas: Gas, T: float) -> float:
    assert gas.molar_mass is not None and gas.diameter is not None
    well = None if gas.well_depth is None else gas.well_depth.value
    return float(transport.viscosity(T, gas.molar_mass.value, gas.diameter.value, well_depth=well))
