"""Which conditions a sweep runs: a grid, a list, or quasi-random points over addresses.

Every condition follows from its index alone, so that any part can be made by itself, on any
machine, at any time. Values are in the unit and convention of the case file.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal, Protocol

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Spacing = Literal["linear", "log", "normal"]

MOST = 2**40
"""Conditions of one design at most; beyond, an index is no longer exact in all that reads it."""

SMALLEST_SHARE = 2.0**-53
"""A share of 0 is moved here before a normal spread is asked for its value."""


class Design(Protocol):
    """Conditions by their index."""

    @property
    def count(self) -> int:
        """Conditions in all."""
        ...

    @property
    def addresses(self) -> tuple[str, ...]:
        """What is varied."""
        ...

    def rows(self, start: int, stop: int) -> dict[str, Floats]:
        """Conditions ``start`` to ``stop``, by address; each of shape (stop - start,)."""
        ...

    def described(self) -> dict[str, Any]:
        """Everything that decides the conditions, as plain data."""
        ...


def spaced(low: float, high: float, points: int, spacing: Spacing) -> Floats:
    """Points from ``low`` to ``high``, both included, evenly in the value or its logarithm."""
    if points == 1:
        return np.array([low])
    return np.asarray(
        np.geomspace(low, high, points) if spacing == "log" else np.linspace(low, high, points)
    )


@dataclass(frozen=True)
class Grid:
    """Every combination of values; the last address moves fastest.

    >>> grid = Grid({"temperature.value": np.array([400.0, 500.0]), "fill.total": np.arange(3.0)})
    >>> grid.count
    6
    >>> grid.rows(2, 4)["fill.total"]
    array([2., 0.])
    """

    values: Mapping[str, Floats]

    @property
    def count(self) -> int:
        """Conditions in all."""
        product = 1
        for column in self.values.values():
            product *= len(column)
        return product

    @property
    def addresses(self) -> tuple[str, ...]:
        """What is varied."""
        return tuple(self.values)

    def rows(self, start: int, stop: int) -> dict[str, Floats]:
        """Conditions ``start`` to ``stop``."""
        index = np.arange(start, stop)
        found: dict[str, Floats] = {}
        for address in reversed(self.addresses):
            column = self.values[address]
            found[address] = column[index % len(column)]
            index = index // len(column)
        return {address: found[address] for address in self.addresses}

    def described(self) -> dict[str, Any]:
        """Everything that decides the conditions."""
        return {"design": "grid", "values": {a: _exact(v) for a, v in self.values.items()}}


@dataclass(frozen=True)
class Listed:
    """Conditions as they were written down, row by row; ``file`` is what the reader called it."""

    columns: Mapping[str, Floats]
    file: str

    @property
    def count(self) -> int:
        """Conditions in all."""
        return len(next(iter(self.columns.values())))

    @property
    def addresses(self) -> tuple[str, ...]:
        """What is varied."""
        return tuple(self.columns)

    def rows(self, start: int, stop: int) -> dict[str, Floats]:
        """Conditions ``start`` to ``stop``."""
        return {address: column[start:stop] for address, column in self.columns.items()}

    def described(self) -> dict[str, Any]:
        """Everything that decides the conditions; the numbers by their hash, they may be many."""
        digest = hashlib.sha256()
        for column in self.columns.values():
            digest.update(np.ascontiguousarray(column, "<f8").tobytes())
        return {
            "design": "list",
            "addresses": list(self.columns),
            "count": self.count,
            "sha256": digest.hexdigest(),
        }


@dataclass(frozen=True)
class Excerpt:
    """Some rows of a long list, from ``first`` on, so that not all of it need travel."""

    whole: Listed
    first: int
    count: int

    @property
    def addresses(self) -> tuple[str, ...]:
        """What is varied."""
        return self.whole.addresses

    def rows(self, start: int, stop: int) -> dict[str, Floats]:
        """Conditions ``start`` to ``stop`` of the whole list."""
        return self.whole.rows(start - self.first, stop - self.first)

    def described(self) -> dict[str, Any]:
        """Everything that decides these conditions."""
        return {"first": self.first, **self.whole.described()}


def excerpt(design: Listed, start: int, stop: int) -> Excerpt:
    """Rows ``start`` to ``stop`` of a list, under their old indices."""
    return Excerpt(Listed(design.rows(start, stop), design.file), start, design.count)


@dataclass(frozen=True)
class Spread:
    """How one number is spread.

    ``linear`` and ``log``: evenly from ``first`` to ``second`` in the value or its logarithm;
    ``normal``: mean ``first`` and standard deviation ``second``. In the unit of the case.
    """

    spacing: Spacing
    first: float
    second: float

    def of(self, share: Floats) -> Floats:
        """The value below which a share of all lies [shape of ``share``].

        >>> float(Spread("log", 1.0, 100.0).of(np.array([0.5]))[0])
        10.0
        """
        if self.spacing == "normal":
            from scipy.special import ndtri

            inside = np.clip(share, SMALLEST_SHARE, 1.0 - SMALLEST_SHARE)
            return np.asarray(self.first + self.second * ndtri(inside), float)
        if self.spacing == "log":
            low, high = np.log(self.first), np.log(self.second)
            # a last bit of exp must not lead out of the range
            grown = np.exp(low + (high - low) * share)
            return np.asarray(np.clip(grown, self.first, self.second), float)
        return np.asarray(self.first + (self.second - self.first) * share, float)


@dataclass(frozen=True)
class QuasiRandom:
    """Points of a scrambled Sobol sequence, 2^exponent of them.

    Source: A. B. Owen, J. Complexity 14, 466 (1998) (scrambling); scipy.stats.qmc.
    """

    spreads: Mapping[str, Spread]
    exponent: int
    seed: int

    @property
    def count(self) -> int:
        """Conditions in all."""
        return int(2**self.exponent)

    @property
    def addresses(self) -> tuple[str, ...]:
        """What is varied."""
        return tuple(self.spreads)

    def rows(self, start: int, stop: int) -> dict[str, Floats]:
        """Conditions ``start`` to ``stop``."""
        from scipy.stats import qmc

        bits = _bits(self.exponent)
        points = qmc.Sobol(len(self.spreads), scramble=True, rng=self.seed, bits=bits)
        if start:
            points.fast_forward(start)
        shares = _drawn(points, start, stop - start)
        return {
            address: spread.of(shares[:, i])
            for i, (address, spread) in enumerate(self.spreads.items())
        }

    def described(self) -> dict[str, Any]:
        """Everything that decides the conditions."""
        spreads = {a: [s.spacing, s.first.hex(), s.second.hex()] for a, s in self.spreads.items()}
        return {
            "design": "quasi-random",
            "spreads": spreads,
            "count": self.count,
            "seed": self.seed,
        }


def _bits(exponent: int) -> int:
    """Binary digits of a share: 30 as usual, more where the design has more points."""
    return max(30, exponent + 2)


def _drawn(points: Any, start: int, count: int) -> Floats:
    """Further points; a warning about the first point would be one about a part, not the design."""
    import warnings

    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="The balance properties of Sobol")
        return np.asarray(points.random(count), float)


def _exact(column: Floats) -> list[str]:
    return [float(value).hex() for value in column]
