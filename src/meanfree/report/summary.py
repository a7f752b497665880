"""What a run answers, gathered into the models of its `summary.json`."""

from __future__ import annotations

from meanfree.errors import ComputationError
from meanfree.experiment.equilibrium import Equilibrium, equilibrium, why_none
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.gauge import first_shown, initial_slope
from meanfree.integrate.run import Run
from meanfree.integrate.verify import Verification
from meanfree.planning.goal import Goal, reach
from meanfree.report.cautions import cautions_about, cautions_of
from meanfree.report.kinetics import RateConstant, rate_constants
from meanfree.report.run_models import (
    Drift,
    EquilibriumAnswer,
    GasAmount,
    GasAnswer,
    ReactionTime,
    RunSummary,
    SolverWork,
    StepAnswer,
    VerificationAnswer,
    VesselAnswer,
)

LEVELS = (0.1, 0.25, 0.5, 0.75, 0.9, 0.99)
"""Conversions whose times every table lists."""


def summarise(
    run: Run,
    *,
    case: str,
    case_sha256: str,
    version: str,
    verification: Verification | None = None,
) -> RunSummary:
    """The summary of a run."""
    experiment = run.experiment
    resting, reason = find_equilibrium(experiment)
    rows = rate_constants(run)
    return RunSummary(
        case=case,
        case_sha256=case_sha256,
        version=version,
        title=experiment.title,
        purpose=experiment.purpose,
        status=run.status.name.lower(),
        message=run.message,
        watched_gas=experiment.watched,
        length_s=float(run.end),
        gases=[_gas_answer(run, gas, resting) for gas in run.consumed],
        vessel=_vessel_answer(run),
        equilibrium=EquilibriumAnswer(
            pressure_Pa=None if resting is None else resting.pressure,
            volume_m3=None if resting is None else resting.volume,
            temperature_K=None if resting is None else resting.temperature,
            why_none=reason or None,
        ),
        amounts=[_amount(run, gas.name, resting) for gas in experiment.gases],
        rate_constants=[_step_answer(row) for row in rows],
        cautions=list(cautions_of(run, rows)),
        notes=_notes(run),
        solver=SolverWork(
            method=run.method,
            rtol=run.rtol,
            steps=run.counters.n_steps,
            nfev=run.counters.nfev,
            njev=run.counters.njev,
            nlu=run.counters.nlu,
        ),
        drift=Drift(
            elements=run.invariants.elements,
            energy=run.invariants.energy,
            volume=run.invariants.volume,
            most_negative=run.invariants.most_negative,
            closed_form=run.invariants.closed_form or None,
            closed_form_difference=run.invariants.closed_form_difference,
        ),
        verification=None if verification is None else _verification(verification),
    )


def _verification(found: Verification) -> VerificationAnswer:
    return VerificationAnswer(
        method=found.method,
        rtol=found.rtol,
        largest_difference=found.difference,
        gas=found.gas,
        time_s=found.time,
    )


def _notes(run: Run) -> list[str]:
    """Notes of the case and of the run, without those that stand among the cautions."""
    cautioned = {
        f"{gas.name}: {caution}" for gas in run.experiment.gases for caution in cautions_about(gas)
    }
    ranges = tuple(f"steps.{step.name}: found from" for step in run.experiment.steps if step.valid)
    notes = dict.fromkeys([*run.experiment.notes, *run.notes])
    return [
        note for note in notes if note.rstrip(".") not in cautioned and not note.startswith(ranges)
    ]


def find_equilibrium(experiment: Experiment) -> tuple[Equilibrium | None, str]:
    """Where the vessel ends, and the reason where that cannot be said."""
    reason = why_none(experiment)
    if reason:
        return None, reason
    try:
        return equilibrium(experiment), ""
    except ComputationError as error:
        return None, str(error)


def _gas_answer(run: Run, gas: str, resting: Equilibrium | None) -> GasAnswer:
    times = {level: run.reaction_time(gas, level) for level in LEVELS}
    filled = float(run.experiment.moles[gas])
    settled = None if resting is None else 1.0 - resting.moles[gas] / filled
    consumed = settled is not None and settled > 0
    return GasAnswer(
        gas=gas,
        time_to_10_percent_s=times[0.1],
        time_to_50_percent_s=times[0.5],
        time_to_90_percent_s=times[0.9],
        reaction_times=[ReactionTime(conversion=x, time_s=t) for x, t in times.items()],
        half_lives_s=[half.duration for half in run.half_lives(gas)],
        filled_mol=filled,
        conversion_at_end=float(run.conversion(gas, run.end)[0]),
        highest_conversion=reach(run, Goal("conversion", gas, 0.5)).most,
        equilibrium_conversion=settled,
        time_to_half_of_equilibrium_s=run.reaction_time(gas, 0.5 * settled)
        if consumed and settled is not None
        else None,
        time_to_90_percent_of_equilibrium_s=run.reaction_time(gas, 0.9 * settled)
        if consumed and settled is not None
        else None,
    )


def _amount(run: Run, gas: str, resting: Equilibrium | None) -> GasAmount:
    i = run.index(gas)
    time, peak = run.peak(gas)
    return GasAmount(
        gas=gas,
        start_mol=float(run.experiment.moles[gas]),
        end_mol=float(run.amounts(run.end)[i, 0]),
        end_mol_per_m3=float(run.concentrations(run.end)[i, 0]),
        end_Pa=float(run.partial_pressures(run.end)[i, 0]),
        peak_mol=peak,
        peak_time_s=time,
        equilibrium_mol=None if resting is None else resting.moles[gas],
    )


def _vessel_answer(run: Run) -> VesselAnswer:
    experiment = run.experiment
    gauge, times = experiment.vessel.gauge_resolution, run.trajectory.times
    p, V, T = run.pressure(times), run.volume(times), run.temperature(times)
    return VesselAnswer(
        filling_pressure_Pa=experiment.fill.pressure(
            experiment.vessel, experiment.temperature.initial
        ),
        initial_pressure_Pa=float(p[0]),
        final_pressure_Pa=float(p[-1]),
        highest_pressure_Pa=float(p.max()),
        initial_volume_m3=float(V[0]),
        final_volume_m3=float(V[-1]),
        initial_temperature_K=float(T[0]),
        final_temperature_K=float(T[-1]),
        lowest_temperature_K=float(T.min()),
        highest_temperature_K=float(T.max()),
        initial_pressure_slope_Pa_per_s=initial_slope(run),
        gauge_resolution_Pa=None if gauge is None else gauge.value,
        gauge_first_shows_it_s=None if gauge is None else first_shown(run, gauge.value),
    )


def _step_answer(row: RateConstant) -> StepAnswer:
    judgement = row.judgement
    return StepAnswer(
        step=row.step,
        reaction=row.reaction,
        law=row.law,
        T_K=row.temperature,
        counts="events",
        k=row.k,
        k_unit=row.unit,
        counts_in_case=row.counts,
        k_in_case=row.in_case,
        k_in_case_unit=row.shown_unit,
        k_by_pressure=row.by_pressure,
        k_by_pressure_unit=row.by_pressure_unit,
        Ea_J_per_mol=row.Ea,
        Z_m3_per_mol_s=None if row.ceiling is None else row.ceiling.Z,
        E0_J_per_mol=None if judgement is None else judgement.threshold,
        steric_factor=None if judgement is None else judgement.steric,
        A_over_Z=None if judgement is None else judgement.A_over_Z,
        verdict=row.verdict,
        source=row.source,
    )
