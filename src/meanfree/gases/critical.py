"""Critical temperature and pressure, for how ideal a gas is. None where they are not known."""

from __future__ import annotations

from functools import lru_cache

from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced

SOURCES = ("HEOS", "IUPAC", "MATTHEWS", "CRC", "WEBBOOK", "PD", "PSRK")
"""Collections of measured critical constants in `chemicals`, the most careful first; the group
contribution methods in that library are not asked."""


def critical_point(gas: Gas) -> tuple[Sourced, Sourced] | None:
    """Critical temperature [K] and pressure [Pa] of ``gas``, both from one collection."""
    if gas.cas is None or gas.charge:
        return None
    return _critical_point(gas.cas)


@lru_cache(maxsize=512)
def _critical_point(cas: str) -> tuple[Sourced, Sourced] | None:
    from chemicals import critical

    temperatures, pressures = critical.Tc_methods(cas), critical.Pc_methods(cas)
    for source in SOURCES:
        if source in temperatures and source in pressures:
            T, p = critical.Tc(cas, method=source), critical.Pc(cas, method=source)
            if T and p:
                name = f"critical constants, {source} in chemicals"
                return Sourced(float(T), "K", name), Sourced(float(p), "bar", name)
    return None
