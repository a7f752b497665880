"""``labels`` and ``[gases.NAME]``: who each gas is, and the reader's own values for it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import Any

from meanfree.case.findings import Findings, did_you_mean
from meanfree.case.meaning.names import gas_name_problem
from meanfree.case.schema.base import AS_GIVEN, shape
from meanfree.case.schema.tables import GasTable
from meanfree.errors import InputError
from meanfree.gases.gas import Gas
from meanfree.gases.identity import find_gas
from meanfree.sourced import Sourced
from meanfree.units.reading import described

_OWN = ("diameter", "polarisability", "ionisation_energy", "dipole")
MOST_UNKNOWN = 40
_NO_LABEL_KEYS = ("formula", "cas", *_OWN, "enthalpy", "entropy")


def read_labels(raw: Any, findings: Findings) -> tuple[str, ...]:
    """The declared labels; what is no name or stands twice is a problem."""
    if raw is None:
        return ()
    if not isinstance(raw, list):
        findings.wrong("labels", described(raw), 'a list of names, such as ["A", "lump1"]')
        return ()
    labels: dict[str, None] = {}
    for place, name in enumerate(raw):
        problem = gas_name_problem(name)
        if problem is not None:
            findings.wrong(f"labels.{place}", *problem)
        elif name in labels:
            findings.wrong(f"labels.{place}", f'"{name}" twice', "each label once")
        else:
            labels[name] = None
    return tuple(labels)


def read_gas_tables(raw: Any, findings: Findings) -> dict[str, GasTable]:
    """The ``[gases.NAME]`` tables by name."""
    if raw is None:
        return {}
    if not isinstance(raw, dict):
        findings.wrong("gases", described(raw), "tables such as [gases.NOCl]")
        return {}
    tables = {}
    for name, table in raw.items():
        problem = gas_name_problem(name)
        if problem is not None:
            findings.wrong(f"gases.{name}" if name.isprintable() else "gases", *problem)
            continue
        read = shape(GasTable, table, f"gases.{name}", findings)
        if read is not None:
            tables[name] = read
    return tables


def find_gases(
    names: Iterable[str],
    labels: tuple[str, ...],
    tables: Mapping[str, GasTable],
    findings: Findings,
) -> dict[str, Gas | None]:
    """Every gas of the fill and the steps by name; None for one that is not known."""
    gases: dict[str, Gas | None] = {}
    declared, unknown = set(labels), 0
    for name in names:
        table = tables.get(name)
        if name in declared:
            gases[name] = Gas.label(name)
            _refuse_label_values(name, table, findings)
        elif unknown >= MOST_UNKNOWN:
            gases[name] = None
        else:
            gases[name] = _known(name, table, findings)
            unknown += gases[name] is None
            if unknown == MOST_UNKNOWN:  # each is sought for in a library of 70 000 compounds
                expected = "labels = […] for names that are no real gases"
                findings.wrong("gases", f"{unknown} unknown gases, and more unread", expected)
    _refuse_two_names(gases, findings)
    return gases


def _refuse_two_names(gases: Mapping[str, Gas | None], findings: Findings) -> None:
    """Under two names one gas would be two: what one step forms another would not find."""
    first: dict[str, str] = {}
    for name, gas in gases.items():
        if gas is None or gas.cas is None:
            continue
        if gas.cas in first:
            found = f"{name}, which is {first[gas.cas]} under another name (CAS {gas.cas})"
            expected = f'{first[gas.cas]} throughout, or cas = "none" for a species of its own'
            findings.wrong(f"gases.{name}", found, expected)
        first.setdefault(gas.cas, name)


def _known(name: str, table: GasTable | None, findings: Findings) -> Gas | None:
    if table is not None and (table.is_wrong("formula") or table.is_wrong("cas")):
        return None
    formula, cas = (None, None) if table is None else (table.formula, table.cas)
    try:
        gas = find_gas(name, formula=formula, cas=cas)
    except InputError as error:
        findings.add(*error.problems)
        return None
    if table is None:
        return gas
    ionisation = table.ionisation_energy
    if ionisation is not None and ionisation.value <= 0:
        found = f"{ionisation.value:g} J/mol"
        findings.wrong(f"gases.{name}.ionisation_energy", found, "an energy above 0")
    given: dict[str, Sourced | None] = {key: getattr(table, key) for key in _OWN}
    own = {key: own_source(table, value) for key, value in given.items() if value is not None}
    return replace(gas, **own)  # type: ignore[arg-type]


def _refuse_label_values(name: str, table: GasTable | None, findings: Findings) -> None:
    if table is None:
        return
    for key in _NO_LABEL_KEYS:
        if table.has(key):
            found = f"{key} of a label, which is no real gas"
            findings.wrong(f"gases.{name}.{key}", found, f'no such key, or no "{name}" in labels')


def refuse_unused(
    used: Iterable[str],
    labels: tuple[str, ...],
    tables: Mapping[str, GasTable],
    findings: Findings,
) -> None:
    """A gas in no step and no fill is a slip of the pen."""
    names, declared = dict.fromkeys(used), set(labels)
    for name in tables:
        if name not in names and name not in declared:
            expected = f"a gas of the fill or a step{did_you_mean(name, names)}"
            findings.wrong(f"gases.{name}", "a gas in no step and no fill", expected)
    for name in labels:
        if name not in names:
            expected = f"only names that the fill or a step uses{did_you_mean(name, names)}"
            findings.wrong("labels", f'"{name}", in no step and no fill', expected)


def own_source(table: GasTable, quantity: Sourced) -> Sourced:
    """A value of a gas's table with the table's source."""
    return replace(quantity, source=table.source or AS_GIVEN)
