"""From what was found to the records of `summary.json`."""

from __future__ import annotations

import math
from collections.abc import Sequence

from meanfree import units
from meanfree.experiment.mechanism import Step
from meanfree.measured.analyses import Findings
from meanfree.measured.arrhenius_lines import TemperatureSeries
from meanfree.measured.comparison import StepAgainstCollisions, against_collisions
from meanfree.measured.evidence import Candidate, aicc
from meanfree.measured.fits import Estimate, Fit
from meanfree.measured.integrated_lines import in_file
from meanfree.measured.orders import OrderTest, in_words
from meanfree.measured.straight_lines import Interval
from meanfree.report.measured import models
from meanfree.report.measured.numbers import finite
from meanfree.report.record import CaseRecord


def summarise(
    found: Findings, record: CaseRecord, title: str, ranking: Sequence[Candidate] = ()
) -> models.FitSummary:
    """The summary of a fit with its further analyses."""
    fit = found.fit
    given = fit is not None and not fit.deviations_estimated
    return models.FitSummary(
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        title=title,
        parameters={} if fit is None else _parameters(fit),
        correlations={} if fit is None else _correlations(fit),
        rate_constants=[] if fit is None else rate_constants(fit),
        readings=sum(len(run.readings) for run in found.plan.request.runs),
        degrees_of_freedom=0 if fit is None else fit.freedom,
        chi_square=finite(fit.chi_square) if fit is not None and given else None,
        reduced_chi_square=finite(fit.reduced_chi_square) if fit is not None and given else None,
        aicc=None if fit is None else finite(aicc(fit)),
        runs=_runs(found),
        against_collisions=[] if fit is None else [_collision(one) for one in collisions(fit)],
        lines=_lines(found),
        order=None if found.order is None else _order(found.order),
        ranking=[_candidate(one) for one in ranking],
        temperature_series=[_series(found, one) for one in found.series],
        walls=[
            models.WallAnswer(
                step=one.step,
                k_gas_per_s=_interval(one.gas),
                wall_m_per_s=_interval(one.wall),
                wall_share=dict(zip(one.runs, one.shares, strict=True)),
                probability=one.probability,
                words=one.words,
            )
            for one in found.walls
        ],
        pseudo_first_order=[
            models.PseudoAnswer(
                gas=one.gas,
                partner=one.partner,
                k_loss_m3_per_mol_s=_interval(one.slope),
                k_per_event_m3_per_mol_s=_interval(one.slope, 1 / one.per_event),
                intercept_per_s=_interval(one.intercept),
                words=list(one.words),
            )
            for one in found.pseudo
        ],
        relative_rates=[
            models.RelativeAnswer(
                gas=one.gas,
                reference=one.reference,
                ratio=_interval(one.ratio),
                k=None if one.k is None else _interval(one.k),
                k_unit=wanted.reference_unit or None,
                words=list(one.words),
            )
            for wanted, one in found.relative
        ],
        initial_rates=[
            models.InitialAnswer(gas=one.gas, order=_interval(one.order), words=list(one.words))
            for one in found.initial
        ],
        findings=[*(() if fit is None else fit.findings), *found.notes],
        evaluations=0 if fit is None else fit.solution.evaluations,
    )


def _parameters(fit: Fit) -> dict[str, models.ParameterAnswer]:
    return {one.parameter.address: _parameter(fit, one) for one in fit.estimates}


def counts_of(fit: Fit, one: Estimate) -> str:
    """What a fitted rate constant counts; empty for other numbers."""
    step = step_of(fit, one)
    return "" if step is None else step.counts


def step_of(fit: Fit, one: Estimate) -> Step | None:
    """The step whose counted number an estimate is, None where it is none."""
    for step in fit.request.runs[one.parameter.runs[0]].experiment.steps:
        if step.law.counted and one.parameter.key == f"steps.{step.name}.{step.law.counted}":
            return step
    return None


def _parameter(fit: Fit, one: Estimate) -> models.ParameterAnswer:
    return models.ParameterAnswer(
        value=one.value,
        unit=one.parameter.unit,
        counts=counts_of(fit, one),
        stderr=finite(one.stderr),
        low=finite(one.low),
        high=finite(one.high),
        at_bound=one.at_bound,
        interval_from="standard error" if one.profile is None else "profile likelihood",
    )


def _correlations(fit: Fit) -> dict[str, dict[str, float | None]]:
    names = [parameter.address for parameter in fit.parameters]
    return {
        name: {other: finite(float(fit.correlation[i, j])) for j, other in enumerate(names)}
        for i, name in enumerate(names)
    }


def rate_constants(fit: Fit) -> list[models.CountedConstant]:
    """Every fitted rate constant per event and for the loss of each gas that counts otherwise."""
    found = []
    for one in fit.estimates:
        step = step_of(fit, one)
        if step is None:
            continue
        ways = {"events": 1.0}
        ways |= {f"loss of {gas}": -n for gas, n in step.net.items() if n < 0}
        for counts, number in ways.items():
            factor = number / one.parameter.per
            found.append(
                models.CountedConstant(
                    address=one.parameter.address,
                    counts=counts,
                    value=one.value * factor,
                    stderr=finite(one.stderr * factor),
                    low=finite(one.low * factor),
                    high=finite(one.high * factor),
                    unit=one.parameter.unit,
                )
            )
    return found


def collisions(fit: Fit) -> tuple[StepAgainstCollisions, ...]:
    """Second-order steps with a fitted number, against their collision limits, in each run."""
    touched = {one.parameter.key.rpartition(".")[0] for one in fit.estimates}
    found: dict[tuple[str, float], StepAgainstCollisions] = {}
    for place, run in enumerate(fit.request.runs):
        if run.readings.signal.is_rate_constant:
            continue
        for one in against_collisions(fit, place):
            if f"steps.{one.step}" in touched:
                found.setdefault((one.step, round(one.temperature, 3)), one)
    return tuple(found.values())


def _collision(one: StepAgainstCollisions) -> models.CollisionAnswer:
    return models.CollisionAnswer(
        step=one.step,
        T_K=one.temperature,
        k_m3_per_mol_s=one.k,
        Z_m3_per_mol_s=one.limit.Z,
        k_over_Z=one.k / one.limit.Z,
        E0_J_per_mol=one.judgement.threshold,
        steric_factor=None if one.steric is None else _interval(one.steric),
        A_over_Z=one.judgement.A_over_Z,
        verdict=one.judgement.verdict,
    )


def _interval(one: Interval, factor: float = 1.0) -> models.IntervalAnswer:
    return models.IntervalAnswer(
        value=one.value * factor,
        stderr=finite(one.error * factor),
        low=finite(one.low * factor),
        high=finite(one.high * factor),
    )


def _runs(found: Findings) -> list[models.RunAnswer]:
    answers = []
    for place, run in enumerate(found.plan.request.runs):
        readings = run.readings
        test = None if found.fit is None else found.fit.runs_tests[place]
        sd = None
        if found.fit is not None and not readings.signal.is_rate_constant:
            deviation = found.fit.misfit.deviation(place)
            if float(deviation.min()) == float(deviation.max()):
                zero = units.from_si(0.0, readings.unit, readings.dimension)
                sd = readings.in_unit(float(deviation[0])) - zero
        answers.append(
            models.RunAnswer(
                name=run.name,
                file=readings.file,
                signal=readings.signal.words,
                unit=readings.unit,
                readings=len(readings),
                conditions=dict(run.conditions),
                sd=sd,
                sd_estimated=readings.sd is None,
                runs_of_sign=None if test is None else test.runs,
                runs_expected=None if test is None else test.expected,
                runs_probability=None if test is None else test.probability,
            )
        )
    return answers


def _lines(found: Findings) -> list[models.LineAnswer]:
    answers = []
    for one, run in zip(found.lines, found.plan.request.runs, strict=bool(found.lines)):
        k, error, unit = in_file(one, run)
        answers.append(
            models.LineAnswer(
                run=one.run,
                ordinate=one.ordinate,
                concentration_from=one.how,
                k_per_event=k,
                k_loss=k * one.per_event,
                loss_of=one.gas,
                stderr_per_event=error,
                unit=unit,
                r_squared=one.line.r_squared,
            )
        )
    return answers


def _order(one: OrderTest) -> models.OrderAnswer:
    return models.OrderAnswer(
        step=one.step,
        gas=one.gas,
        order=one.order,
        stderr=finite(one.error),
        low=finite(one.low),
        high=finite(one.high),
        candidates=[_candidate(candidate) for candidate in one.candidates],
        words=[text for text in (in_words(one), one.words) if text],
    )


def _candidate(one: Candidate) -> models.CandidateAnswer:
    return models.CandidateAnswer(
        name=one.name, aicc=finite(one.aicc), difference=one.difference, weight=one.weight
    )


def order_of_step(found: Findings, name: str) -> float:
    """Overall order of a step, M counted where its law does not."""
    experiment = found.plan.request.runs[0].experiment
    step = next(one for one in experiment.steps if one.name == name)
    return step.order + (1.0 if step.bath is not None and not step.law.bath_inside else 0.0)


def _series(found: Findings, one: TemperatureSeries) -> models.SeriesAnswer:
    centres = one.centres
    return models.SeriesAnswer(
        step=one.step,
        k_unit=units.si_unit(units.rate_constant(order_of_step(found, one.step))),
        points=[
            models.PointAnswer(
                run=point.run,
                T_K=point.temperature,
                k_SI=point.k,
                stderr_ln_k=None if math.isnan(point.error) else point.error,
            )
            for point in one.points
        ],
        middle_temperature_K=one.middle,
        Ea_J_per_mol=_interval(one.Ea),
        A_SI=_interval(one.A),
        ln_A=_interval(one.ln_A),
        correlation_ln_A_Ea=one.correlation,
        curvature_probability=one.curvature_probability,
        power_n=None if one.power is None else _interval(one.power),
        E0_J_per_mol=None if centres is None else _interval(centres.threshold),
        steric_factor=None if centres is None else _interval(centres.steric),
        A_over_Z=None if centres is None else _interval(centres.a_over_z),
        diameter_factor=None if centres is None else centres.diameter_factor,
        words=list(one.words),
    )
