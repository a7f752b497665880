"""What a gas is, as one record: its name, its formula, and its properties with sources.

A gas without a formula is a bare label: it has no mass and no elements, and only laws
that need none accept it.
"""

from __future__ import annotations

from dataclasses import dataclass

from meanfree.gases.formula import Formula
from meanfree.gases.thermochemistry import Thermochemistry
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Gas:
    """One chemical species in the vessel.

    ``molar_mass`` [kg/mol], ``diameter`` [m] (of the hard sphere that stands for the
    molecule) and ``well_depth`` [K] (epsilon / k_B of a Lennard-Jones potential with that
    diameter) are None where nothing is known. ``thermochemistry`` is what the reader
    gave; `meanfree.gases.energies.thermochemistry_of` finds the rest when it is needed.
    ``cautions`` are said wherever the gas appears; those of energies stand with the energies.
    ``extrapolate`` allows energies at temperatures that their source does not cover.
    ``polarisability`` [m^3] (as a volume), ``ionisation_energy`` [J/mol] and ``dipole`` [C m] are
    what a reader gave for the long-range attraction; no table here has them.
    """

    name: str
    formula: Formula | None = None
    cas: str | None = None
    molar_mass: Sourced | None = None
    diameter: Sourced | None = None
    thermochemistry: Thermochemistry | None = None
    well_depth: Sourced | None = None
    cautions: tuple[str, ...] = ()
    extrapolate: bool = False
    polarisability: Sourced | None = None
    ionisation_energy: Sourced | None = None
    dipole: Sourced | None = None

    @property
    def is_label(self) -> bool:
        """Whether this is a bare label, no real gas."""
        return self.formula is None

    @property
    def charge(self) -> int:
        """Elementary charges of one molecule; 0 for a label."""
        return 0 if self.formula is None else self.formula.charge

    @classmethod
    def label(cls, name: str) -> Gas:
        """A bare label: no formula, no mass, no diameter, no energies.

        >>> Gas.label("lump1").is_label
        True
        """
        return cls(name=name)
