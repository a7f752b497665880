"""What a column of readings is: the words of ``is``, held against the gases of the case."""

from __future__ import annotations

from typing import Any

from meanfree import units
from meanfree.case.findings import Findings, did_you_mean, one_of
from meanfree.case.schema.data import DataTable
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.measured.signals import (
    ABSORBANCE,
    DIMENSIONS,
    RATE_CONSTANT,
    Signal,
    coefficient_as_used,
    take_apart,
)
from meanfree.sourced import Sourced
from meanfree.units import QuantityError
from meanfree.units.gate import quoted


def read_signal(
    table: DataTable, key: str, experiment: Experiment, findings: Findings
) -> Signal | None:
    """What was read, with every gas and step of it known."""
    column = table.signal
    text = None if column is None else getattr(column, "is")
    if column is None or text is None:
        return None
    parts = take_apart(text)
    if parts is None:
        kinds = [*DIMENSIONS, RATE_CONSTANT]
        head = " ".join(text.split()).partition(" of ")[0]
        wanted = one_of(
            f"{k} of …" if k not in ("total pressure", ABSORBANCE) else k for k in kinds
        )
        findings.wrong(f"{key}.is", quoted(text), wanted + did_you_mean(head, kinds))
        return None
    kind, names = parts
    if kind == RATE_CONSTANT:
        return _rate_constant(names[0], column, key, experiment, findings)
    known = list(experiment.gas_named)
    for name in names:
        if name not in known:
            hint = one_of(known) + did_you_mean(name, known)
            findings.wrong(f"{key}.is", f"{quoted(name)}, no gas of the case", hint)
    if kind == "conversion" and all(name in known for name in names):
        filled = sum(experiment.moles[name] for name in names)
        if experiment.flows:
            found = "conversion in a vessel that leaks or is pumped"
            findings.wrong(f"{key}.is", found, "a concentration, a pressure or a mole fraction")
            return None
        if filled <= 0:
            findings.wrong(
                f"{key}.is",
                f"conversion of what is not filled ({', '.join(names)})",
                "a filled gas",
            )
            return None
    if any(name not in known for name in names):
        return None
    if kind == ABSORBANCE:
        return _absorbance(column, names, key, known, findings)
    for extra in ("path", "coefficients"):
        if getattr(column, extra):
            findings.wrong(
                f"{key}.{extra}", f"{extra} of a {kind}", "this key with an absorbance only"
            )
    return Signal(kind, names)


def _absorbance(
    column: Any, names: tuple[str, ...], key: str, known: list[str], findings: Findings
) -> Signal | None:
    before = len(findings.problems)
    if column.path is None and not column.is_wrong("path"):
        findings.wrong(f"{key}.path", "nothing", 'the length of the light\'s way, such as "10 cm"')
    coefficients: dict[str, Sourced] = {}
    for gas, text in (column.coefficients or {}).items():
        where = f"{key}.coefficients.{gas}"
        if gas not in known:
            findings.wrong(where, f"{quoted(gas)}, no gas of the case", one_of(known))
            continue
        try:
            found = units.read_any(
                text, ("molar absorption coefficient", "absorption cross-section")
            )
        except QuantityError as error:
            findings.wrong(where, error.found, error.expected)
            continue
        per_molecule = found.dimension == "absorption cross-section"
        value = coefficient_as_used(
            found.value,
            per_molecule=per_molecule,
            base=column.base,
            written="e" if per_molecule else "10",
        )
        coefficients[gas] = found.with_value(value)
    if not column.coefficients and not column.is_wrong("coefficients"):
        expected = 'the gases that absorb, such as { NO2 = "85 L/mol/cm" }'
        findings.wrong(f"{key}.coefficients", "nothing", expected)
    for name in names:
        if name not in coefficients and column.coefficients:
            findings.wrong(f"{key}.coefficients", f"no {name}", f'{name} = "85 L/mol/cm", say')
    if len(findings.problems) > before:
        return None
    return Signal(ABSORBANCE, tuple(coefficients), column.path, coefficients)


def _rate_constant(
    name: str, column: Any, key: str, experiment: Experiment, findings: Findings
) -> Signal | None:
    steps = {step.name: step for step in experiment.steps}
    if name not in steps:
        hint = one_of(steps) + did_you_mean(name, steps)
        findings.wrong(f"{key}.is", f"{quoted(name)}, no step of the case", hint)
        return None
    step = steps[name]
    per = _counted(step, column.counts or "events")
    if per is None:
        choices = ["events", *(f"loss of {g}" for g, n in step.net.items() if n < 0)]
        choices += [f"formation of {g}" for g, n in step.net.items() if n > 0]
        findings.wrong(f"{key}.counts", quoted(column.counts), one_of(choices))
        return None
    order = step.order + (1.0 if step.bath is not None and not step.law.bath_inside else 0.0)
    return Signal(RATE_CONSTANT, step=name, order=order, per=per)


def _counted(step: Step, counts: str) -> float | None:
    if counts == "events":
        return 1.0
    for head, sign in (("loss of ", -1.0), ("formation of ", 1.0)):
        number = step.net.get(counts.removeprefix(head), 0.0) if counts.startswith(head) else 0.0
        if sign * number > 0:
            return abs(number)
    return None
