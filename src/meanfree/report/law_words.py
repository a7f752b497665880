"""What a step says beside its numbers: the form of its law, its bath, its heat, its range."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import fields

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.rates.falloff import Falloff
from meanfree.rates.limits import StrongCollisions
from meanfree.rates.wall import Wall
from meanfree.report import wording


def choices(step: Step, experiment: Experiment) -> list[str]:
    """What a law was told in words: ``shape points``, ``beyond constant``, ``form exact``."""
    law = step.law
    if isinstance(law, Wall):
        return [f"form {law.form_in_use(experiment.context(step))}"]
    found = []
    for field in fields(law):  # type: ignore[arg-type]
        value = getattr(law, field.name)
        if isinstance(value, str):
            found.append(f"{field.name} {wording.clean(value)}")
        elif value is True:
            found.append(field.name)
    if isinstance(law, Falloff) and isinstance(law.k0, StrongCollisions):
        found.append(f"k0 by strong collisions with {wording.clean(law.k0.partner)}")
    return found


def conditions(step: Step, experiment: Experiment) -> Iterator[str]:
    """Bath, heat, light, certainty and range of a step, each as a phrase."""
    bath = step.bath
    if bath is not None and (bath.efficiencies or bath.others != 1):
        each = [
            f"{wording.given(weight)} for {wording.chemical(experiment.gas_named[gas])}"
            for gas, weight in bath.efficiencies.items()
            if gas in experiment.gas_named
        ]
        yield f"M counts {', '.join([*each, f'{wording.given(bath.others)} for all others'])}"
    if step.heat is not None:
        yield f"releases {wording.as_written(step.heat)}"
    if step.photon is not None:
        yield f"takes in light of {wording.as_written(step.photon)}"
    if step.uncertainty is not None:
        sure = step.uncertainty
        sigmas = "standard deviation" if sure.sigmas == 1 else "standard deviations"
        factor = wording.given(sure.factor)
        yield f"k good to ×/÷ {factor} at {wording.given(sure.sigmas)} {sigmas}"
    if step.valid is not None:
        low, high = (wording.temperature(limit.value) for limit in step.valid)
        yield f"found from {low} to {high}"
