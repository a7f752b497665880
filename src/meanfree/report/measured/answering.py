"""The short answer of a fit: each number with its error, and what it means, in a line."""

from __future__ import annotations

from collections.abc import Sequence

from meanfree.measured.analyses import Findings
from meanfree.measured.evidence import Candidate, evidence
from meanfree.measured.fits import Fit
from meanfree.measured.orders import in_words
from meanfree.report import wording
from meanfree.report.measured import numbers
from meanfree.report.measured.summarising import (
    collisions,
    counts_of,
    order_of_step,
    rate_constants,
)
from meanfree.report.planning.naming import in_words as address_words
from meanfree.report.planning.naming import with_formulas
from meanfree.report.rows import Answer

SHOWN = 12


def answers(found: Findings, ranking: Sequence[Candidate]) -> tuple[Answer, ...]:
    """What was asked, answered."""
    said: list[Answer] = []
    if found.fit is not None:
        said += _parameters(found.fit)
        said += [] if found.series else _collisions(found.fit)
        said.append(_quality(found.fit))
    if found.order is not None:
        experiment = found.plan.request.runs[0].experiment
        said.append(Answer("Which order", with_formulas(in_words(found.order), experiment)))
    if ranking:
        said.append(Answer("Which description", wording.clean(evidence(ranking))))
    said += _series(found)
    for wall in found.walls:
        name = wording.clean(wall.step)
        said.append(Answer(f"{name} in the gas", numbers.of_interval(wall.gas, 1.0, "1/s")))
        said.append(Answer(f"Walls in {name}", wall.words))
    for pseudo in found.pseudo:
        slope = numbers.of_interval(pseudo.slope, 1e3, "L/mol/s")
        name = f"k of {wording.clean(pseudo.gas)} with {wording.clean(pseudo.partner)}"
        said.append(Answer(name, slope, f"for loss of {wording.clean(pseudo.gas)}"))
    for wanted, relative in found.relative:
        name = f"k({wording.clean(relative.gas)})/k({wording.clean(relative.reference)})"
        note = ""
        if relative.k is not None:
            note = f"k = {numbers.of_interval(relative.k, 1.0, wanted.reference_unit)}"
        said.append(Answer(name, numbers.of_interval(relative.ratio), note))
    for initial in found.initial:
        said.append(Answer(f"Order in {wording.clean(initial.gas)}", initial.words[0]))
    return tuple(said)


def _parameters(fit: Fit) -> list[Answer]:
    said = []
    per_event = {one.address: one for one in rate_constants(fit) if one.counts == "events"}
    losses = {one.address: one for one in rate_constants(fit) if one.counts.startswith("loss")}
    for one in fit.estimates[:SHOWN]:
        name = one.parameter.address
        counts = counts_of(fit, one)
        note = f"95 %: {numbers.limits(one)}"
        if counts:
            how = "per event" if counts == "events" else f"for {counts}"
            note += f"; {wording.clean(how)}"
            other = losses.get(name) if counts == "events" else per_event.get(name)
            if other is not None and abs(other.value / one.value - 1) > 1e-9:
                what = "per event" if other.counts == "events" else f"for {other.counts}"
                value = numbers.with_error(other.value, other.stderr or float("nan"), other.unit)
                note += f"; {value} {wording.clean(what)}"
        words = address_words(name, fit.request.runs[0].experiment)
        said.append(Answer(words, numbers.estimate(one), note))
    if len(fit.estimates) > SHOWN:
        said.append(Answer("More", f"{len(fit.estimates) - SHOWN} more in the table"))
    return said


def _collisions(fit: Fit) -> list[Answer]:
    said = []
    for one in collisions(fit)[:3]:
        steric = "" if one.steric is None else f"P = {numbers.of_interval(one.steric)}"
        at = wording.temperature(one.temperature)
        name = f"Against collisions ({wording.clean(one.step)}, {at})"
        said.append(Answer(name, one.judgement.verdict, steric))
    return said


def _quality(fit: Fit) -> Answer:
    runs, readings = len(fit.request.runs), fit.misfit.n_readings
    what = f"{readings} readings of {runs} run{'' if runs == 1 else 's'}"
    if fit.deviations_estimated:
        parts = []
        for kind, value in fit.misfit.estimates.items():
            own = [
                run.readings
                for run, group in zip(fit.request.runs, fit.misfit.groups, strict=True)
                if group == kind
            ]
            if own and own[0].signal.is_rate_constant:
                parts.append(f"{wording.percent(value, 2)} of k")
            elif own:
                parts.append(numbers.deviation(value, own[0].unit, own[0].dimension))
        return Answer("Scatter", " and ".join(parts), f"estimated from {what}")
    reduced = wording.number(fit.reduced_chi_square, 3)
    return Answer("Reduced chi-square", reduced, f"{what}, {fit.freedom} degrees of freedom")


def _series(found: Findings) -> list[Answer]:
    said = []
    for one in found.series:
        name = wording.clean(one.step)
        Ea = numbers.of_interval(one.Ea, 1e-3, "kJ/mol")
        order = order_of_step(found, one.step)
        said.append(Answer(f"Ea of {name}", Ea, f"from {len(one.points)} rate constants"))
        if one.centres is not None and order == 2:
            P = numbers.of_interval(one.centres.steric)
            E0 = numbers.of_interval(one.centres.threshold, 1e-3, "kJ/mol")
            said.append(Answer(f"P of {name}", P, f"with E0 = {E0}"))
    return said
