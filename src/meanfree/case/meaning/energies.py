"""Thermochemistry where a case needs it: looked up, replaced by the reader's values, in range."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from meanfree.case.findings import Findings
from meanfree.case.meaning.gases import own_source
from meanfree.case.schema.tables import GasTable
from meanfree.errors import InputError
from meanfree.gases.energies import thermochemistry_of
from meanfree.gases.gas import Gas
from meanfree.gases.thermochemistry import MARGIN, Thermochemistry, from_values
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, read
from meanfree.units.reading import described

_CP = "molar heat capacity"


def with_energies(
    gas: Gas,
    table: GasTable | None,
    span: tuple[float, float] | None,
    needed_by: str,
    findings: Findings,
) -> Gas:
    """The gas with its thermochemistry; what is missing or out of range is a problem.

    ``span`` [K] are the temperatures at which it is used, None where they are not known.
    """
    low, high = span if span is not None else (None, None)
    try:
        found = thermochemistry_of(gas, low, high)
        if table is not None:
            found = _own(gas, table, found, findings)
    except InputError as error:
        findings.add(*error.problems)
        return gas
    if found is None:
        key, expected = f"gases.{gas.name}", "enthalpy, entropy and heat_capacity under it"
        if gas.is_label:
            expected = "heat_capacity under it, or an isothermal run"
        findings.wrong(
            key, f"no known thermochemistry of {gas.name}, which {needed_by} needs", expected
        )
        return gas
    if span is not None:
        _check_range(gas, found, span, table, needed_by, findings)
    for caution in found.cautions:
        findings.note(f"{gas.name}: {caution}.")
    extrapolate = table is not None and table.extrapolate
    return replace(gas, thermochemistry=found, extrapolate=extrapolate)


def _own(
    gas: Gas, table: GasTable, known: Thermochemistry | None, findings: Findings
) -> Thermochemistry | None:
    """The reader's enthalpy, entropy and heat capacity over what is known."""
    enthalpy = own_source(table, table.enthalpy) if table.enthalpy is not None else None
    entropy = own_source(table, table.entropy) if table.entropy is not None else None
    if gas.is_label:  # a label's energies are those that its steps carry as heat
        enthalpy = entropy = Sourced(0.0, source="a label has none", default=True)
    elif known is not None:
        enthalpy, entropy = enthalpy or known.enthalpy_298, entropy or known.entropy_298
    if table.heat_capacity is None:
        if known is None or (table.enthalpy is None and table.entropy is None):
            return known
        assert enthalpy is not None and entropy is not None
        return _shifted(known, enthalpy, entropy)
    heat_capacity = _heat_capacity(f"gases.{gas.name}.heat_capacity", table.heat_capacity, findings)
    if heat_capacity is None or enthalpy is None or entropy is None:
        return known
    return from_values(
        enthalpy_298=enthalpy,
        entropy_298=entropy,
        heat_capacity=heat_capacity,
        source=table.source or "the case file",
        key=f"gases.{gas.name}",
    )


def _shifted(known: Thermochemistry, enthalpy: Sourced, entropy: Sourced) -> Thermochemistry:
    """The same heat capacity with another enthalpy and entropy at 298.15 K."""
    dH = enthalpy.value - known.enthalpy_298.value
    dS = entropy.value - known.entropy_298.value
    H, S = known.enthalpy_coefficients, known.entropy_coefficients
    return replace(
        known,
        enthalpy_298=enthalpy,
        entropy_298=entropy,
        enthalpy_coefficients=(H[0] + dH, *H[1:]),
        entropy_coefficients=(S[0] + dS, *S[1:]),
    )


def _heat_capacity(
    key: str, raw: Any, findings: Findings
) -> Sourced | list[tuple[float, float]] | None:
    """One Cp [J/mol/K], or points (T [K], Cp)."""
    try:
        if not isinstance(raw, list):
            return read(raw, _CP)
        points = []
        for pair in raw:
            if not isinstance(pair, list) or len(pair) != 2:
                expected = 'pairs such as ["300 K", "29 J/mol/K"]'
                raise QuantityError(described(pair), expected)
            points.append((read(pair[0], "temperature").value, read(pair[1], _CP).value))
    except QuantityError as error:
        findings.refused(key, error)
        return None
    return points


def _check_range(
    gas: Gas,
    found: Thermochemistry,
    span: tuple[float, float],
    table: GasTable | None,
    needed_by: str,
    findings: Findings,
) -> None:
    verdict = found.range_problem(*span)
    if verdict == "inside":
        return
    used = f"{span[0]:g} K" if span[0] == span[1] else f"{span[0]:g} to {span[1]:g} K"
    known = f"{found.low:g} to {found.high:g} K"
    if verdict == "slightly outside" or (table is not None and table.extrapolate):
        how = f"by no more than {MARGIN:g} K" if verdict != "outside" else "as the case allows"
        findings.note(f"{gas.name}: thermochemistry known from {known} is used at {used}, {how}.")
        return
    findings.wrong(
        f"gases.{gas.name}",
        f"thermochemistry known from {known} only, which {needed_by} needs at {used}",
        f"a temperature in that range, heat_capacity over it, or extrapolate = true "
        f"under [gases.{gas.name}]",
    )


def energies_needed(
    gases: Mapping[str, Gas | None], reversible: Mapping[str, list[str]], balance: str
) -> dict[str, str]:
    """Which gas needs thermochemistry, and what for.

    ``reversible`` lists the gases of each step with reverse = "thermochemistry"; ``balance``
    names the energy balance, empty where there is none.
    """
    needed = {gas: f"steps.{step}.reverse" for step, names in reversible.items() for gas in names}
    if balance:
        needed = {**dict.fromkeys(gases, balance), **needed}
    return needed
