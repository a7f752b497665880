"""An Experiment becomes a System: text-like records turn into index arrays and numbers."""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import lru_cache

import numpy as np
from numpy.polynomial.chebyshev import chebder

from meanfree.constants import STANDARD_PRESSURE, R
from meanfree.equations.segments import segments
from meanfree.equations.system import (
    Floats,
    LawBlock,
    Reverses,
    Rows,
    System,
    Thermal,
)
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import Exchange, Program, has_energy_balance
from meanfree.gases.thermochemistry import Thermochemistry
from meanfree.rates.law import StepContext, Template

REVERSE_SUFFIX = " (reverse)"


def build_system(experiment: Experiment) -> System:
    """The equations of an experiment as one inert description."""
    gases = tuple(gas.name for gas in experiment.gases)
    place = {name: i for i, name in enumerate(gases)}
    ways = one_way_steps([*experiment.steps, *experiment.flow_steps])
    bath, baths, others = _baths(ways, place)
    series = tuple(gas.thermochemistry for gas in experiment.gases)
    energy = has_energy_balance(experiment.temperature)
    volume = experiment.initial_volume
    mode = experiment.temperature
    exchange = mode if isinstance(mode, Exchange) else None
    wall = exchange.wall_heat_capacity if exchange is not None else None
    return System(
        gases=gases,
        steps=tuple(name for name, _, _ in ways),
        net=Rows.of([_net_row(step, back, place) for _, step, back in ways]),
        orders=Rows.of([_order_row(step, back, place) for _, step, back in ways]),
        guards=Rows.of([_guard_row(step, back, place) for _, step, back in ways]),
        blocks=_law_blocks(experiment, ways),
        reverses=_reverses(ways),
        bath=bath,
        baths=baths,
        others=others,
        bath_inside=np.array([step.law.bath_inside for _, step, _ in ways], bool),
        heat_given=_heats(ways),
        photon=np.array([0.0 if s.photon is None else s.photon.value for _, s, _ in ways]),
        open_steps=np.array([j for j, (_, s, _) in enumerate(ways) if is_open(s)], np.intp),
        thermal=_thermal(series) if energy or _needs_gibbs(experiment) else None,
        holds=experiment.vessel.holds,
        mode="energy" if energy else "program" if isinstance(mode, Program) else "isothermal",
        initial_volume=volume,
        held_pressure=0.0 if experiment.vessel.is_rigid else experiment.held_pressure,
        dead=experiment.dead_capacity / volume,
        exchange=0.0 if exchange is None else exchange.conductance.value / volume,
        surroundings=0.0 if exchange is None else exchange.surroundings.value,
        wall=0.0 if wall is None else wall.value / volume,
        segments=segments(experiment, [step for _, step, _ in ways]),
        initial_x=np.array([experiment.moles[name] for name in gases]) / volume,
        initial_temperature=experiment.temperature.initial,
    )


Way = tuple[str, Step, bool]


def one_way_steps(steps: Sequence[Step]) -> list[Way]:
    """(name, step, is it the reverse) of every one-way step, a reverse after its forward."""
    ways: list[Way] = []
    for step in steps:
        ways.append((step.name, step, False))
        if step.reverse is not None:
            ways.append((step.name + REVERSE_SUFFIX, step, True))
    return ways


def is_open(step: Step) -> bool:
    """True for a step that brings or takes matter: nothing on one of its sides."""
    return not step.reactants or not step.products


def _net_row(step: Step, back: bool, place: dict[str, int]) -> list[tuple[int, float]]:
    sign = -1.0 if back else 1.0
    return [(place[gas], sign * number) for gas, number in step.net.items() if number != 0]


def _order_row(step: Step, back: bool, place: dict[str, int]) -> list[tuple[int, float]]:
    orders = step.reverse_orders if back else step.orders
    return [(place[gas], order) for gas, order in orders.items() if order != 0]


def _guard_row(step: Step, back: bool, place: dict[str, int]) -> list[tuple[int, float]]:
    """Consumed gases on which the rate does not depend."""
    sign = -1.0 if back else 1.0
    orders = step.reverse_orders if back else step.orders
    return [
        (place[gas], 0.0)
        for gas, number in step.net.items()
        if sign * number < 0 and orders.get(gas, 0.0) == 0
    ]


def _baths(ways: Sequence[Way], place: dict[str, int]) -> tuple[np.ndarray, Rows, Floats]:
    """Row of each step, distinct baths as corrections to the sum of all gases."""
    found: dict[tuple[float, tuple[tuple[int, float], ...]], int] = {}
    row_of: list[int] = []
    for _, step, _ in ways:
        if step.bath is None:
            row_of.append(-1)
            continue
        efficiencies = step.bath.efficiencies.items()
        corrections = sorted(
            (place[g], e - step.bath.others) for g, e in efficiencies if g in place
        )
        key = (step.bath.others, tuple(corrections))
        row_of.append(found.setdefault(key, len(found)))
    rows = Rows.of([list(corrections) for _, corrections in found])
    return np.array(row_of, np.intp), rows, np.array([others for others, _ in found], float)


def _law_blocks(experiment: Experiment, ways: Sequence[Way]) -> tuple[LawBlock, ...]:
    """Steps grouped by the formula of their law, with the numbers each formula takes."""
    groups: dict[Template, list[tuple[int, Step, StepContext]]] = {}
    for j, (_, step, back) in enumerate(ways):
        if not back:
            context = experiment.context(step)
            template = step.law.template(context)
            groups.setdefault(template, []).append((j, step, context))
    return tuple(
        LawBlock(
            template,
            np.array([j for j, _, _ in group], np.intp),
            np.array([step.law.numbers(context) for _, step, context in group])
            .reshape(len(group), len(template.slots))
            .T.copy(),
            tuple(f"steps.{step.name}" for _, step, _ in group),
        )
        for template, group in groups.items()
    )


def _reverses(ways: Sequence[Way]) -> Reverses:
    rows = [j for j, (_, _, back) in enumerate(ways) if back]
    given = [ways[j][1].reverse for j in rows]
    numbers = np.array(
        [
            _given_constant(ways[j][1], reverse)
            if isinstance(reverse, GivenEquilibrium)
            else (0.0, 298.15, 0.0)
            for j, reverse in zip(rows, given, strict=True)
        ]
    ).reshape(len(rows), 3)
    return Reverses(
        step=np.array(rows, np.intp),
        forward=np.array([j - 1 for j in rows], np.intp),
        given=np.array([isinstance(reverse, GivenEquilibrium) for reverse in given], bool),
        lnK_at=numbers[:, 0],
        at=numbers[:, 1],
        enthalpy=numbers[:, 2],
    )


def _given_constant(step: Step, reverse: GivenEquilibrium) -> tuple[float, float, float]:
    """(ln K at 1 bar, temperature it holds at, enthalpy of reaction)."""
    at, change = reverse.at.value, step.change_of_moles
    lnK = math.log(reverse.constant.value)
    if reverse.kind == "Kp":
        lnK -= change * math.log(STANDARD_PRESSURE)
    elif reverse.kind == "Kc":
        lnK += change * math.log(R * at / STANDARD_PRESSURE)
    return lnK, at, 0.0 if reverse.enthalpy is None else reverse.enthalpy.value


def _heats(ways: Sequence[Way]) -> Floats:
    heats = [math.nan if s.heat is None else s.heat.value * (-1 if b else 1) for _, s, b in ways]
    return np.array(heats, float)


def _needs_gibbs(experiment: Experiment) -> bool:
    return any(step.reverse == "thermochemistry" for step in experiment.steps)


@lru_cache(maxsize=64)
def _thermal(series: tuple[Thermochemistry | None, ...]) -> Thermal:
    """Series of every gas; gases without thermochemistry get zeros, which nothing reads.

    The Systems of many conditions share one table.
    """
    domains = [(200.0, 3000.0) if s is None else s.domain for s in series]

    def table(name: str) -> Floats:
        columns = [() if s is None else getattr(s, name) for s in series]
        terms = np.zeros((max(1, *(len(c) for c in columns)), len(columns)))
        for i, column in enumerate(columns):
            terms[: len(column), i] = column
        return terms

    heat_capacity = table("heat_capacity_coefficients")
    return Thermal(
        low=np.array([low for low, _ in domains]),
        high=np.array([high for _, high in domains]),
        cp=heat_capacity,
        cp_slope=np.asarray(chebder(heat_capacity), float),
        h=table("enthalpy_coefficients"),
        s=table("entropy_coefficients"),
    )
