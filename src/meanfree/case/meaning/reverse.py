"""``reverse``: by thermochemistry, or by an equilibrium constant that says what it is."""

from __future__ import annotations

import math
from typing import Any, Literal

from meanfree.case.findings import did_you_mean
from meanfree.case.meaning.temperature import span
from meanfree.case.schema.base import shape
from meanfree.case.schema.steps import ReverseTable
from meanfree.case.step_reading import StepReading
from meanfree.experiment.mechanism import GivenEquilibrium
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, equilibrium_constant, read, read_number
from meanfree.units.reading import described

Reverse = Literal["thermochemistry"] | GivenEquilibrium | None
_FORMS = '"thermochemistry", or a table such as { Kp = "0.12 bar", at = "480 K" }'


def read_reverse(raw: Any, reading: StepReading) -> Reverse:
    """The way back, None where there is none or something is wrong with it."""
    if raw is None:
        return None
    before = reading.count
    _refuse_impossible(reading)
    if isinstance(raw, dict):
        given = _given(raw, reading)
        return given if reading.count == before else None
    if raw != "thermochemistry":
        near = did_you_mean(raw, ["thermochemistry"]) if isinstance(raw, str) else ""
        reading.wrong("reverse", described(raw), _FORMS + near)
        return None
    _refuse_labels(reading)
    return "thermochemistry" if reading.count == before else None


def _refuse_impossible(reading: StepReading) -> None:
    reaction = reading.reaction
    if reaction is None:
        return
    if reading.table.has("photon"):
        found = "a reverse of a step that takes in light"
        reading.wrong("reverse", found, "no reverse, or no photon")
    fractional = [gas for gas, n in reaction.products if not float(n).is_integer()]
    if fractional:
        found = f"a reverse of a step with a fractional yield of {', '.join(fractional)}"
        reading.wrong("reverse", found, "no reverse, or elementary steps with whole coefficients")
    if reading.orders is None:
        return
    for gas, number in reaction.net.items():
        order = reading.orders.get(gas, 0.0) + number
        if order < -1e-12:
            found = f"orders that give the reverse the order {order:g} in {gas}"
            expected = "forward orders with which no reverse order (order + net number) is negative"
            reading.wrong("reverse", found, expected)


def _refuse_labels(reading: StepReading) -> None:
    for name in reading.reaction.gases if reading.reaction is not None else ():
        gas = reading.gases.get(name)
        if gas is not None and gas.is_label:
            expected = "real gases only, or a table with Kp, Kc or K"
            reading.wrong("reverse", f"thermochemistry of the label {name}", expected)


def _given(raw: dict[str, Any], reading: StepReading) -> GivenEquilibrium | None:
    address = f"{reading.address}.reverse"
    table = shape(ReverseTable, raw, address, reading.findings)
    if table is None:
        return None
    kinds = [kind for kind in ("Kp", "Kc", "K") if table.has(kind)]
    if len(kinds) != 1:
        found = " and ".join(kinds) if kinds else "no constant"
        reading.wrong("reverse", found, 'one of Kp, Kc and K, such as Kp = "0.12 bar"')
        return None
    kind = kinds[0]
    constant = _constant(kind, getattr(table, kind), reading)
    _check_temperature(table, reading)
    if constant is None or table._wrong:
        return None
    enthalpy = None if table.enthalpy is None else reading.sourced(table.enthalpy)
    return GivenEquilibrium(
        kind=kind,  # type: ignore[arg-type]
        constant=constant,
        at=reading.sourced(table.at),
        enthalpy=enthalpy,
    )


def _constant(kind: str, raw: Any, reading: StepReading) -> Sourced | None:
    if reading.reaction is None or raw is None:
        return None
    change = sum(reading.reaction.net.values())
    dimension = equilibrium_constant(kind, change)
    try:
        if dimension == "equilibrium constant":
            value = read_number(raw, dimension)
        else:
            value = read(raw, dimension)
    except QuantityError as error:
        reading.wrong(f"reverse.{kind}", error.found, error.expected)
        return None
    return reading.sourced(value)


def _check_temperature(table: ReverseTable, reading: StepReading) -> None:
    """A constant at one temperature says nothing about another without an enthalpy."""
    if reading.temperature is None or table.is_wrong("at") or table.has("enthalpy"):
        return
    low, high = span(reading.temperature)
    at = table.at.value
    if reading.temperature_varies or not (
        math.isclose(low, at, rel_tol=1e-6) and math.isclose(high, at, rel_tol=1e-6)
    ):
        used = f"{low:g} K" if low == high else f"{low:g} to {high:g} K"
        if reading.temperature_varies and low == high:
            used = "a temperature that varies"
        found = f"nothing, though K is given at {at:g} K and used at {used}"
        reading.wrong("reverse.enthalpy", found, 'the enthalpy of reaction, such as "75 kJ/mol"')
