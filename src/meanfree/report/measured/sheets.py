"""The tables of a fit: rows of text for page and screen."""

from __future__ import annotations

from collections.abc import Sequence

from meanfree import units
from meanfree.measured.analyses import Findings
from meanfree.measured.arrhenius_lines import TemperatureSeries
from meanfree.measured.comparison import StepAgainstCollisions
from meanfree.measured.evidence import Candidate
from meanfree.measured.fits import Fit
from meanfree.measured.integrated_lines import in_file
from meanfree.report import wording
from meanfree.report.measured import numbers
from meanfree.report.measured.summarising import counts_of, rate_constants
from meanfree.report.rows import NONE, Sheet


def parameters(fit: Fit) -> Sheet:
    """Every fitted number with standard error and interval."""
    rows = []
    for one in fit.estimates:
        start = wording.given(one.parameter.start, 6)
        rows.append(
            [
                wording.clean(one.parameter.address),
                numbers.estimate(one),
                numbers.limits(one),
                wording.clean(counts_of(fit, one)) or NONE,
                f"{start} {wording.pretty_unit(one.parameter.unit)}".strip(),
            ]
        )
    return Sheet(["Parameter", "Estimate", "95 % interval", "Counts", "Start"], rows, words=(0, 3))


def conventions(fit: Fit) -> Sheet | None:
    """Fitted rate constants counted per event and per gas lost; None where these are one."""
    rows = []
    found = rate_constants(fit)
    per_event = {one.address: one.value for one in found if one.counts == "events"}
    if all(one.value == per_event[one.address] for one in found):
        return None
    for one in found:
        error = one.stderr if one.stderr is not None else float("nan")
        rows.append(
            [
                wording.clean(one.address),
                wording.clean(one.counts),
                numbers.with_error(one.value, error, one.unit),
            ]
        )
    return Sheet(["Rate constant", "Counts", "Value"], rows, words=(0, 1))


def runs(found: Findings) -> Sheet:
    """The runs: what was read, its deviation, and how the residuals behave."""
    rows = []
    for place, run in enumerate(found.plan.request.runs):
        readings = run.readings
        conditions = "; ".join(f"{key} = {value}" for key, value in run.conditions.items())
        deviation, sign = NONE, NONE
        if found.fit is not None:
            sd = found.fit.misfit.deviation(place)
            if readings.signal.is_rate_constant:
                deviation = f"{wording.percent(float(sd.mean()), 2)} of k"
            else:
                deviation = numbers.deviation(float(sd.mean()), readings.unit, readings.dimension)
            deviation += " (estimated)" if readings.sd is None else ""
            test = found.fit.runs_tests[place]
            if test is not None:
                sign = (
                    f"{test.runs} of {test.expected:.1f}, p = {wording.number(test.probability, 2)}"
                )
        rows.append(
            [
                wording.clean(run.name),
                wording.clean(readings.signal.words),
                f"{len(readings)}",
                deviation,
                sign,
                wording.clean(conditions) or "as the case",
            ]
        )
    heading = ["Run", "Signal", "Readings", "Standard deviation", "Runs of sign", "Conditions"]
    return Sheet(heading, rows, words=(0, 1, 5))


def collisions(found: Sequence[StepAgainstCollisions]) -> Sheet | None:
    """Fitted second-order steps against their collision limits; None where there is none."""
    rows = [
        [
            wording.clean(one.step),
            wording.temperature(one.temperature),
            wording.rate(one.k, "L/mol/s", 2.0),
            wording.rate(one.limit.Z, "L/mol/s", 2.0),
            NONE if one.steric is None else numbers.of_interval(one.steric),
            NONE if one.judgement.A_over_Z is None else wording.number(one.judgement.A_over_Z),
            one.judgement.verdict,
        ]
        for one in found
    ]
    heading = ["Step", "T", "k per event", "Z", "P (95 %)", "A over Z", "Verdict"]
    return Sheet(heading, rows, words=(0, 6)) if rows else None


def lines(found: Findings) -> Sheet | None:
    """The textbook's line beside the fit of the signal."""
    if not found.lines:
        return None
    rows = []
    for one, run in zip(found.lines, found.plan.request.runs, strict=True):
        k, error, unit = in_file(one, run)
        rows.append(
            [
                wording.clean(run.name),
                wording.clean(f"{one.ordinate} against t"),
                wording.clean(one.how),
                numbers.with_error(k, error, unit),
                numbers.with_error(k * one.per_event, error * one.per_event, unit),
                f"{one.line.r_squared:.5f}",
            ]
        )
    gas = wording.clean(found.lines[0].gas)
    heading = ["Run", "Line", "Concentration", "k per event", f"k for loss of {gas}", "R²"]
    return Sheet(heading, rows, words=(0, 1, 2))


def _tenths(value: float) -> str:
    """One decimal, in groups of three digits."""
    return f"{value:,.1f}".replace(",", " ").replace("-", "−")


def ranking(candidates: Sequence[Candidate]) -> Sheet:
    """Descriptions of the same readings by AICc."""
    rows = [
        [
            wording.clean(one.name),
            f"{len(one.fit.parameters)}",
            _tenths(one.aicc),
            _tenths(one.difference),
            wording.percent(one.weight, 3),
        ]
        for one in candidates
    ]
    return Sheet(["Description", "Parameters", "AICc", "Above the best", "Weight"], rows)


def series(one: TemperatureSeries, order: float, unit: str) -> Sheet:
    """Energies and factors of a temperature series, with what they mean."""
    A = units.from_si(1.0, unit, units.rate_constant(order))
    rows = [
        ["Ea", numbers.of_interval(one.Ea, 1e-3, "kJ/mol"), "k = A exp(−Ea/RT)"],
        ["A per event", numbers.of_interval(one.A, A, unit), "the same"],
        ["ln A, Ea: correlation", f"{one.correlation:.4f}".replace("-", "−"), "full covariance"],
        [
            f"k at {wording.temperature(one.middle)}",
            wording.number(float(one.k(one.middle)) * A, 4) + f" {wording.pretty_unit(unit)}",
            "where it is known best",
        ],
    ]
    if one.power is not None:
        rows.append(
            ["n", numbers.of_interval(one.power), "A Tⁿ exp(−E/RT), as a test of curvature"]
        )
    centres = one.centres
    if centres is not None:
        factor = f"diameter good to ×÷ {centres.diameter_factor:g}"
        threshold = numbers.of_interval(centres.threshold, 1e-3, "kJ/mol")
        rows += [
            ["E0", threshold, "k = P Z exp(−E0/RT)"],
            ["P", numbers.of_interval(centres.steric), f"the same; {factor}"],
            ["A over Z", numbers.of_interval(centres.a_over_z), f"A / Z at the middle; {factor}"],
        ]
    return Sheet(["Quantity", "Value (95 % interval)", "Of"], rows, words=(0, 2))


def points(one: TemperatureSeries, order: float, unit: str) -> Sheet:
    """k of every run beside that of the line."""
    factor = units.from_si(1.0, unit, units.rate_constant(order))
    rows = []
    for point in one.points:
        line = float(one.k(point.temperature))
        rows.append(
            [
                wording.clean(point.run),
                wording.temperature(point.temperature),
                numbers.with_error(point.k * factor, point.k * point.error * factor),
                wording.number(line * factor, 4),
                wording.percent(point.k / line - 1, 3),
            ]
        )
    shown = wording.pretty_unit(unit)
    heading = ["Run", "T", f"k per event ({shown})", f"of the line ({shown})", "off by"]
    return Sheet(heading, rows, words=(0,))
