"""One address for every number of an experiment, and experiments with other numbers.

The addresses are the keys of the case file (``steps.decomposition.A``). Values at an address
are in the file's unit and counting convention; everything else inside is SI.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any

from meanfree import units
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import Program
from meanfree.sourced import Sourced

Path = tuple[str | int, ...]


@dataclass(frozen=True)
class Input:
    """A number of the experiment, in the unit and convention of the file.

    ``low`` and ``high`` bound what is physically possible, in the same unit.
    """

    address: str
    value: float
    unit: str
    source: str
    low: float
    high: float
    quantity: Sourced


def inputs(experiment: Experiment) -> dict[str, Input]:
    """Every number of the experiment by its address, in the order of the case file."""
    return {address: _input(address, found) for address, (_, found) in _walk(experiment).items()}


def with_inputs(experiment: Experiment, values: Mapping[str, float]) -> Experiment:
    """The same experiment with other numbers.

    ``values`` maps addresses to numbers in the unit and convention of the file.

    Raises
    ------
    InputError
        An address is not one of this experiment's, or a value is impossible there.
    """
    known = _walk(experiment)
    problems: list[Problem] = []
    for address, value in values.items():
        if address not in known:
            problems.append(Problem(address, "an unknown address", _near(address, known)))
            continue
        problems.extend(_impossible(_input(address, known[address][1]), float(value)))
    if problems:
        raise InputError(problems)
    changed: Any = experiment
    for address, value in values.items():
        path, quantity = known[address]
        dimension = _dimension(address, quantity)
        si = units.to_si(float(value), quantity.unit, dimension) / quantity.per
        changed = _replaced(changed, path, quantity.with_value(si))
    result: Experiment = changed
    return result


def _dimension(address: str, quantity: Sourced) -> str:
    """The dimension of a number; sizes out of tables and default powers do not name theirs."""
    return quantity.dimension or ("length" if address.endswith(".diameter") else "pure")


def _input(address: str, quantity: Sourced) -> Input:
    low, high = 0.0, float("inf")
    if quantity.dimension == "molar energy" or address.endswith(".n"):
        low = -high
    dimension = _dimension(address, quantity)
    if quantity.dimension == "fraction":
        high = units.from_si(1.0, quantity.unit, dimension)
    value = units.from_si(quantity.value * quantity.per, quantity.unit, dimension)
    if quantity.dimension == "temperature":
        low = units.from_si(0.0, quantity.unit, "temperature")
    return Input(address, value, quantity.unit, quantity.source, low, high, quantity)


def _impossible(known: Input, value: float) -> Iterator[Problem]:
    """Problems with a new value at an address."""
    above_zero = known.quantity.dimension in {"temperature", "volume", "length", "pressure"}
    low_enough = value > known.low if above_zero and ".gases." not in known.address else True
    if not (known.low <= value <= known.high) or not low_enough:
        bound = "above" if above_zero else "at least"
        limit = f"{bound} {known.low:g}" + (
            f", at most {known.high:g}" if known.high < 1e300 else ""
        )
        yield Problem(known.address, f"{value:g} {known.unit}".strip(), f"a number {limit}")


def _near(address: str, known: Mapping[str, Any]) -> str:
    from difflib import get_close_matches

    near = get_close_matches(address, known, n=3, cutoff=0.5)
    return "one of " + ", ".join(near or list(known))


def _walk(experiment: Experiment) -> dict[str, tuple[Path, Sourced]]:
    """Address to (path of attributes and indices, the quantity there)."""
    found: dict[str, tuple[Path, Sourced]] = {}

    def add(address: str, path: Path, quantity: object) -> None:
        if isinstance(quantity, Sourced):
            found[address] = (path, quantity)

    _walk_vessel(experiment, add)
    _walk_temperature(experiment, add)
    for name, portion in experiment.fill.gases.items():
        add(f"fill.gases.{name}", ("fill", "gases", name, "quantity"), portion.quantity)
    if experiment.fill.total is not None:
        add("fill.total", ("fill", "total", "quantity"), experiment.fill.total.quantity)
    add("fill.at", ("fill", "at"), experiment.fill.at)
    add("run.until", ("plan", "until"), experiment.plan.until)
    for index, flow in enumerate(experiment.flows):
        for key in ("hole", "transmission", "rate", "rise"):
            add(f"flows.{index}.{key}", ("flows", index, key), getattr(flow, key))
    for index, sample in enumerate(experiment.samples):
        for key in ("at", "fraction", "volume"):
            add(f"samples.{index}.{key}", ("samples", index, key), getattr(sample, key))
    for index, gas in enumerate(experiment.gases):
        for key in ("diameter", "polarisability", "ionisation_energy", "dipole"):
            add(f"gases.{gas.name}.{key}", ("gases", index, key), getattr(gas, key))
    for index, step in enumerate(experiment.steps):
        _walk_step(step, index, add)
    return found


Add = Callable[[str, Path, object], None]


def _walk_vessel(experiment: Experiment, add: Add) -> None:
    vessel = experiment.vessel
    for key in ("volume", "pressure", "rated_pressure", "gauge_resolution"):
        add(f"vessel.{key}", ("vessel", key), getattr(vessel, key))
    if vessel.shape is not None:
        for key in ("diameter", "length", "surface"):
            add(f"vessel.shape.{key}", ("vessel", "shape", key), getattr(vessel.shape, key))
    if vessel.dead_space is not None:
        for key in ("volume", "temperature"):
            path: Path = ("vessel", "dead_space", key)
            add(f"vessel.dead_space.{key}", path, getattr(vessel.dead_space, key))


def _walk_temperature(experiment: Experiment, add: Add) -> None:
    mode = experiment.temperature
    if isinstance(mode, Program):
        for index, (time, value) in enumerate(mode.points):
            path: Path = ("temperature", "points", index)
            add(f"temperature.points.{index}.time", (*path, 0), time)
            add(f"temperature.points.{index}.temperature", (*path, 1), value)
        return
    for key in ("value", "surroundings", "conductance", "wall_heat_capacity"):
        add(f"temperature.{key}", ("temperature", key), getattr(mode, key, None))


def _walk_step(step: Step, index: int, add: Add) -> None:
    for key, quantity in step.law.inputs().items():
        parts = [int(part) if part.isdigit() else part for part in key.split(".")]
        add(f"steps.{step.name}.{key}", ("steps", index, "law", *parts), quantity)
    for key in ("heat", "photon"):
        add(f"steps.{step.name}.{key}", ("steps", index, key), getattr(step, key))
    if isinstance(step.reverse, GivenEquilibrium):
        path: Path = ("steps", index, "reverse")
        address = f"steps.{step.name}.reverse"
        add(f"{address}.{step.reverse.kind}", (*path, "constant"), step.reverse.constant)
        add(f"{address}.at", (*path, "at"), step.reverse.at)
        add(f"{address}.enthalpy", (*path, "enthalpy"), step.reverse.enthalpy)


def _replaced(node: Any, path: Path, quantity: Sourced) -> Any:
    """``node`` with the quantity at ``path`` exchanged; nothing is changed in place."""
    if not path:
        return quantity
    head, rest = path[0], path[1:]
    if isinstance(node, tuple):
        assert isinstance(head, int)
        return (*node[:head], _replaced(node[head], rest, quantity), *node[head + 1 :])
    if isinstance(node, Mapping):
        return {**node, head: _replaced(node[head], rest, quantity)}
    assert isinstance(head, str)
    return replace(node, **{head: _replaced(getattr(node, head), rest, quantity)})
