"""Small experiments built by hand, for tests that need an Experiment and no case file."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Fill, Portion
from meanfree.experiment.mechanism import Bath, Step
from meanfree.experiment.plan import RunPlan, Solver
from meanfree.experiment.temperature import Isothermal, Temperature
from meanfree.experiment.vessel import DeadSpace, Vessel
from meanfree.gases.gas import Gas
from meanfree.rates.fixed import Fixed
from meanfree.rates.law import Law
from meanfree.sourced import Sourced


def si(value: float, dimension: str = "") -> Sourced:
    """A number in SI, as if written so."""
    return Sourced(value, "", "test", dimension)


def side(text: str) -> tuple[tuple[str, float], ...]:
    """One side of a reaction: ``"2 A + B"``."""
    found: dict[str, float] = {}
    for part in filter(None, (p.strip() for p in text.split("+"))):
        number, _, name = part.rpartition(" ")
        found[name] = found.get(name, 0.0) + (float(number) if number else 1.0)
    return tuple(found.items())


def step(reaction: str, law: Law | float, name: str = "", **options: Any) -> Step:
    """A step from ``"2 A -> B + M"``-like text and a law, or a fixed k [SI, per event]."""
    left, right = reaction.split("->")
    bath = options.pop("bath", Bath() if "M" in [w.strip() for w in left.split("+")] else None)
    keep = [[(g, n) for g, n in side(text) if g != "M"] for text in (left, right)]
    law = Fixed(si(law)) if isinstance(law, int | float) else law
    return Step(name or reaction, tuple(keep[0]), tuple(keep[1]), law, bath=bath, **options)


def experiment(
    steps: Sequence[Step],
    fill: Mapping[str, float],
    *,
    kind: str = "concentration",
    holds: str = "volume",
    T: float = 300.0,
    volume: float = 1e-3,
    until: float | None = None,
    temperature: Temperature | None = None,
    gases: Sequence[Gas] | None = None,
    dead: tuple[float, float] | None = None,
    fill_at: float | None = None,
    pressure: float | None = None,
    watch: str | None = None,
    solver: Solver | None = None,
) -> Experiment:
    """An Experiment of labels (or the given gases), everything in SI."""
    if gases is None:
        names = dict.fromkeys([*fill, *(g for s in steps for g in s.net)])
        gases = [Gas.label(name) for name in names]
    return Experiment(
        "a test",
        tuple(gases),
        tuple(steps),
        Vessel(
            holds,  # type: ignore[arg-type]
            si(volume, "volume"),
            pressure=None if pressure is None else si(pressure, "pressure"),
            dead_space=None if dead is None else DeadSpace(si(dead[0]), si(dead[1])),
        ),
        Isothermal(si(T, "temperature")) if temperature is None else temperature,
        Fill(
            {gas: Portion(si(value), kind) for gas, value in fill.items()},  # type: ignore[arg-type]
            at=None if fill_at is None else si(fill_at, "temperature"),
        ),
        RunPlan(None if until is None else si(until, "time"), watch, solver=solver or Solver()),
    )
