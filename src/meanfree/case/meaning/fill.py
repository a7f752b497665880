"""``[fill]``: how much of each gas, in whatever measure, and whether it can be."""

from __future__ import annotations

from typing import Any, cast

from meanfree.case.findings import Findings
from meanfree.case.meaning.names import gas_name_problem
from meanfree.case.schema.base import AS_GIVEN, shape
from meanfree.case.schema.tables import FillTable
from meanfree.experiment.fill import Fill, Kind, Portion
from meanfree.experiment.vessel import Vessel
from meanfree.sourced import Sourced
from meanfree.units import QuantityError, any_phrase, read_any, read_number

# Number densities before concentrations: "molecule/cm^3" is meant as the former.
MEASURES = ("pressure", "amount", "number density", "concentration")
AGREE = 1e-6  # what rounding in a file may leave between a total and its parts


def read_fill(raw: Any, findings: Findings) -> Fill | None:
    """The fill, None where something is wrong with it."""
    if raw is None:
        expected = 'a table [fill] with gases = { NOCl = "50 torr" }, say'
        findings.wrong("fill", "nothing", expected)
        return None
    before = len(findings.problems)
    table = shape(FillTable, raw, "fill", findings)
    if table is None or table.gases is None:
        return None
    if not table.gases:
        findings.wrong("fill.gases", "no gas", 'at least one, such as { NOCl = "50 torr" }')
    balance: str | None = None
    portions: dict[str, Portion] = {}
    for name, value in table.gases.items():
        key = f"fill.gases.{name}"
        problem = gas_name_problem(name)
        if problem is not None:
            findings.wrong(key, *problem)
        if value == "balance":
            if balance is not None:
                findings.wrong(key, f'"balance" beside that of {balance}', "one balance")
            balance = name
        else:
            portion = _portion(key, value, table.has("total"), findings)
            if portion is not None:
                portions[name] = portion
    if balance is not None and not table.has("total"):
        found = f'"balance" for {balance} without a total'
        findings.wrong("fill.total", found, 'total beside it, such as total = "185 torr"')
    if table.total is not None and table.total.value <= 0:
        findings.wrong("fill.total", "a total of 0", "a total above 0")
    if len(findings.problems) > before:
        return None
    total = table.total
    return Fill(
        gases=portions,
        total=None if total is None else Portion(total, cast(Kind, total.dimension)),
        balance=balance,
        at=table.at,
    )


def _portion(key: str, value: Any, with_total: bool, findings: Findings) -> Portion | None:
    """One gas: a quantity with a unit, or a fraction of the total."""
    try:
        if isinstance(value, str) and not _is_bare(value):
            quantity = read_any(value, (*MEASURES, "fraction"), AS_GIVEN)
        elif with_total:
            quantity = read_number(value, "fraction", AS_GIVEN)
        else:
            quantity = read_any(value, MEASURES, AS_GIVEN)
    except QuantityError as error:
        wanted = (*MEASURES, "fraction") if with_total else MEASURES
        expected = error.expected.replace(any_phrase((*MEASURES, "fraction")), any_phrase(wanted))
        findings.wrong(key, error.found, expected)
        return None
    if quantity.dimension == "fraction" and not with_total:
        found = "a fraction without a total"
        findings.wrong(key, found, 'a total beside it, such as total = "185 torr"')
        return None
    return Portion(quantity, cast(Kind, quantity.dimension))


def _is_bare(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def check_sum(fill: Fill, vessel: Vessel, initial: float, findings: Findings) -> None:
    """Refuse fills whose parts contradict their total, and empty ones."""
    moles = fill.moles(vessel, initial)
    if fill.total is None:
        if sum(moles.values()) <= 0:
            findings.wrong("fill.gases", "nothing but zeros", "at least one gas above 0")
        return
    whole = _whole(fill, vessel, initial)
    parts = sum(n for gas, n in moles.items() if gas != fill.balance)
    if fill.balance is not None and parts > whole * (1 + AGREE):
        found = f"parts that make {parts / whole:.6g} of the total, and a balance"
        findings.wrong("fill.gases", found, "parts that leave something for the balance")
    elif fill.balance is None and abs(parts / whole - 1) > AGREE:
        found = f"parts that make {parts / whole:.6g} of the total"
        findings.wrong("fill.gases", found, 'parts that make up the total, or one gas as "balance"')


def _whole(fill: Fill, vessel: Vessel, initial: float) -> float:
    assert fill.total is not None
    alone = Fill(gases={"total": Portion(Sourced(1.0), "fraction")}, total=fill.total, at=fill.at)
    return alone.moles(vessel, initial)["total"]
