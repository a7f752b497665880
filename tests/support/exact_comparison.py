"""What each solver gives for the mechanisms of `exact_cases`, over its tolerance."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from exact_cases import number, random_mechanism
from laboratory import experiment, si

from meanfree.constants import R
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.experiment.plan import Solver
from meanfree.experiment.temperature import Isothermal
from meanfree.integrate.many import ENDING, many
from meanfree.integrate.observables import At, HalfLife, ReactionTime
from meanfree.integrate.single import integrate
from meanfree.rates.fixed import Fixed
from meanfree.sourced import Sourced

RTOL, ATOL, T = 1e-8, 1e-20, 300.0


@dataclass(frozen=True)
class Errors:
    """Differences over the tolerance: of the amounts at the end, of the times, of p or V.

    The tolerance of a time is what an error of one tolerance in the amount makes of it, and as much
    of the time itself. ``one_sided`` counts times that only one of the two found.
    """

    ends: float
    times: float
    whole: float
    one_sided: int


def experiment_of(seed: int) -> Experiment:
    """Mechanism ``seed`` as the program takes it."""
    plain = random_mechanism(seed)
    steps = [
        Step(
            f"s{j}",
            tuple((f"A{g}", float(n)) for g, n in s.left.items()),
            tuple((f"A{g}", float(n)) for g, n in s.right.items()),
            Fixed(si(float(s.k))),
        )
        for j, s in enumerate(plain.steps)
    ]
    fill = {f"A{i}": float(c) for i, c in enumerate(plain.fill)}
    held = Isothermal(Sourced(T, "K", dimension="temperature"))
    end = float(plain.end)
    return experiment(steps, fill, holds=plain.holds, T=T, temperature=held, until=end)


def found_by(method: str, case: Experiment, events: list[Any]) -> tuple[np.ndarray, Any, Any]:
    """Amounts over V(0), V/V(0) or p/p(0), and the times of the events (NaN: not reached)."""
    names = [gas.name for gas in case.gases]
    V, wanted = case.vessel.volume.value, [(f"A{g}", float(f)) for g, f, *_ in events]
    total = sum(p.quantity.value for p in case.fill.gases.values())
    if method != "kernel":
        run = integrate(case, Solver(method, RTOL, ATOL))  # type: ignore[arg-type]
        times = [run.reaction_time(name, 1 - f) for name, f in wanted]
        whole = run.volume_ratio(run.end)[0]
        if case.vessel.is_rigid:
            whole = run.pressure(run.end)[0] / (total * R * T)
        return run.amounts(run.end)[:, 0] / V, whole, np.array(times, float)
    observables = [HalfLife(name) if f == 0.5 else ReactionTime(name, 1 - f) for name, f in wanted]
    asked = [*(At("amount", name) for name in names), At("volume"), At("total pressure")]
    columns = {"temperature.value": np.array([T])}
    frame = many(case, columns, [*asked, *observables], rtol=RTOL, atol=ATOL, workers=1)
    assert frame[ENDING][0] == "reached the stated time"
    row = [float(frame[o.columns[0]][0]) for o in (*asked, *observables)]
    n = len(names)
    whole = row[n + 1] / (total * R * T) if case.vessel.is_rigid else row[n] / V
    return np.array(row[:n]) / V, whole, np.array(row[n + 2 :])


def errors(method: str, answer: dict[str, Any]) -> Errors:
    """One solver against the integrator without rounding."""
    case, events = experiment_of(answer["seed"]), answer["events"]
    x, whole, times = found_by(method, case, events)
    exact = np.array([number(text) for text in answer["x"]])
    total = sum(p.quantity.value for p in case.fill.gases.values())
    ends = np.abs(x - exact) / (RTOL * exact + ATOL * total)
    expected = number(answer["ratio"])
    if case.vessel.is_rigid:
        expected = exact.sum() / total
    when = np.array([[number(e[2]), number(e[3])] for e in events]).reshape(-1, 2)
    late = np.abs(times - when[:, 0]) / (RTOL * when.sum(axis=1))
    missing = int(np.isnan(times).sum())
    return Errors(
        float(ends.max()),
        float(np.nanmax(late, initial=0.0)),
        abs(whole / expected - 1) / RTOL,
        missing,
    )
