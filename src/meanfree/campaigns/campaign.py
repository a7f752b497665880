"""A sweep as a value: the experiment, its conditions, what is asked, and how it is cut into parts.

What decides a single bit of the results is in the identity; parts of another identity are never
mixed.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from importlib import metadata
from typing import Any

from meanfree.campaigns.columns import Columns, columns_of
from meanfree.campaigns.designs import Design, Listed, excerpt
from meanfree.experiment.experiment import Experiment
from meanfree.integrate.observables import Observable

LARGEST_PART, SMALLEST_PART = 65_536, 512
PARTS = 32
"""Parts that a sweep of ordinary size has: enough to share out evenly, few enough to set up."""

MAKERS = ("meanfree", "numpy", "scipy", "numba", "pyarrow")
"""Programs that can change a bit of the results."""

FORMAT = "meanfree-sweep-1"


@dataclass(frozen=True)
class Campaign:
    """What a sweep runs.

    ``experiment_hash`` is that of the case's tables that make the experiment, after ``--set``.
    ``part_size`` conditions are integrated and written together.
    """

    experiment: Experiment
    experiment_hash: str
    design: Design
    observables: tuple[Observable, ...]
    part_size: int

    @property
    def parts(self) -> int:
        """Parts in all."""
        return -(-self.design.count // self.part_size)

    def span(self, part: int) -> tuple[int, int]:
        """First condition of a part, and the first after it."""
        start = part * self.part_size
        return start, min(start + self.part_size, self.design.count)

    def for_part(self, part: int) -> Campaign:
        """What one part needs to be computed elsewhere, under the identity settled here."""
        light = self
        if isinstance(self.design, Listed):
            light = replace(self, design=excerpt(self.design, *self.span(part)))
        light.__dict__.update(identity=self.identity, hash=self.hash)
        return light

    @cached_property
    def columns(self) -> Columns:
        """The columns of the results."""
        return columns_of(self.experiment, self.design.addresses, self.observables)

    @cached_property
    def identity(self) -> Mapping[str, str]:
        """What decides the bits, each with a hash or a text of its own, so that a change can be
        named."""
        return {
            "format": FORMAT,
            "experiment": self.experiment_hash,
            "design": _hash(self.design.described()),
            "observables": ", ".join(self.columns.observables),
            "part_size": str(self.part_size),
            "made_by": ", ".join(f"{n} {v}" for n, v in makers().items()),
        }

    @cached_property
    def hash(self) -> str:
        """One hash of the whole identity."""
        return _hash(dict(self.identity))


def part_size_for(count: int) -> int:
    """Conditions in a part: a power of two that follows from the number of conditions alone.

    >>> part_size_for(100), part_size_for(2**16), part_size_for(10**9)
    (512, 2048, 65536)
    """
    share = max(1, -(-count // PARTS))
    return min(max(int(2 ** (share - 1).bit_length()), SMALLEST_PART), LARGEST_PART)


def makers() -> dict[str, str]:
    """Versions of the programs that results pass through."""
    return {name: metadata.version(name) for name in MAKERS}


def _hash(content: Mapping[str, Any]) -> str:
    text = json.dumps(content, sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()
