"""The tables of the page: rows of text, ready to be read, each with its heading row first."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from meanfree.experiment.inputs import inputs
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.kinetics import RateConstant
from meanfree.report.rows import NONE, Row, Sheet
from meanfree.report.run_models import RunSummary
from meanfree.report.summary import LEVELS
from meanfree.sourced import Sourced


def conversions(run: Run, summary: RunSummary) -> Sheet:
    """Time to each conversion of each filled gas that is consumed."""
    rows = [
        [
            wording.chemical(run.experiment.gas_named[gas.gas]),
            *(wording.duration(entry.time_s) for entry in gas.reaction_times),
        ]
        for gas in summary.gases
    ]
    return Sheet(["Gas", *(f"{100 * level:g} %" for level in LEVELS)], rows)


def half_lives(run: Run, summary: RunSummary) -> Sheet:
    """Successive half-lives; only as many columns as are reached by some gas."""
    most = max((sum(t is not None for t in gas.half_lives_s) for gas in summary.gases), default=0)
    count = max(most, 1)
    rows = []
    for gas in summary.gases:
        name = wording.chemical(run.experiment.gas_named[gas.gas])
        times = [wording.duration(time) for time in gas.half_lives_s[:count]]
        rows.append([name, *times, *([NONE] * (count - len(times)))])
    return Sheet(["Gas", *(_ordinal(n) for n in range(1, count + 1))], rows)


def _ordinal(n: int) -> str:
    return f"{n}{ {1: 'st', 2: 'nd', 3: 'rd'}.get(n, 'th') }"


def amounts(run: Run, summary: RunSummary) -> Sheet:
    """What there is of each gas at the start, at most, at the end, and at equilibrium."""
    shown = wording.units_in_use(run.experiment)
    unit, pressure = wording.pretty_unit(shown.amount), wording.pretty_unit(shown.pressure)
    resting = any(amount.equilibrium_mol is not None for amount in summary.amounts)
    heading = ["Gas", f"start ({unit})", f"at most ({unit})", "when", f"end ({unit})"]
    heading += ["end (mol/m³)", f"end ({pressure})"]
    heading += [f"equilibrium ({unit})"] if resting else []
    rows = []
    for amount in summary.amounts:
        row = [wording.chemical(run.experiment.gas_named[amount.gas])]
        row += [amount_in(amount.start_mol, shown.amount), amount_in(amount.peak_mol, shown.amount)]
        row += [_when(run, amount.gas, amount.peak_time_s), amount_in(amount.end_mol, shown.amount)]
        row += [wording.number(amount.end_mol_per_m3, 4)]
        row += [wording.quantity(amount.end_Pa, shown.pressure, "pressure", 4).rsplit(" ", 1)[0]]
        if resting:
            row.append(amount_in(amount.equilibrium_mol, shown.amount))
        rows.append(row)
    return Sheet(heading, rows)


def amount_in(mol: float | None, unit: str) -> str:
    """An amount without its unit, which the heading says."""
    if mol is None:
        return NONE
    return wording.quantity(mol, unit, "amount", 4).rsplit(" ", 1)[0]


def _when(run: Run, gas: str, time: float) -> str:
    amounts_there = run.amounts(run.trajectory.times)[run.index(gas)]
    if np.ptp(amounts_there) <= 1e-9 * max(float(np.max(amounts_there)), 1e-300):
        return "always"
    if time <= 0:
        return "start"
    return "end" if time >= run.end else wording.duration(time)


def asked(run: Run) -> Sheet | None:
    """The state at the times that the case asks for, None where it asks for none."""
    times = [t.value for t in run.experiment.plan.report_at if t.value <= run.end]
    missing = [t for t in run.experiment.plan.report_at if t.value > run.end]
    if not times and not missing:
        return None
    shown = wording.units_in_use(run.experiment)
    gases = run.experiment.gases
    heading = ["Time", *(f"{wording.chemical(gas)} (mol/m³)" for gas in gases)]
    heading += [
        f"conversion of {wording.chemical(run.experiment.gas_named[g])}" for g in run.consumed
    ]
    heading += [f"pressure ({wording.pretty_unit(shown.pressure)})", "temperature (K)"]
    rows = []
    for time in times:
        row = [wording.duration(time)]
        row += [wording.number(float(c), 4) for c in run.concentrations(time)[:, 0]]
        row += [wording.percent(float(run.conversion(g, time)[0])) for g in run.consumed]
        p = wording.quantity(float(run.pressure(time)[0]), shown.pressure, "pressure", 4)
        row += [p.rsplit(" ", 1)[0], wording.temperature(float(run.temperature(time)[0]))[:-2]]
        rows.append(row)
    rows += [
        [wording.duration(t.value), "after the end of the run", *[""] * (len(heading) - 2)]
        for t in missing
    ]
    return Sheet(heading, rows)


def constants(rows: Sequence[RateConstant]) -> Sheet:
    """Rate constants per event, and as the case counts them where that differs."""
    counted = any(row.shown_as_counted for row in rows)
    heading = ["Step", "Reaction", "Law", "T", "k per event"]
    heading += ["k in the case"] if counted else []
    gauged = any(row.shown_by_pressure for row in rows)
    heading += ["k for pressures"] if gauged else []
    heading += ["Ea at T", "Source"]
    table = []
    for row in rows:
        cells = [
            wording.clean(row.step),
            row.printed,
            row.law,
            wording.temperature(row.temperature),
        ]
        cells += [row.shown]
        cells += [row.shown_as_counted or "the same"] if counted else []
        cells += [row.shown_by_pressure or NONE] if gauged else []
        cells += [NONE if row.Ea is None else f"{wording.number(row.Ea / 1e3, 4)} kJ/mol"]
        table.append([*cells, row.source])
    return Sheet(heading, table, words=(0, 1, 2, len(heading) - 1))


def ceilings(rows: Sequence[RateConstant]) -> Sheet | None:
    """Rate constants of encounters against Z; None where no step is one."""
    table = []
    for row in rows:
        if row.order != 2:
            continue
        judged = row.judgement
        Z = None if row.ceiling is None else row.ceiling.Z
        table.append(
            [
                wording.clean(row.step),
                wording.temperature(row.temperature),
                NONE if Z is None else wording.rate(Z, row.shown_unit, 2.0),
                _number(None if judged is None else judged.steric),
                _number(None if judged is None else judged.A_over_Z),
                row.verdict,
            ]
        )
    heading = ["Step", "T", "Z", "Steric factor P", "A over Z", "Verdict"]
    return Sheet(heading, table, words=(0, 5)) if table else None


def _number(value: float | None) -> str:
    return NONE if value is None else wording.number(value)


def convention(rows: Sequence[RateConstant]) -> list[str]:
    """What the rate constants count, in sentences."""
    found = [
        "k counts events: the rate of a step is k times the concentrations, and a gas with the net "
        "number ν changes at ν times that rate. For 2 A → …, −d[A]/dt = 2 k [A]².",
    ]
    if any(row.ceiling is not None for row in rows):
        found.append(
            "Z is the rate constant if every encounter reacted, halved for like partners. "
            "P = k / (Z exp(−E0/RT)) with E0 = Ea − RT/2; A over Z = k exp(Ea/RT) / Z, "
            "√e = 1.65 times P where E0 is above zero."
        )
    if any(row.shown_by_pressure for row in rows):
        found.append(
            "k for pressures is k/(RT) to the power of its order less one: with partial pressures "
            "instead of concentrations it gives the change of a pressure per time at that "
            "temperature."
        )
    if any(wording.is_per_molecule(row.shown_unit) for row in rows):
        found.append("Units with molecule count single molecules, not moles.")
    return found


def inputs_in_use(run: Run) -> Sheet:
    """Every number of the case with its address and source."""
    rows = []
    for address, found in inputs(run.experiment).items():
        if found.quantity.default and address.endswith(".T_ref"):
            continue  # without a power of the temperature it means nothing
        value = f"{wording.given(found.value)} {wording.pretty_unit(found.unit)}".strip()
        source = wording.clean(found.source) or ("by default" if found.quantity.default else "")
        rows.append([wording.clean(address), value, source or "the case file"])
    return Sheet(["Address", "Value", "Source"], rows, words=(0, 2))


def gases(run: Run) -> Sheet:
    """What is known of every gas, each value with its source."""
    rows: list[Row] = []
    for gas in run.experiment.gases:
        name = wording.chemical(gas)
        who = "a label" if gas.is_label else f"CAS {gas.cas}" if gas.cas else "by its formula"
        found: list[tuple[str, str, str]] = []
        if gas.molar_mass is not None:
            found.append(("molar mass", *_shown(gas.molar_mass, 1e3, "g/mol", 6)))
        if gas.diameter is not None:
            found.append(("diameter", *_shown(gas.diameter, 1e10, "Å", 4)))
        thermo = gas.thermochemistry
        if thermo is not None:
            enthalpy, entropy = thermo.enthalpy_298, thermo.entropy_298
            found.append(("enthalpy, 298 K", *_shown(enthalpy, 1e-3, "kJ/mol", 6)))
            found.append(("entropy, 298 K", *_shown(entropy, 1.0, "J/mol/K", 6)))
            cp = f"{wording.number(float(thermo.heat_capacity(298.15)), 5)} J/mol/K"
            found.append(("heat capacity, 298 K", cp, thermo.heat_capacity_source))
        rows += [[name, who, *entry] for entry in found] or [[name, who, NONE, NONE, NONE]]
    return Sheet(["Gas", "Identity", "Property", "Value", "Source"], rows, words=(0, 1, 2, 4))


def _shown(value: Sourced, factor: float, unit: str, digits: int) -> tuple[str, str]:
    shown = f"{wording.given(value.value * factor, digits)} {unit}"
    return shown, wording.clean(value.source) or "the case file"


def verified(summary: RunSummary) -> str:
    """What a second integration said, in a sentence."""
    found = summary.verification
    if found is None:
        return "Not repeated with a second method; --verify does that."
    return (
        f"Repeated with {found.method} at a relative tolerance of {wording.given(found.rtol)}: "
        f"largest difference {wording.number(found.largest_difference, 2)} of the most there was, "
        f"in {wording.clean(found.gas)} after {wording.duration(found.time_s)}."
    )


def solver(summary: RunSummary) -> list[str]:
    """How it was integrated and what the run checked about itself, in sentences."""
    work, drift = summary.solver, summary.drift
    found = [
        f"{work.method} with a relative tolerance of {wording.given(work.rtol)}: {work.steps} "
        f"steps, {work.nfev} right-hand sides, {work.njev} Jacobians, {work.nlu} factorisations."
    ]
    if drift.elements:
        worst = max(drift.elements, key=lambda name: drift.elements[name])
        found.append(
            f"Elements kept: {', '.join(drift.elements)}; largest relative drift "
            f"{wording.number(drift.elements[worst], 2)}."
        )
    if drift.energy is not None:
        found.append(f"Energy kept to {wording.number(drift.energy, 2)}, relative.")
    if drift.volume is not None:
        found.append(f"Equation of state kept to {wording.number(drift.volume, 2)}, relative.")
    if drift.closed_form is not None and drift.closed_form_difference is not None:
        found.append(
            f"The integrated rate law ({drift.closed_form}) holds exactly here; largest difference "
            f"from it {wording.number(drift.closed_form_difference, 2)}, relative."
        )
    found.append(verified(summary))
    return found
