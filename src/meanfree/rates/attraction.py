"""The long-range ceiling of two gases: how fast an attraction could bring them together.

Hard spheres are no ceiling where molecules attract each other from afar. What is known of the two
decides which attraction is taken; nothing is guessed, and what lacks is named.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from meanfree.gases.gas import Gas
from meanfree.rates.capture import Capture
from meanfree.rates.law import Law, StepContext
from meanfree.sourced import Sourced


@dataclass(frozen=True)
class Attraction:
    """What pulls two gases together, and where its numbers come from."""

    capture: Capture
    partners: tuple[Gas, Gas]
    basis: str

    @property
    def word(self) -> str:
        """Its name: "dispersion", "ion and induced dipole", …"""
        return self.capture.attraction

    def rate_constant(self, T: float) -> float:
        """k if every pair that the attraction captures reacted [m^3/mol/s], halved for like."""
        context = StepContext(partners=self.partners, order=2.0)
        return float(self.capture.rate_constant(context, T))


def attraction_of(partners: tuple[Gas, ...], law: Law | None = None) -> Attraction | str:
    """The attraction of two gases, or what must be known for it.

    Parameters
    ----------
    partners : the two colliding gases
    law : the law of their step; a `Capture` gives the attraction itself, without the share of
        electronic surfaces

    Returns
    -------
    Attraction, or a phrase such as "polarisability of NO not known"

    Two neutral molecules attract each other by dispersion (London's formula, of polarisabilities
    and ionisation energies); an ion attracts the dipole of a neutral, induced or permanent.
    """
    if len(partners) != 2:
        return "no encounter of two molecules"
    first, second = partners
    if isinstance(law, Capture):
        whole = replace(law, electronic_factor=Sourced(1.0, default=True))
        return Attraction(whole, (first, second), "as the step gives it")
    if first.molar_mass is None or second.molar_mass is None:
        return "no masses known"
    ions = [gas for gas in partners if gas.charge]
    if len(ions) == 2:
        return "two ions: no capture rate constant for those"
    return _with_ion(partners) if ions else _dispersion(first, second)


def _dispersion(first: Gas, second: Gas) -> Attraction | str:
    lacking = _lacking((first, second), "polarisability", "polarisability")
    lacking += _lacking((first, second), "ionisation_energy", "ionisation energy")
    if lacking:
        return "; ".join(lacking)
    law = Capture(
        "dispersion",
        polarisability=_by_name(first, second, key="polarisability"),
        ionisation_energy=_by_name(first, second, key="ionisation_energy"),
    )
    return Attraction(law, (first, second), "estimated by London's formula")


def _with_ion(partners: tuple[Gas, ...]) -> Attraction | str:
    first, second = partners
    neutral = second if first.charge else first
    if neutral.polarisability is None:
        return f"polarisability of {neutral.name} not known"
    alpha = {neutral.name: neutral.polarisability}
    if neutral.dipole is None or neutral.dipole.value == 0:
        law = Capture("ion and induced dipole", polarisability=alpha)
        basis = "from the polarisability; a permanent dipole, where there is one, adds to it"
        return Attraction(law, (first, second), basis)
    law = Capture("ion and permanent dipole", polarisability=alpha, dipole=neutral.dipole)
    return Attraction(law, (first, second), "from polarisability and dipole")


def _lacking(gases: tuple[Gas, Gas], key: str, word: str) -> list[str]:
    names = list(dict.fromkeys(gas.name for gas in gases if getattr(gas, key) is None))
    return [f"{word} of {' and '.join(names)} not known"] if names else []


def _by_name(*gases: Gas, key: str) -> Mapping[str, Sourced]:
    return {gas.name: getattr(gas, key) for gas in gases}
