"""Many conditions of one experiment, as arrays: what each address does to the equations.

No law and no way to fill a vessel is written a second time here. The System is built at a few
values of each address; where its numbers follow a + b f(value) with f the value, its inverse or
its logarithm, and several addresses add up or multiply, all conditions follow at once. Built
Systems of some conditions are compared with that; where it does not hold, every condition is built
by itself.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from meanfree.equations.build import build_system
from meanfree.equations.system import Floats, System
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import with_inputs
from meanfree.kernel.parameters import Variation
from meanfree.kernel.slots import Name

Table = Mapping[str, Floats]

FORMS: tuple[Callable[[Any], Any], ...] = (lambda v: v, lambda v: 1 / v, np.log)
"""How a number may follow a value; each with an offset and a factor."""

AGREE = 1e-12
"""Relative agreement of a number with what its form predicts: rounding of a few operations."""

CHECKED = 3
"""Conditions whose Systems are built to compare."""

OWN_TIME = "run.until"


@dataclass(frozen=True)
class Block:
    """Conditions that share a structure: ``rows`` of the table, and how their numbers vary.

    ``end`` [s, shape (count,) or (1,)], None where runs end by themselves.
    """

    experiment: Experiment
    rows: np.ndarray
    variation: Variation
    end: Floats | None


def numbers_of(experiment: Experiment) -> tuple[System, dict[Name, float]]:
    """The System and every number of it that may differ from condition to condition."""
    system = build_system(experiment)
    found: dict[Name, float] = {
        ("number", b, slot, position): float(value)
        for b, block in enumerate(system.blocks)
        for (slot, position), value in np.ndenumerate(block.numbers)
    }
    for row in range(len(system.reverses.step)):
        for kind in ("lnK_at", "at", "enthalpy"):
            found[kind, row] = float(getattr(system.reverses, kind)[row])
    found.update({("x", i): float(x) for i, x in enumerate(system.initial_x)})
    found["T",], found["p",] = system.initial_temperature, system.held_pressure
    found["V",], found["dead",], found["wall",] = system.initial_volume, system.dead, system.wall
    found["exchange",], found["surroundings",] = system.exchange, system.surroundings
    until = experiment.plan.until
    found["end",] = 0.0 if until is None else until.value
    return system, found


STRUCTURE = tuple(
    f.name
    for f in fields(System)
    if f.name not in {
        "blocks", "reverses", "initial_x", "initial_temperature", "held_pressure", "initial_volume",
        "dead", "wall", "exchange", "surroundings", "segments",
    }
)  # fmt: skip


def same_structure(one: System, other: System) -> bool:
    """True where two Systems differ in numbers only that a Variation can carry."""
    kept = ("dead", "wall", "exchange")
    return (
        all(_same(getattr(one, name), getattr(other, name)) for name in STRUCTURE)
        and all((getattr(one, k) == 0) == (getattr(other, k) == 0) for k in kept)
        and len(one.blocks) == len(other.blocks)
        and all(a.law == b.law for a, b in zip(one.blocks, other.blocks, strict=True))
        and _same_segments(one, other)
    )


def _same_segments(one: System, other: System) -> bool:
    if one.mode != "program" and len(one.segments) == len(other.segments) == 1:
        return True
    return _same(one.segments, other.segments)


def _same(one: Any, other: Any) -> bool:
    if isinstance(one, np.ndarray):
        same_nan = one.dtype.kind == "f"
        return bool(np.array_equal(one, other, equal_nan=same_nan))
    if isinstance(one, tuple) and isinstance(other, tuple):
        return len(one) == len(other) and all(map(_same, one, other))
    if hasattr(one, "__dataclass_fields__") and not isinstance(one, type):
        return all(_same(getattr(one, f.name), getattr(other, f.name)) for f in fields(one))
    return bool(one == other)


def as_table(conditions: Mapping[str, Any]) -> tuple[dict[str, Floats], int]:
    """Columns of one length, and that length; numbers alone hold for all conditions.

    Raises
    ------
    InputError
        Columns of different lengths, none at all, or values that are not finite.
    """
    columns = {str(a): np.atleast_1d(np.asarray(conditions[a], float)) for a in conditions}
    lengths = {len(column) for column in columns.values()} - {1}
    if not columns or len(lengths) > 1:
        found = "no columns" if not columns else f"columns of {sorted(lengths)} values"
        raise InputError.at("conditions", found, "columns of one length, one for each address")
    problems = [
        Problem(a, f"{c[~np.isfinite(c)][0]:g}", "a finite number")
        for a, c in columns.items()
        if not np.all(np.isfinite(c))
    ]
    if problems:
        raise InputError(problems)
    count = lengths.pop() if lengths else 1
    return {a: np.broadcast_to(column, count) for a, column in columns.items()}, count


def blocks_of(experiment: Experiment, table: Table, count: int) -> Iterator[Block]:
    """The conditions as few blocks as their structure allows: one, unless numbers defy a form."""
    _refuse_impossible(experiment, table)
    base = with_inputs(experiment, _row(table, 0))
    variation = _together(base, table, count)
    if variation is not None:
        end = variation.values.get(("end",))
        if end is None and base.plan.until is not None:
            end = np.array([base.plan.until.value])
        yield Block(base, np.arange(count), variation, end)
        return
    for row in range(count):
        alone = with_inputs(experiment, _row(table, row))
        until = alone.plan.until
        end = None if until is None else np.array([until.value])
        yield Block(alone, np.array([row]), Variation(build_system(alone), 1), end)


def _row(table: Table, row: int) -> dict[str, float]:
    return {address: float(column[row]) for address, column in table.items()}


def _refuse_impossible(experiment: Experiment, table: Table) -> None:
    """Bounds are intervals: the least and the largest value of each column speak for all."""
    problems: dict[str, Problem] = {}
    for pick in (np.min, np.max):
        try:
            with_inputs(experiment, {a: float(pick(column)) for a, column in table.items()})
        except InputError as error:
            problems.update({p.key: p for p in error.problems})
    if problems:
        raise InputError(problems.values())


def _together(base: Experiment, table: Table, count: int) -> Variation | None:
    """All conditions at once, None where that does not reproduce Systems built one by one."""
    moving = {a: column for a, column in table.items() if np.any(column != column[0])}
    system, start = numbers_of(base)
    effects: dict[Name, list[Floats]] = {}
    for address, column in moving.items():
        effect = _effect(base, system, start, address, column)
        if effect is None:
            return None
        for name, values in effect.items():
            effects.setdefault(name, []).append(values)
    rows = np.unique(np.linspace(0, count - 1, CHECKED + 1).astype(int)[1:])
    truth = []
    for row in rows:
        built, numbers = numbers_of(with_inputs(base, _row(table, int(row))))
        if not same_structure(system, built):
            return None
        truth.append(numbers)
    joint: dict[Name, Floats] = {}
    for name, parts in effects.items():
        joined = _joined(start[name], parts, rows, np.array([numbers[name] for numbers in truth]))
        if joined is None:
            return None
        joint[name] = joined
    still = [name for name in start if name not in joint]
    if any(not _close(numbers[name], start[name]) for numbers in truth for name in still):
        return None
    return Variation(system, count, joint)


def _joined(start: float, parts: list[Floats], rows: np.ndarray, truth: Floats) -> Floats | None:
    """Effects of several addresses on one number: as a product, or as a sum."""
    if start != 0:
        product = np.full(len(parts[0]), start)
        for part in parts:
            product = product * (part / start)
        if len(parts) == 1:
            product = parts[0]
        if np.all(_close(product[rows], truth)):
            return product
    total = np.full(len(parts[0]), start)
    for part in parts:
        total = total + (part - start)
    return total if np.all(_close(total[rows], truth)) else None


def _close(one: Any, other: Any) -> Any:
    return (np.abs(np.subtract(one, other)) <= AGREE * np.abs(other)) | (one == other)


def _effect(
    base: Experiment, system: System, start: Mapping[Name, float], address: str, column: Floats
) -> dict[Name, Floats] | None:
    """The numbers that an address changes, for every condition; None where no form fits."""
    low, high = float(np.min(column)), float(np.max(column))
    probes = np.array([low, 0.75 * low + 0.25 * high, 0.4 * low + 0.6 * high, high])
    seen = []
    for probe in probes:
        built, numbers = numbers_of(with_inputs(base, {address: float(probe)}))
        if not same_structure(system, built):
            return None
        seen.append(numbers)
    found = {}
    for name in start:
        values = np.array([numbers[name] for numbers in seen])
        if np.all(values == values[0]) and values[0] == start[name]:
            continue
        predicted = _by_form(probes, values, column)
        if predicted is None:
            return None
        found[name] = predicted
    return found


def _by_form(probes: Floats, values: Floats, column: Floats) -> Floats | None:
    """a + b f(value) through the outer probes, if the inner ones agree."""
    for form in FORMS:
        if form is not FORMS[0] and probes[0] <= 0:
            continue
        f = form(probes)
        slope = (values[-1] - values[0]) / (f[-1] - f[0])
        offset = values[0] - slope * f[0]
        # Without an offset nothing is lost by cancellation.
        if np.all(_close(values / f * f[0], values[0])) and f[0] != 0:
            slope, offset = values[0] / f[0], 0.0
        if np.all(_close(offset + slope * f, values)):
            return np.asarray(offset + slope * form(column), float)
    return None
