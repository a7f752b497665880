"""The thermochemistry of a gas, found when it is first needed.

Many cases never ask for energies, so none are loaded with the gas itself.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import lru_cache

from meanfree.gases.gas import Gas
from meanfree.gases.pinned import pinned_heat_capacity, pinned_with_cas
from meanfree.gases.thermochemical_tables import HeatCapacityTable
from meanfree.gases.thermochemistry import MARGIN, REFERENCE_TEMPERATURE, Thermochemistry, build
from meanfree.sourced import Sourced

_HYDROGENS = frozenset({"1333-74-0", "7782-39-0"})
_HYDROGEN_CAUTION = "heat capacity of ortho and para at equilibrium, which differs below 250 K"
_ION_CAUTION = "ion: enthalpy by the stationary-electron convention"


def thermochemistry_of(
    gas: Gas, lowest: float | None = None, highest: float | None = None
) -> Thermochemistry | None:
    """Thermochemistry of ``gas``, or None where enthalpy, entropy or Cp is not known.

    What the reader gave with the gas comes first. Else the best table of heat capacities
    that covers ``lowest`` to ``highest`` [K]; where none covers it, the best that there is,
    and `Thermochemistry.range_problem` says so.
    """
    if gas.thermochemistry is not None or gas.cas is None:
        return gas.thermochemistry
    best: Thermochemistry | None = None
    for found in _choices(gas.cas, gas.charge):
        best = best or found
        low = found.low if lowest is None else lowest
        high = found.high if highest is None else highest
        if found.range_problem(low, high) != "outside":
            return found
    return best


def _choices(cas: str, charge: int) -> Iterator[Thermochemistry]:
    """Thermochemistry with each heat capacity in turn, best first, none built in vain."""
    values = _values(cas)
    if values is None:
        return
    enthalpy, entropy, cautions = values
    if charge:
        cautions = (*cautions, _ION_CAUTION)
    pinned = pinned_heat_capacity(cas)
    if pinned is not None:
        yield _join(cas, pinned, enthalpy, entropy, cautions)
    from meanfree.gases.thermochemical_tables import heat_capacity_tables

    for table in heat_capacity_tables(cas):
        covers = table.low - MARGIN <= REFERENCE_TEMPERATURE <= table.high + MARGIN
        if covers and table != pinned:
            yield _join(cas, table, enthalpy, entropy, cautions)


def _values(cas: str) -> tuple[Sourced, Sourced, tuple[str, ...]] | None:
    """Enthalpy, entropy and cautions; of a pinned gas from the pinned table."""
    pinned = pinned_with_cas(cas)
    if pinned is not None:
        if pinned.enthalpy_298 is None or pinned.entropy_298 is None:
            return None
        return pinned.enthalpy_298, pinned.entropy_298, pinned.cautions
    from meanfree.gases.thermochemical_tables import enthalpy_298, entropy_298

    enthalpy, entropy = enthalpy_298(cas), entropy_298(cas)
    if enthalpy is None or entropy is None:
        return None
    return enthalpy[0], entropy[0], tuple(c for c in (enthalpy[1], entropy[1]) if c)


@lru_cache(maxsize=512)
def _join(
    cas: str,
    table: HeatCapacityTable,
    enthalpy: Sourced,
    entropy: Sourced,
    cautions: tuple[str, ...],
) -> Thermochemistry:
    if cas in _HYDROGENS and table.kind == "trc":
        cautions = (*cautions, _HYDROGEN_CAUTION)
    return build(
        table.function(),
        table.low,
        table.high,
        enthalpy_298=enthalpy,
        entropy_298=entropy,
        source=table.source,
        cautions=cautions,
    )
