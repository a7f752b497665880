"""``[[fit.analyses]]`` and ``[fit.order]``: each with the keys that its kind needs."""

from __future__ import annotations

from typing import Final

from meanfree import units
from meanfree.case.findings import Findings, did_you_mean, one_of
from meanfree.case.schema.fit import AnalysisTable, FitTable
from meanfree.experiment.experiment import Experiment
from meanfree.measured.analyses import OrderWanted, Wanted
from meanfree.measured.arrhenius_lines import DIAMETER_FACTOR
from meanfree.measured.orders import USUAL
from meanfree.units import QuantityError
from meanfree.units.gate import quoted

NEEDED: Final[dict[str, tuple[str, ...]]] = {
    "initial rates": ("gas",),
    "pseudo-first-order": ("gas", "partner"),
    "relative rate": ("gas", "reference"),
    "temperature series": ("step",),
    "wall": ("step",),
}
ALLOWED: Final[dict[str, tuple[str, ...]]] = {
    "initial rates": ("until",),
    "pseudo-first-order": ("base_line",),
    "relative rate": ("reference_k", "reference_factor"),
    "temperature series": ("diameter_factor",),
    "wall": (),
}


def wanted_of(table: FitTable, experiment: Experiment, findings: Findings) -> tuple[Wanted, ...]:
    """The further analyses; what is wrong goes to ``findings``."""
    found = []
    for place, one in enumerate(table.analyses or ()):
        key = f"fit.analyses.{place}"
        if one.is_wrong("kind"):
            continue
        before = len(findings.problems)
        _check_keys(one, key, experiment, findings)
        k, unit = _reference_k(one, f"{key}.reference_k", findings)
        if len(findings.problems) == before:
            found.append(_wanted(one, k, unit))
    return tuple(found)


def _wanted(one: AnalysisTable, k: float | None, unit: str) -> Wanted:
    return Wanted(
        one.kind,
        one.gas or "",
        one.partner or "",
        one.reference or "",
        k,
        unit,
        1.0 if one.reference_factor is None else one.reference_factor.value,
        one.step or "",
        None if one.until is None else one.until.value,
        bool(one.base_line),
        DIAMETER_FACTOR if one.diameter_factor is None else one.diameter_factor.value,
    )


def _check_keys(one: AnalysisTable, key: str, experiment: Experiment, findings: Findings) -> None:
    gases, steps = list(experiment.gas_named), [step.name for step in experiment.steps]
    for name in NEEDED[one.kind]:
        value = getattr(one, name)
        known = steps if name == "step" else gases
        if value is None:
            if not one.is_wrong(name):
                findings.wrong(f"{key}.{name}", "nothing", one_of(known))
        elif value not in known:
            what = "step" if name == "step" else "gas"
            hint = one_of(known) + did_you_mean(value, known)
            findings.wrong(f"{key}.{name}", f"{quoted(value)}, no {what} of the case", hint)
    for name in {*one.model_fields_set} - {"kind", *NEEDED[one.kind], *ALLOWED[one.kind]}:
        if name in AnalysisTable.model_fields:
            expected = ", ".join((*NEEDED[one.kind], *ALLOWED[one.kind]))
            findings.wrong(f"{key}.{name}", f'{name} with kind = "{one.kind}"', expected)


def _reference_k(one: AnalysisTable, key: str, findings: Findings) -> tuple[float | None, str]:
    """The reference's rate constant in the unit it is written in."""
    if one.reference_k is None:
        return None, ""
    try:
        words = (units.rate_constant(2), units.rate_constant(1))
        found = units.read_any(one.reference_k, words)
    except QuantityError as error:
        findings.wrong(key, error.found, error.expected)
        return None, ""
    return units.from_si(found.value, found.unit, found.dimension), found.unit


def order_of(table: FitTable, experiment: Experiment, findings: Findings) -> OrderWanted | None:
    """The test of an order, None where none is asked for or something is wrong with it."""
    one = table.order
    if one is None or one.step is None:
        return None
    steps = {step.name: step for step in experiment.steps}
    if one.step not in steps:
        hint = one_of(steps) + did_you_mean(one.step, steps)
        findings.wrong("fit.order.step", f"{quoted(one.step)}, no step of the case", hint)
        return None
    losing = [gas for gas, n in steps[one.step].net.items() if n < 0]
    if one.gas is not None and one.gas not in losing:
        found = f"{quoted(one.gas)}, which {one.step} does not use up"
        findings.wrong("fit.order.gas", found, one_of(losing) if losing else "another step")
        return None
    orders = tuple(order.value for order in one.orders or ())
    return OrderWanted(one.step, one.gas or "", orders or USUAL)
