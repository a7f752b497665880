"""A System taken apart: its structure as something to compare, its numbers as one row.

Conditions of one structure are carried out together; their numbers go into the lanes.
"""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass, fields
from functools import cached_property
from typing import Any

import numpy as np

from meanfree.equations.build import build_system
from meanfree.equations.system import Floats, System
from meanfree.experiment.experiment import Experiment
from meanfree.kernel.slots import Name

VARYING = {
    "blocks", "reverses", "initial_x", "initial_temperature", "held_pressure", "initial_volume",
    "dead", "wall", "exchange", "surroundings", "segments", "heat_given", "photon",
}  # fmt: skip
"""Fields of a System of which the numbers may differ from condition to condition."""

STRUCTURE = tuple(f.name for f in fields(System) if f.name not in VARYING)

REVERSES = ("lnK_at", "at", "enthalpy")
SCALARS = {
    "T": "initial_temperature",
    "p": "held_pressure",
    "V": "initial_volume",
    "dead": "dead",
    "wall": "wall",
    "exchange": "exchange",
    "surroundings": "surroundings",
}
"""What a Variation calls them, and the System."""


@dataclass(frozen=True)
class Numbers:
    """The System of one condition, taken apart."""

    experiment: Experiment
    system: System

    @cached_property
    def structure(self) -> Hashable:
        """See `structure_of`."""
        return structure_of(self.system)

    @cached_property
    def names(self) -> tuple[Name, ...]:
        """What a Variation calls each number."""
        s = self.system
        found: list[Name] = [
            ("number", b, slot, position)
            for b, block in enumerate(s.blocks)
            for slot in range(block.numbers.shape[0])
            for position in range(block.numbers.shape[1])
        ]
        found += [(kind, row) for kind in REVERSES for row in range(len(s.reverses.step))]
        found += [("x", i) for i in range(s.n_gases)]
        found += [(kind, j) for kind in ("heat", "photon") for j in range(s.n_steps)]
        found += [(name,) for name in SCALARS]
        found += [
            ("break", place, kind) for place, _ in enumerate(s.segments) for kind in _of_break(s)
        ]
        return (*found, ("end",))

    @cached_property
    def values(self) -> Floats:
        """The numbers, in the order of ``names``; NaN where there is none."""
        s, until = self.system, self.experiment.plan.until
        parts = [block.numbers.ravel() for block in s.blocks]
        parts += [getattr(s.reverses, kind) for kind in REVERSES]
        parts += [s.initial_x, s.heat_given, s.photon]
        rest = [getattr(s, name) for name in SCALARS.values()]
        rest += [getattr(e, kind) for e in s.segments for kind in _of_break(s)]
        rest.append(np.nan if until is None else until.value)
        return np.concatenate([*parts, np.array(rest, float)])

    @property
    def by_name(self) -> dict[Name, float]:
        """The numbers that there are."""
        pairs = zip(self.names, self.values, strict=True)
        return {name: float(value) for name, value in pairs if not np.isnan(value)}


def structure_of(system: System) -> Hashable:
    """Equal for two Systems that differ in numbers only that a Variation can carry."""
    s = system
    return (
        tuple(_key(getattr(s, name)) for name in STRUCTURE),
        tuple(getattr(s, name) == 0 for name in ("dead", "wall", "exchange")),
        tuple((block.law, _key(block.steps), block.numbers.shape) for block in s.blocks),
        tuple(_key(getattr(s.reverses, name)) for name in ("step", "forward", "given")),
        np.isnan(s.heat_given).tobytes(),
        tuple((_key(e.switches), e.drawn != 0) for e in s.segments),
    )


def same_structure(one: System, other: System) -> bool:
    """True where the conditions of two Systems can be carried out together."""
    return structure_of(one) == structure_of(other)


def _of_break(system: System) -> tuple[str, ...]:
    """Numbers of a break; the temperature follows a program only."""
    kinds = ("start", "retained", "temperature", "slope")
    return kinds if system.mode == "program" else kinds[:2]


def numbers_of(experiment: Experiment) -> Numbers:
    """The System of an experiment, taken apart."""
    with np.errstate(all="ignore"):
        return Numbers(experiment, build_system(experiment))


def _key(value: Any) -> Hashable:
    """Something hashable that is equal for equal contents; NaN equals NaN."""
    if isinstance(value, np.ndarray):
        return value.shape, value.dtype.str, value.tobytes()
    if isinstance(value, tuple):
        return tuple(map(_key, value))
    if hasattr(value, "__dataclass_fields__") and not isinstance(value, type):
        return tuple(_key(getattr(value, f.name)) for f in fields(value))
    key: Hashable = value
    return key
