"""Cautions: said where they are due, and not where they are not."""

from __future__ import annotations

from dataclasses import replace

import pytest
from small_runs import dimerisation, nitrosyl_chloride

from meanfree.constants import TORR
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.flows import Flow
from meanfree.experiment.samples import Sample
from meanfree.gases.identity import find_gas
from meanfree.integrate.single import integrate
from meanfree.report.cautions import GUIDANCE, assumptions_of, cautions_of, grave_cautions
from meanfree.report.kinetics import rate_constants
from meanfree.sourced import Sourced


def grave_of(experiment: Experiment) -> list[str]:
    run = integrate(experiment)
    return list(grave_cautions(run, rate_constants(run)))


def all_of(experiment: Experiment) -> list[str]:
    run = integrate(experiment)
    return list(cautions_of(run, rate_constants(run)))


def filled(experiment: Experiment, torr: dict[str, float]) -> Experiment:
    """The same experiment with these gases filled as well, read at 296 K."""
    gases = dict(experiment.fill.gases) | {
        name: Portion(Sourced(p * TORR, "torr", dimension="pressure"), "pressure")
        for name, p in torr.items()
    }
    more = tuple(find_gas(name) for name in torr)
    fill = Fill(gases, at=experiment.fill.at)
    return replace(experiment, gases=(*experiment.gases, *more), fill=fill)


@pytest.mark.parametrize(
    ("rated_bar", "said"),
    [
        (0.4, "The pressure reaches 315.9 torr, above the rated 0.4 bar of the vessel."),
        (0.43, "The pressure reaches 315.9 torr, 97.9 % of the rated 0.43 bar."),
        (2.0, None),
    ],
)
def test_pressure_against_the_rating(rated_bar: float, said: str | None) -> None:
    # 300 torr grow to 315.9 torr, that is 0.4212 bar.
    case = nitrosyl_chloride()
    rated = Sourced(rated_bar * 1e5, "bar", dimension="pressure")
    found = grave_of(replace(case, vessel=replace(case.vessel, rated_pressure=rated)))
    assert found == ([] if said is None else [said])


def test_a_gas_that_condenses_at_filling_is_named() -> None:
    # Water at 296 K saturates near 21 torr (any steam table: 2.81 kPa).
    (said,) = grave_of(filled(nitrosyl_chloride(), {"H2O": 60.0}))
    assert said.startswith("H₂O would condense at filling: 60.00 torr of it at 296 K")
    assert grave_of(filled(nitrosyl_chloride(), {"H2O": 15.0})) == []


def test_a_burning_mixture_is_named_and_a_trace_is_not() -> None:
    rich = all_of(filled(nitrosyl_chloride(), {"H2": 100.0, "O2": 50.0}))
    assert any(text.startswith("H₂ filled together with O₂: ") for text in rich)
    trace = all_of(filled(nitrosyl_chloride(), {"H2": 0.1, "O2": 50.0}))
    assert not any("filled together" in text for text in trace)
    assert any(text.startswith("H₂ is flammable: from 4 % to 77 % in air") for text in trace)


def test_what_is_not_known_is_not_called_safe() -> None:
    assert "Dangers of NOCl, Ar: none on record here, which does not say none." in all_of(
        nitrosyl_chloride()
    )


def test_a_suspect_rate_constant_is_grave() -> None:
    case = nitrosyl_chloride()
    step = case.steps[0]
    fast = replace(step.law, A=Sourced(1e12, "L/mol/s", "", "rate constant of order 2"))  # type: ignore[call-arg]
    (said,) = grave_of(replace(case, steps=(replace(step, law=fast),)))
    assert said.startswith("Step decomposition at 480 K is above the limit for its barrier: ")


def test_the_general_caution_always_closes_the_list() -> None:
    for experiment in (nitrosyl_chloride(), dimerisation()):
        assert all_of(experiment)[-1] == GUIDANCE


def test_assumptions_follow_the_experiment() -> None:
    bulb, piston = list(assumptions_of(nitrosyl_chloride())), list(assumptions_of(dimerisation()))
    assert "What was filled was read at 296 K; at time zero all of the gas is at 480 K." in bulb
    assert any("rigid" in text for text in bulb)
    assert any("holds 1.000 bar" in text for text in piston)
    assert "One-way: dimerisation. Nothing brings their products back." in piston


def test_what_flows_and_is_drawn_is_no_tight_vessel() -> None:
    flow = Flow("pumping", rate=Sourced(1e-3, "1/s", dimension="frequency"))
    minute = Sourced(60.0, "min", dimension="time")
    sample = Sample(minute, fraction=Sourced(0.05))
    for case in (nitrosyl_chloride(), dimerisation()):
        said = list(assumptions_of(replace(case, flows=(flow, flow), samples=(sample,))))
        assert not any("tight" in text or "closed" in text for text in said)
        words = "pumping: all gases leave alike, 0.001 1/s"
        assert (
            f"It leaks as stated, which is no conversion, and not otherwise: {words}; {words}."
        ) in said
        assert "Samples leave at once, at the temperature of the gas: 5 % of the gas drawn at " in (
            " ".join(said)
        )
        assert any("tight" in text for text in assumptions_of(case))


def test_exposure_limits_are_readable_numbers() -> None:
    """Ontario: carbon dioxide 30 000 ppm over 15 min."""
    said = " ".join(all_of(filled(nitrosyl_chloride(), {"CO2": 1.0})))
    assert "CO₂ has exposure limits: 30 000 ppm over 15 min, 5 000 ppm over 8 h" in said
