"""What `check` understood, as text for a reader."""

from __future__ import annotations

from meanfree.cli.understood import GasUnderstood, StepUnderstood, Understood
from meanfree.report import wording


def as_text(summary: Understood) -> str:
    """The record for a reader."""
    gases = "1 gas" if len(summary.gases) == 1 else f"{len(summary.gases)} gases"
    steps = "1 step" if len(summary.steps) == 1 else f"{len(summary.steps)} steps"
    lines = [summary.title, f"{summary.file} is understood: {gases}, {steps}.", ""]
    lines += [f"Vessel       {summary.vessel}", f"Temperature  {summary.temperature}"]
    lines += [f"Run          {summary.run}", "", *_fill_lines(summary), "", "Gases"]
    lines += _columns([_gas_cells(gas) for gas in summary.gases])
    lines += ["", "Steps"]
    for step in summary.steps:
        lines += _step_lines(step)
    for heading, phrases in (("Samples", summary.samples), ("Flows", summary.flows)):
        if phrases:
            lines += ["", heading, *(f"  {phrase}" for phrase in phrases)]
    lines += ["", "Assumed", *(f"  {line}" for line in summary.assumptions)]
    if summary.notes:
        lines += ["", "Notes", *(f"  {note}" for note in summary.notes)]
    return "\n".join(lines)


def _fill_lines(summary: Understood) -> list[str]:
    filling = wording.temperature(summary.filling_temperature_K)
    start = wording.temperature(summary.initial_temperature_K)
    rows = [["gas", "given", f"at filling, {filling}", f"at time zero, {start}", "amount"]]
    rows += [
        [
            filled.gas,
            filled.given,
            _kilopascal(filled.pressure_at_filling_Pa),
            _kilopascal(filled.pressure_at_start_Pa),
            f"{wording.number(filled.moles_mol * 1e3, 4)} mmol",
        ]
        for filled in summary.fill
    ]
    total = sum(filled.moles_mol for filled in summary.fill)
    rows.append(
        [
            "total",
            "",
            _kilopascal(summary.filling_pressure_Pa),
            _kilopascal(summary.initial_pressure_Pa),
            f"{wording.number(total * 1e3, 4)} mmol",
        ]
    )
    return ["Fill", *_columns(rows)]


def _kilopascal(pascal: float) -> str:
    return f"{wording.number(pascal / 1e3, 4)} kPa"


def _gas_cells(gas: GasUnderstood) -> list[str]:
    if gas.formula is None:
        return [gas.name, "a label", "", "", ""]
    size = ""
    if gas.diameter_m is not None:
        size = f"diameter {wording.number(gas.diameter_m * 1e10)} Å"
    range_ = ""
    if gas.thermochemistry_from_K is not None and gas.thermochemistry_to_K is not None:
        range_ = f"energies {gas.thermochemistry_from_K:g} to {gas.thermochemistry_to_K:g} K"
    cas = f"CAS {gas.cas}" if gas.cas else "no CAS number"
    return [gas.name, wording.formula_text(gas.formula), cas, size, range_]


def _step_lines(step: StepUnderstood) -> list[str]:
    orders = ", ".join(f"{order:g} in {gas}" for gas, order in step.orders.items())
    bath = ", 1 in M" if step.bath else ""
    counts = "each event" if step.counts == "events" else step.counts
    lines = [
        f"  {step.name}: {step.reaction}",
        f"    {', '.join([step.law, *step.choices])}: {', '.join(step.numbers)} (counts {counts})",
        f"    order {step.order + step.bath:g} ({orders}{bath})",
    ]
    if step.reverse:
        lines.append(f"    reverse by {step.reverse}")
    lines += [f"    {condition}" for condition in step.conditions]
    if step.source:
        lines.append(f"    source: {step.source}")
    return lines


def _columns(rows: list[list[str]]) -> list[str]:
    """Rows with their cells below each other."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    return [
        ("  " + "  ".join(cell.ljust(w) for cell, w in zip(row, widths, strict=True))).rstrip()
        for row in rows
    ]
