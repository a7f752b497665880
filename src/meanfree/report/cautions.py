"""What a reader should beware of, and what was taken for granted, each in one sentence."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.temperature import Adiabatic, Exchange, Isothermal, Program
from meanfree.gases.gas import Gas
from meanfree.integrate.run import Run, Status
from meanfree.rates.collision import Collision
from meanfree.report import wording
from meanfree.report.flow_words import flow_words, sample_words
from meanfree.report.hazards import condensation_in, dangers_in
from meanfree.report.kinetics import RateConstant

GUIDANCE = (
    "Guidance only: local codes and licensed practice decide what may be done with pressurised, "
    "flammable or toxic gases."
)

ROUNDING = 1e-9
"""A temperature in degrees may come out this far, relatively, beyond the end of a range."""


def grave_cautions(run: Run, rows: Sequence[RateConstant]) -> Iterator[str]:
    """Those that a reader must see before any figure."""
    yield from _of_pressure(run)
    yield from _of_suspects(rows)
    yield from _of_laws(run)
    yield from condensation_in(run)


def cautions_of(run: Run, rows: Sequence[RateConstant]) -> Iterator[str]:
    """Cautions of a run, the gravest first, the general one last."""
    yield from grave_cautions(run, rows)
    yield from _of_orders(run)
    yield from _of_energies(run)
    for gas in run.experiment.gases:
        for caution in cautions_about(gas):
            yield f"{wording.chemical(gas)}: {wording.clean(caution)}."
    yield from dangers_in(run)
    if run.status in (Status.HORIZON, Status.RESTLESS):
        yield (
            f"The run is {run.status.value}; nothing here says where it ends. A time in run.until "
            "ends it where you want it."
        )
    yield GUIDANCE


def cautions_about(gas: Gas) -> tuple[str, ...]:
    """What the tables say about the data of a gas, each once."""
    energies = () if gas.thermochemistry is None else gas.thermochemistry.cautions
    return tuple(dict.fromkeys((*gas.cautions, *energies)))


def _of_pressure(run: Run) -> Iterator[str]:
    rated = run.experiment.vessel.rated_pressure
    if rated is None:
        return
    highest = float(run.pressure(run.trajectory.times).max())
    shown = wording.units_in_use(run.experiment)
    reached, limit = wording.pressure(highest, shown), wording.as_written(rated)
    if highest > rated.value:
        yield f"The pressure reaches {reached}, above the rated {limit} of the vessel."
    elif highest > 0.9 * rated.value:
        share = wording.percent(highest / rated.value)
        yield f"The pressure reaches {reached}, {share} of the rated {limit}."


def _of_suspects(rows: Sequence[RateConstant]) -> Iterator[str]:
    for row in rows:
        if row.judgement is not None and row.judgement.is_suspect:
            name, at = wording.clean(row.step), wording.temperature(row.temperature)
            yield f"Step {name} at {at} is {row.judgement.verdict}."


def _of_orders(run: Run) -> Iterator[str]:
    for step in run.experiment.steps:
        if any(0 <= order < 1 for order in step.orders.values()) and step.reactants:
            yield (
                f"Step {wording.clean(step.name)} has an order below 1: its rate is taken to stop "
                "smoothly where a gas it consumes runs out."
            )


def _of_laws(run: Run) -> Iterator[str]:
    """Steps used outside the range in which their law was found."""
    low, high, span = _span(run)
    for step in run.experiment.steps:
        if step.valid is None:
            continue
        lowest, highest = (limit.value for limit in step.valid)
        if low < lowest * (1 - ROUNDING) or high > highest * (1 + ROUNDING):
            stated = f"{wording.temperature(lowest)} to {wording.temperature(highest)}"
            name = wording.clean(step.name)
            yield f"Step {name} is used at {span}; its source holds for {stated}."


def _of_energies(run: Run) -> Iterator[str]:
    low, high, span = _span(run)
    for gas in run.experiment.gases:
        if gas.thermochemistry is None:
            continue
        if gas.thermochemistry.range_problem(low, high) != "inside":
            stated = (
                f"{wording.temperature(gas.thermochemistry.low)} to "
                f"{wording.temperature(gas.thermochemistry.high)}"
            )
            name = wording.chemical(gas)
            yield f"The energies of {name} are used at {span}; they hold for {stated}."


def _span(run: Run) -> tuple[float, float, str]:
    """Lowest and highest temperature of a run [K], and both in words."""
    T = run.temperature(run.trajectory.times)
    low, high = float(T.min()), float(T.max())
    text = wording.temperature(low)
    return low, high, f"{text} to {wording.temperature(high)}" if high - low > 0.05 else text


def assumptions_of(experiment: Experiment) -> Iterator[str]:
    """What the prediction takes for granted."""
    yield "The gas is ideal, dilute and mixed at all times."
    yield from _of_vessel(experiment)
    yield from _of_temperature(experiment)
    if experiment.fill.at is not None:
        at = wording.temperature(experiment.fill.at.value)
        start = wording.temperature(experiment.temperature.initial)
        yield f"What was filled was read at {at}; at time zero all of the gas is at {start}."
    if any(isinstance(step.law, Collision) for step in experiment.steps):
        yield (
            "Collision rate constants are those of hard spheres that react where the energy along "
            "the line of centres exceeds the threshold; like molecules meet once an encounter."
        )
    reversible = [step for step in experiment.steps if step.reverse is not None]
    if reversible:
        yield "Reverse rate constants are the forward ones over Kc; the standard state is 1 bar."
    one_way = [step for step in experiment.steps if step.reverse is None]
    if one_way:
        names = ", ".join(wording.clean(step.name) for step in one_way)
        yield f"One-way: {names}. Nothing brings their products back."
    if all(step.law.word != "wall" for step in experiment.steps):
        yield "The walls do not react and do not take up gas."


def _of_vessel(experiment: Experiment) -> Iterator[str]:
    vessel = experiment.vessel
    if vessel.is_rigid:
        tight = "rigid" if experiment.flows else "closed, tight and rigid"
        yield f"The vessel is {tight}: its volume does not change."
    else:
        shown = wording.pressure(experiment.held_pressure, wording.units_in_use(experiment))
        tight = "The" if experiment.flows else "The vessel is closed and tight; the"
        yield f"{tight} piston follows at once and holds {shown}."
    if experiment.flows:
        phrases = "; ".join(flow_words(flow, experiment) for flow in experiment.flows)
        yield f"It leaks as stated, which is no conversion, and not otherwise: {phrases}."
    if experiment.samples:
        drawn = "; ".join(sample_words(sample) for sample in experiment.samples)
        yield f"Samples leave at once, at the temperature of the gas: {drawn}."
    if vessel.dead_space is not None:
        volume = wording.as_written(vessel.dead_space.volume)
        at = wording.temperature(vessel.dead_space.temperature.value)
        yield f"The dead space of {volume} at {at} has the vessel's pressure and does not react."


def _of_temperature(experiment: Experiment) -> Iterator[str]:
    mode = experiment.temperature
    at = wording.temperature(mode.initial)
    if isinstance(mode, Isothermal):
        yield f"The gas stays at {at} throughout: heat of reaction leaves at once."
    elif isinstance(mode, Adiabatic):
        yield f"The gas starts at {at} and exchanges no heat with the walls."
    elif isinstance(mode, Exchange):
        surroundings = wording.temperature(mode.surroundings.value)
        yield (
            f"The gas starts at {at} and exchanges {wording.as_written(mode.conductance)} "
            f"with surroundings at {surroundings}."
        )
    elif isinstance(mode, Program):
        yield "The temperature of the gas follows the program exactly, everywhere in the vessel."
