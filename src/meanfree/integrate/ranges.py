"""Whether a run stayed where its laws and the energies of its gases are known."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.equations.system import System
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.trajectory import Trajectory


def beyond_known_energies(
    experiment: Experiment, system: System, trajectory: Trajectory
) -> Iterator[tuple[str, bool]]:
    """(what is so, is it an error) for each gas whose energies were used beyond their range.

    Only temperatures that follow from an energy balance are looked at; those that are known
    before a run are judged when the case is read. A few kelvin beyond a range are allowed and said.
    """
    if not system.temperature_varies:
        return
    low, high = _span(system, trajectory)
    for gas in experiment.gases:
        known = gas.thermochemistry
        verdict = "inside" if known is None else known.range_problem(low, high)
        if known is None or verdict == "inside":
            continue
        error = verdict == "outside" and not gas.extrapolate
        text = (
            f"the run went from {low:.0f} to {high:.0f} K, but energies of {gas.name} are known "
            f"from {known.low:g} to {known.high:g} K"
        )
        remedy = f"; extrapolate = true under [gases.{gas.name}] allows it"
        yield text + (remedy if error else ""), error


def beyond_laws(
    experiment: Experiment, system: System, trajectory: Trajectory
) -> Iterator[tuple[str, bool]]:
    """The same for rate laws that know where they hold: tables of k, fitted broadenings."""
    if not system.temperature_varies:
        return
    low, high = _span(system, trajectory)
    for step in experiment.steps:
        for text, error in step.law.strains(low, high):
            yield f"steps.{step.name}: {text}", error


def _span(system: System, trajectory: Trajectory) -> tuple[float, float]:
    """Lowest and highest temperature of a run [K]."""
    row = system.temperature_index
    temperatures = [y[row] for stretch in trajectory.stretches for y in stretch.states]
    return float(min(temperatures)), float(max(temperatures))
