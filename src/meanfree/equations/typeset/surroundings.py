"""What is written about the vessel and the temperature."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import pairwise

from meanfree.equations.typeset import names
from meanfree.equations.typeset.flows import LEAVING
from meanfree.equations.typeset.steps import RT, Line, StepWriter, T, valued
from meanfree.equations.typeset.tree import (
    Cases,
    Derivative,
    Fraction,
    Node,
    Number,
    Relation,
    Row,
    Symbol,
    Total,
    Words,
    add,
    equals,
    multiply,
    negative,
)
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.temperature import Exchange, Isothermal, Program

MOST_STEPS = 6
"""Steps whose heats are spelled out in the energy balance; of more, a sum stands there."""

MOST_POINTS = 12

p, V, n = Symbol("p"), Symbol("V"), Total(Symbol("n", "i"))
DEAD = Fraction(Symbol("V", "d"), Symbol("T", "d"))


def vessel_lines(experiment: Experiment) -> Iterator[Line]:
    """The pressure of a rigid vessel, or the volume of a piston."""
    vessel = experiment.vessel
    dead = vessel.dead_space
    if vessel.is_rigid:
        if dead is None:
            yield Line(equals(p, Fraction(multiply(RT, n), V)), "equation", "the volume is held")
        else:
            room = add(Fraction(V, T), DEAD)
            yield Line(
                equals(p, Fraction(multiply(Symbol("R"), n), room)),
                "equation",
                "the volume is held",
            )
    else:
        state = Fraction(RT, p)
        volume = add(multiply(state, n), *([] if dead is None else [negative(multiply(T, DEAD))]))
        yield Line(equals(V, volume), "equation", "the pressure is held")
        flow = multiply(state, Total(Derivative(Symbol("n", "i"))))
        growth = multiply(Fraction(V, T), Derivative(T))
        constant = isinstance(experiment.temperature, Isothermal)
        yield Line(equals(Derivative(V), add(flow, *([] if constant else [growth]))))
    remark = "" if vessel.is_rigid else "at time zero"
    yield Line(valued(V, experiment.initial_volume, names.unit("m^3")), "number", remark)
    if not vessel.is_rigid:
        yield Line(valued(p, experiment.held_pressure, names.unit("Pa")), "number")
    if dead is not None:
        unit = names.unit("m^3")
        yield Line(valued(Symbol("V", "d"), dead.volume.value, unit), "number", "dead space")
        unit = names.unit("K")
        yield Line(valued(Symbol("T", "d"), dead.temperature.value, unit), "number", "dead space")


def temperature_lines(experiment: Experiment, writers: Sequence[StepWriter]) -> Iterator[Line]:
    """A held value, a program, or the energy balance."""
    mode = experiment.temperature
    if isinstance(mode, Isothermal):
        yield Line(valued(T, mode.value.value, names.unit("K")), "number", "held")
        return
    if isinstance(mode, Program):
        yield from _program(mode)
        return
    yield _energy_balance(experiment, writers)
    capacity, letter = ("V", "U") if experiment.vessel.is_rigid else ("p", "H")
    if experiment.vessel.is_rigid:
        Cv, Cp = Symbol("C", "V,i"), Symbol("C", "p,i")
        yield Line(equals(Cv, add(Cp, negative(Symbol("R")))))
    remark = f"C_{capacity},i and Δ{letter} at the temperature of the gas"
    yield Line(valued(T, mode.initial, names.unit("K")), "number", f"at time zero; {remark}")
    if isinstance(mode, Exchange):
        G, Ts = Symbol("G"), Symbol("T", "s")
        yield Line(valued(G, mode.conductance.value, names.unit("W K^-1")), "number", "conductance")
        unit = names.unit("K")
        yield Line(valued(Ts, mode.surroundings.value, unit), "number", "surroundings")
        if mode.wall_heat_capacity is not None:
            unit = names.unit("J K^-1")
            wall = valued(Symbol("C", "w"), mode.wall_heat_capacity.value, unit)
            yield Line(wall, "number", "wall, at the temperature of the gas")


def _energy_balance(experiment: Experiment, writers: Sequence[StepWriter]) -> Line:
    """(sum n C + C_w) dT/dt = -V sum r dU + G (T_s - T)."""
    rigid, mode = experiment.vessel.is_rigid, experiment.temperature
    heat = "ΔU" if rigid else "ΔH"
    capacity: Node = Total(multiply(Symbol("n", "i"), Symbol("C", "V,i" if rigid else "p,i")))
    terms: list[Node] = []
    if isinstance(mode, Exchange) and mode.wall_heat_capacity is not None:
        capacity = add(capacity, Symbol("C", "w"))
    if len(writers) <= MOST_STEPS:
        for writer in writers:
            rate = add(*(multiply(sign, symbol) for sign, symbol in writer.rate_symbols()))
            terms.append(multiply(rate, Symbol(heat, str(writer.number))))
        released: Node = add(*terms)
    else:
        released = Total(multiply(Symbol("r", "j"), Symbol(heat, "j")), "j")
    right = negative(multiply(V, released))
    if experiment.flows and rigid:
        right = add(right, multiply(RT, LEAVING))
    if isinstance(mode, Exchange):
        flow = multiply(Symbol("G"), add(Symbol("T", "s"), negative(T)))
        right = add(right, flow)
    remark = "" if len(writers) <= MOST_STEPS else "r_j forward minus reverse"
    return Line(equals(multiply(capacity, Derivative(T)), right), "equation", remark)


def _program(mode: Program) -> Iterator[Line]:
    """The temperature in pieces."""
    points = [(time.value, temperature.value) for time, temperature in mode.points]
    t = Symbol("t")
    rows: list[tuple[Node, Node]] = []
    seconds, kelvin = names.unit("s"), names.unit("K")
    rate = names.unit("K s^-1")
    for (t0, T0), (t1, T1) in pairwise(points):
        since: Node = t if t0 == 0 else add(t, negative(Row((Number(t0), seconds))))
        slope = (T1 - T0) / (t1 - t0)
        value: Node = Row((Number(T0), kelvin))
        if slope:
            span: tuple[Node | str, ...] = (since,) if t0 == 0 else ("(", since, ")")
            sign = "−" if slope < 0 else "+"
            value = Row((value, sign, Row((Number(abs(slope)), rate)), *span))
        until = Relation(t, (Row((Number(t1), seconds)),), "<")
        rows.append((value, until))
    rows.append((Row((Number(points[-1][1]), kelvin)), Words("after that")))
    if len(rows) > MOST_POINTS:
        remark = f"the first {MOST_POINTS} of {len(rows)} pieces"
        yield Line(equals(T, Cases(tuple(rows[:MOST_POINTS]))), "equation", remark)
        return
    yield Line(equals(T, Cases(tuple(rows))))
