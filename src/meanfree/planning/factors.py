"""The numbers that scale a rate constant: what a factor on k means in addresses."""

from __future__ import annotations

from dataclasses import replace

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs, with_inputs
from meanfree.experiment.mechanism import Step
from meanfree.rates.collision import Collision
from meanfree.sourced import Sourced

_SCALES = ("rate constant", "area")
_NAMES = ("steric", "A_over_Z", "J")


def factored(experiment: Experiment) -> Experiment:
    """The same experiment with a steric factor of 1 written out where a collision step has none."""
    steps = tuple(
        replace(step, law=replace(step.law, steric=Sourced(1.0, dimension="pure")))
        if isinstance(step.law, Collision) and step.law.steric is None and step.law.A_over_Z is None
        else step
        for step in experiment.steps
    )
    return replace(experiment, steps=steps)


def factor_addresses(experiment: Experiment, step: Step) -> tuple[str, ...]:
    """Addresses that, all multiplied by one factor, multiply k of a step by it; () if none do.

    One number where one will do (A, k, a steric factor), else all that have the dimension of a
    rate constant (both limits of a falloff step, the points of a table). Each choice is tried.
    """
    prefix = f"steps.{step.name}."
    candidates = [
        address
        for address, known in inputs(experiment).items()
        if address.startswith(prefix)
        and (known.quantity.dimension.startswith(_SCALES) or address.removeprefix(prefix) in _NAMES)
        and known.value != 0
    ]
    for choice in (*((address,) for address in candidates), tuple(candidates)):
        if choice and _doubles(experiment, step, choice):
            return choice
    return ()


def _doubles(experiment: Experiment, step: Step, addresses: tuple[str, ...]) -> bool:
    known = inputs(experiment)
    changed = with_inputs(experiment, {a: 2.0 * known[a].value for a in addresses})
    place = experiment.steps.index(step)
    T, p = experiment.temperature.initial, experiment.initial_pressure
    before, after = (
        float(e.steps[place].law.rate_constant(e.context(e.steps[place]), T, p, 1.0))
        for e in (experiment, changed)
    )
    return before > 0 and abs(after / (2.0 * before) - 1.0) < 1e-9


def scaled(experiment: Experiment, step: Step, factor: float) -> Experiment | None:
    """The experiment with k of one step times a factor; None where no number does that."""
    known = inputs(experiment)
    addresses = factor_addresses(experiment, step)
    if not addresses:
        return None
    return with_inputs(experiment, {a: factor * known[a].value for a in addresses})
