"""``[[flows]]``: what each kind of flow takes, and what goes with it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from meanfree.case.findings import Findings
from meanfree.case.schema.base import AS_GIVEN, shape
from meanfree.case.schema.flows import FlowTable
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.flows import Flow
from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced
from meanfree.units.reading import described

MOST = 20
_NEEDS = {
    "effusion": ("hole",),
    "pumping": ("rate",),
    "dilution": ("rate", "entering"),
    "leak-up": ("rise", "entering"),
}
_MAY = {"effusion": ("transmission",)}
_EXAMPLES = {
    "hole": 'hole = "100 um^2"',
    "rate": 'rate = "1e-5 1/s"',
    "rise": 'rise = "0.02 torr/h"',
    "entering": "entering = { N2 = 0.79, O2 = 0.21 }",
}


def gases_in(raw: Any) -> list[str]:
    """Names of the gases that flow in, where they can be read."""
    tables = raw if isinstance(raw, list) else []
    entering = [table.get("entering") for table in tables if isinstance(table, dict)]
    return [name for mixture in entering if isinstance(mixture, dict) for name in mixture]


def read_flows(raw: Any, gases: Mapping[str, Gas | None], findings: Findings) -> tuple[Flow, ...]:
    """The flows; what is wrong with them goes to ``findings``."""
    if raw is None:
        return ()
    if not isinstance(raw, list) or not all(isinstance(table, dict) for table in raw):
        findings.wrong("flows", described(raw), "tables headed [[flows]], with two brackets")
        return ()
    if len(raw) > MOST:
        findings.wrong("flows", f"{len(raw)} flows", f"at most {MOST}")
        return ()
    read = [_flow(table, f"flows.{place}", gases, findings) for place, table in enumerate(raw)]
    return tuple(flow for flow in read if flow is not None)


def _flow(
    raw: Any, address: str, gases: Mapping[str, Gas | None], findings: Findings
) -> Flow | None:
    before = len(findings.problems)
    table = shape(FlowTable, raw, address, findings)
    if table is None or table.kind is None:
        return None
    needs, may = _NEEDS[table.kind], _MAY.get(table.kind, ())
    for key, example in {**_EXAMPLES, "transmission": "transmission = 0.8"}.items():
        if key in needs and not table.has(key):
            findings.wrong(f"{address}.{key}", f'nothing, with kind = "{table.kind}"', example)
        elif key not in (*needs, *may) and table.has(key):
            found, expected = f'{key} with kind = "{table.kind}"', " and ".join(needs)
            findings.wrong(f"{address}.{key}", found, f"only {expected}, or another kind")
    if table.entering is not None:
        _check_entering(table.entering, f"{address}.entering", findings)
    if table.kind == "effusion":
        for name, gas in gases.items():
            if gas is not None and gas.molar_mass is None:
                found = f"effusion, with the label {name}, which has no mass"
                findings.wrong(f"{address}.kind", found, '"pumping", or gases that are known')
    if len(findings.problems) > before:
        return None
    source = table.source or AS_GIVEN

    def named(quantity: Sourced | None) -> Sourced | None:
        return None if quantity is None else replace(quantity, source=source)

    flow = Flow(
        table.kind,
        hole=named(table.hole),
        rate=named(table.rate),
        rise=named(table.rise),
        entering=table.entering,
        source=table.source,
    )
    share = named(table.transmission)
    return flow if share is None else replace(flow, transmission=share)


def _check_entering(entering: Mapping[str, Sourced], address: str, findings: Findings) -> None:
    total = sum(share.value for share in entering.values())
    if abs(total - 1) > 1e-6:
        findings.wrong(address, f"fractions that add up to {total:g}", "fractions that add up to 1")


def check_flows(experiment: Experiment, findings: Findings) -> None:
    """An open vessel needs an end; a blank's rise needs a volume that is held."""
    if not experiment.flows:
        return
    if experiment.plan.until is None:
        found = "auto, with gas that flows in or out"
        findings.wrong("run.until", found, 'a time such as "2 h": such a vessel does not settle')
    for place, flow in enumerate(experiment.flows):
        if flow.kind == "leak-up" and not experiment.vessel.is_rigid:
            found = "a rise of pressure in a vessel that holds its pressure"
            findings.wrong(f"flows.{place}.rise", found, 'a step with law = "source"')
        if flow.kind == "effusion" and not experiment.vessel.is_rigid:
            findings.note(
                f"flows.{place}: the hole over the volume is kept at what it is at filling."
            )
    if experiment.vessel.dead_space is not None:
        findings.note("Flows leave and enter the hot part only, not the dead space.")
