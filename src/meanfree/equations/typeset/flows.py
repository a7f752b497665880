"""What is written about matter that leaks, is pumped, comes in or is drawn in samples."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.equations.segments import segments
from meanfree.equations.typeset import names
from meanfree.equations.typeset.steps import RT, Line, valued
from meanfree.equations.typeset.tree import (
    Concentration,
    Fraction,
    Node,
    Number,
    Root,
    Row,
    Symbol,
    Total,
    Unit,
    Words,
    add,
    equals,
    multiply,
    negative,
)
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.flows import Flow
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import has_energy_balance
from meanfree.gases.gas import Gas

ANY = Words("X")
LEAVING = Symbol("q", "flow")
"""Amount that all flows together bring in a time."""

_ALL: Node = Total(Concentration(Symbol("i")))


def _rate(number: int) -> Symbol:
    """k of pumping and dilution, a of effusion, s of a leak-up carry the number of the flow."""
    return Symbol("k", f"f{number}")


def _pinhole(number: int) -> Symbol:
    return Symbol("a", f"f{number}")


def _coming(number: int) -> Symbol:
    return Symbol("s", f"f{number}")


def flow_terms(experiment: Experiment, gas: Gas) -> list[tuple[float, Node]]:
    """What the flows add to the balance of a gas, per volume: (number, what it multiplies)."""
    own = Concentration(names.gas_label(gas))
    found: list[tuple[float, Node]] = []
    for number, flow in enumerate(experiment.flows, start=1):
        if flow.kind == "effusion":
            speed = Symbol("v", names.gas_label(gas))
            found.append((-1.0, multiply(_pinhole(number), speed, own)))
        elif flow.kind != "leak-up":
            found.append((-1.0, multiply(_rate(number), own)))
        share = _share(flow, gas.name)
        if share:
            coming = multiply(_rate(number), _ALL) if flow.kind == "dilution" else _coming(number)
            found.append((share, coming))
    return found


def _share(flow: Flow, gas: str) -> float:
    """The fraction of a gas in what enters, all fractions together being 1."""
    entering = flow.entering or {}
    if gas not in entering:
        return 0.0
    return entering[gas].value / sum(share.value for share in entering.values())


def flow_lines(experiment: Experiment) -> Iterator[Line]:
    """The numbers of every flow and how each gas leaves."""
    for number, flow in enumerate(experiment.flows, start=1):
        source = names.visible(flow.source)
        yield _flow(experiment, flow, number, f"; {source}" if source else "")
    if any(flow.kind == "effusion" for flow in experiment.flows):
        mass = Symbol("m", ANY)
        speed = Root(Fraction(multiply(8, RT), multiply(Symbol("π"), mass)))
        yield Line(equals(Symbol("v", ANY), speed), "equation", "for every gas X of molar mass m")
    if experiment.flows and has_energy_balance(experiment.temperature):
        yield Line(equals(LEAVING, multiply(Symbol("V"), _together(experiment))))


def _flow(experiment: Experiment, flow: Flow, number: int, source: str) -> Line:
    """The number of one flow, with what it does as a remark."""
    if flow.kind == "effusion":
        assert flow.hole is not None
        a = flow.transmission.value * flow.hole.value / (4 * experiment.vessel.volume.value)
        what = f"flow {number}, effusion into vacuum: hole times transmission over 4 V"
        return Line(valued(_pinhole(number), a, names.unit("m^-1")), "number", f"{what}{source}")
    if flow.kind == "leak-up":
        # As the steps of the flow have it: the blank's rise at the temperature of time zero.
        (step,) = flow.steps(experiment.gases, experiment.temperature.initial, number)
        (rate,) = step.law.numbers(experiment.context(step))
        unit = names.unit("mol m^-3 s^-1")
        what = f"flow {number}, leak-up: the rise of the blank over R T at time zero"
        return Line(valued(_coming(number), rate, unit), "number", f"{what}{source}")
    assert flow.rate is not None
    what = "every gas leaves at this rate" + (
        ", and as much of what enters takes its place" if flow.kind == "dilution" else ""
    )
    k = valued(_rate(number), flow.rate.value, names.unit("s^-1"))
    return Line(k, "number", f"flow {number}, {flow.kind}: {what}{source}")


def _together(experiment: Experiment) -> Node:
    """What all flows bring in a time and a volume; dilution takes as much as it brings."""
    terms: list[Node] = []
    each = Concentration(Symbol("i"))
    for number, flow in enumerate(experiment.flows, start=1):
        if flow.kind == "effusion":
            through = Total(multiply(Symbol("v", "i"), each))
            terms.append(negative(multiply(_pinhole(number), through)))
        elif flow.kind == "pumping":
            terms.append(negative(multiply(_rate(number), _ALL)))
        elif flow.kind == "leak-up":
            terms.append(_coming(number))
    return add(*terms)


def sample_lines(experiment: Experiment) -> Iterator[Line]:
    """What each sample leaves of every gas."""
    drawn = {segment.start: segment for segment in segments(experiment, ())}
    for sample in experiment.samples:
        at = names.number_parts(sample.at.value)
        time = at[0] + (f"×10^{at[1]}" if at[1] else "")
        left = drawn[sample.at.value].retained
        yield Line(_left(sample, left), "equation", f"at {time} s, for every gas X")


def _left(sample: Sample, retained: float) -> Node:
    n = Symbol("n", ANY)
    after = multiply(retained, n)
    if retained == 1.0 and sample.volume is not None:
        # The volume of a piston at that time is known only then.
        volume = Row((Number(sample.volume.value), Unit((("m", 3.0),))))
        after = add(n, negative(multiply(volume, Concentration(ANY))))
    return Row((n, "→", after))
