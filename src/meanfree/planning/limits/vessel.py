"""Limits of the vessel, the equation of state and the instrument."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from meanfree.constants import N_A, R
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.fill import Portion
from meanfree.gases.critical import critical_point
from meanfree.integrate.events import first_crossing
from meanfree.integrate.run import Run
from meanfree.planning.limits.limit import PRACTICE, Fact, Limit, Verdict, judged, unknown
from meanfree.planning.request import PlanRequest

RATED_SHARE = 0.9
IDEAL = 0.01
"""Largest |Z - 1| at which a gas still counts as ideal."""

QUANTIFIED = 10.0 / 3.0
"""Limit of quantification over limit of detection: ten against three standard deviations. Source:
L. A. Currie, Pure Appl. Chem. 67, 1699 (1995) (IUPAC; from memory)."""


def vessel_limits(run: Run, request: PlanRequest) -> Iterator[Limit]:
    """Pressures, ideality, detection."""
    yield pressure(run)
    yield ideality(run)
    yield from detection(run, request)


def pressure(run: Run) -> Limit:
    """The highest pressure of filling and run over the rated one."""
    name = "Highest over rated pressure"
    source = "the rating of the vessel, as stated in the case"
    experiment = run.experiment
    p = run.pressure(run.trajectory.times)
    filling = experiment.fill.pressure(experiment.vessel, experiment.temperature.initial)
    facts: tuple[Fact, ...] = (
        Fact("at filling", filling, "pressure"),
        Fact("at time zero", float(p[0]), "pressure"),
        Fact("highest in the run", float(p.max()), "pressure"),
        Fact("at the end", float(p[-1]), "pressure"),
    )
    rated = experiment.vessel.rated_pressure
    if rated is None:
        why = 'Not stated: give rated_pressure = "2 bar", say, under [vessel].'
        return Limit("pressure", name, None, None, Verdict.UNKNOWN, why, source, facts=facts)
    value = max(float(p.max()), filling) / rated.value
    verdict = judged(value, 1.0, near=1 / RATED_SHARE)
    meaning = {
        Verdict.WITHIN: "The vessel holds what the prediction asks of it.",
        Verdict.CAUTION: "The pressure comes close to what the vessel is rated for.",
        Verdict.BEYOND: "The pressure exceeds what the vessel is rated for: fill less.",
    }[verdict]
    facts = (*facts, Fact("rated", rated.value, "pressure"))
    return Limit("pressure", name, value, 1.0, verdict, meaning, source, facts=facts)


def second_virial(T: float, critical_T: float, critical_p: float) -> float:
    """Second virial coefficient of a nonpolar gas [m^3/mol] at T [K].

    B p_c/(R T_c) = 0.083 - 0.422/T_r^1.6, the acentric factor left out. Source: J. M. Smith,
    H. C. Van Ness and M. M. Abbott, Introduction to Chemical Engineering Thermodynamics, 7th ed.
    (2005), eq. 3.65.

    >>> round(second_virial(300.0, 126.2, 34e5) * 1e6, 1)  # N2; measured: -4.5
    -7.0
    """
    reduced = 0.083 - 0.422 / (T / critical_T) ** 1.6
    return float(reduced * R * critical_T / critical_p)


def ideality(run: Run) -> Limit:
    """|Z - 1| by the second virial coefficient of a gas with the mole averages of T_c and p_c."""
    name = "Departure from ideality, |Z − 1|"
    source = (
        "second virial coefficient: Smith, Van Ness and Abbott, 7th ed. (2005), eq. 3.65, with "
        f"mole averages of the critical constants (Kay); guideline: {PRACTICE}"
    )
    T, p = _densest(run)
    shares = run.experiment.mole_fractions
    known = {
        gas.name: point
        for gas in run.experiment.gases
        if shares.get(gas.name, 0.0) > 0 and (point := critical_point(gas)) is not None
    }
    covered = sum(shares[gas] for gas in known)
    if not known or covered < 0.5:
        lacking = [gas for gas, x in shares.items() if x > 0 and gas not in known]
        why = f"The critical constants of {', '.join(lacking)} are not known."
        return unknown("ideality", name, why, source)
    critical_T = sum(shares[gas] * T_c.value for gas, (T_c, _) in known.items()) / covered
    critical_p = sum(shares[gas] * p_c.value for gas, (_, p_c) in known.items()) / covered
    value = abs(second_virial(T, critical_T, critical_p)) * p / (R * T)
    verdict = judged(value, IDEAL)
    meaning = "The gas is dilute enough for the ideal gas law."
    if verdict is not Verdict.WITHIN:
        meaning = "Pressures are off by about this share: the gas is not ideal here."
    facts = (
        Fact("reduced pressure", p / critical_p),
        Fact("reduced temperature", T / critical_T),
        Fact("share of the fill with known critical constants", covered),
    )
    return Limit("ideality", name, value, IDEAL, verdict, meaning, source, facts=facts)


def _densest(run: Run) -> tuple[float, float]:
    """(T, p) where p/T is largest: at filling or in the run."""
    experiment = run.experiment
    initial = experiment.temperature.initial
    times = run.trajectory.times
    T, p = run.temperature(times), run.pressure(times)
    i = int(np.argmax(p / T))
    filling = experiment.fill.temperature(initial)
    pair = (filling, experiment.fill.pressure(experiment.vessel, initial))
    return max([pair, (float(T[i]), float(p[i]))], key=lambda state: state[1] / state[0])


def least_concentration(portion: Portion, experiment: Experiment) -> float:
    """A detection limit as a concentration [mol/m^3], at the state of time zero."""
    value, T = portion.quantity.value, experiment.temperature.initial
    by_kind = {
        "pressure": value / (R * T),
        "concentration": value,
        "number density": value / N_A,
        "fraction": value * experiment.initial_pressure / (R * T),
        "amount": value / experiment.initial_volume,
    }
    return float(by_kind[portion.kind])


def detection(run: Run, request: PlanRequest) -> Iterator[Limit]:
    """Each gas with a stated detection limit: the most there is of it over that limit."""
    source = f"Currie, Pure Appl. Chem. 67, 1699 (1995) (from memory), else {PRACTICE}"
    if not request.detection:
        why = 'Not stated: give detection = { NOCl = "0.5 torr" }, say, under [plan].'
        yield unknown("detection", "Detection limits", why, source)
    times = run.trajectory.times
    for gas, portion in request.detection.items():
        i = run.index(gas)
        limit = least_concentration(portion, run.experiment)
        c = run.concentrations(times)[i]

        def there(t: np.ndarray, i: int = i) -> np.ndarray:
            return np.asarray(run.concentrations(t)[i])

        value = float(c.max()) / limit
        verdict = judged(value, QUANTIFIED, above=True)
        rising = c[0] < limit
        crossed = first_crossing(run.trajectory, there, limit)
        facts = [Fact("detection limit", limit, "concentration")]
        if crossed is not None and crossed > 0:
            facts.append(Fact("first seen at" if rising else "lost at", crossed, "time"))
        if verdict is Verdict.BEYOND and value < 1:
            meaning = "Never enough of it to be seen."
        elif verdict is Verdict.BEYOND:
            meaning = "Seen at its most, but never enough to be measured well."
        elif rising:
            meaning = "Enough of it to be measured once it has formed."
        else:
            meaning = "Enough of it to be measured."
        yield Limit(
            f"detection.{gas}",
            f"{gas} over its detection limit",
            value,
            QUANTIFIED,
            verdict,
            meaning,
            source,
            above=True,
            facts=tuple(facts),
        )
