"""How all numbers of a System follow all addresses that vary, found by building a few Systems.

Each address is walked alone; what several of them change follows as a product, as a sum, or
linearly in each from the corners. Systems of some conditions, built by themselves, are compared.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.inputs import with_inputs
from meanfree.integrate.curves import LEVELS, SMOOTH, Curve, agree, formula, nodes_of, series
from meanfree.integrate.numbers import Numbers, numbers_of
from meanfree.kernel.slots import Name

Table = Mapping[str, Floats]
Joint = Callable[[Sequence[Floats]], Floats]

CORNERED = 6
"""Addresses that may change one number together: each doubles the corners."""


@dataclass(frozen=True)
class Misfit:
    """Why conditions do not follow together: some address (perhaps "") is to blame."""

    address: str


@dataclass(frozen=True)
class Template:
    """Numbers of many conditions within ``spans`` of the addresses that vary.

    ``curves`` of each number by address, ``joints`` how those of several addresses are joined.
    """

    base: Numbers
    spans: Mapping[str, tuple[float, float]]
    curves: Mapping[int, Mapping[str, Curve]]
    joints: Mapping[int, Joint]

    def covers(self, table: Table) -> bool:
        """True where every column lies within its span, and none varies that did not before."""
        for address, column in table.items():
            low, high = self.spans.get(address, (np.nan, np.nan))
            if not (low <= column.min() and column.max() <= high):
                return False
        return self.spans.keys() == table.keys()

    def values(self, table: Table) -> dict[Name, Floats]:
        """Every number that varies, for every condition."""
        names = self.base.names
        found = {}
        with np.errstate(all="ignore"):
            for place, by_address in self.curves.items():
                parts = [curve(table[address]) for address, curve in by_address.items()]
                found[names[place]] = np.asarray(self.joints[place](parts), float)
        return found


def template_for(
    base: Numbers,
    spans: Mapping[str, tuple[float, float]],
    rows: Table,
) -> tuple[Template | Misfit, int]:
    """The template over ``spans``, held against Systems at ``rows``; how many Systems it took.

    ``rows`` are a few conditions, one value a row for each address; ``base`` is one of those of
    the table.
    """
    finder = _Finder(base)
    # What a formula makes of numbers that defy it is nothing to warn of.
    with np.errstate(all="ignore"):
        for address, (low, high) in spans.items():
            if low < high and not finder.walk(address, low, high):
                return Misfit(address), finder.count
        return finder.joined(spans, rows), finder.count


class _Finder:
    def __init__(self, base: Numbers) -> None:
        self.base, self.count = base, 0
        self.curves: dict[int, dict[str, Curve]] = {}
        self.ends: dict[str, tuple[float, float]] = {}
        self.corners: dict[tuple[tuple[str, float], ...], Floats | None] = {}

    def built(self, changed: Mapping[str, float]) -> Floats | None:
        """The numbers with some addresses changed; None where the structure is another."""
        self.count += 1
        found = numbers_of(with_inputs(self.base.experiment, changed))
        return found.values if found.structure == self.base.structure else None

    def walk(self, address: str, low: float, high: float) -> bool:
        """Find the curve of every number over one address; False where one defies it."""
        self.ends[address] = low, high
        known: dict[float, Floats] = {}
        undecided: np.ndarray | None = None
        for level in LEVELS:
            nodes = nodes_of(low, high, level)
            for node in nodes:
                if float(node) not in known:
                    found = self.built({address: float(node)})
                    if found is None:
                        return False
                    known[float(node)] = found
            seen = np.array([known[float(node)] for node in nodes])
            if undecided is None:
                first = self.base.values
                moved = (~agree(seen, first[None], 0.0)).any(axis=0)
                undecided = np.flatnonzero(moved)
            left = []
            for place in undecided:
                values = seen[:, place]
                curve = formula(nodes, values) if level == LEVELS[0] else series(nodes, values)
                if curve is None:
                    left.append(place)
                else:
                    self.curves.setdefault(int(place), {})[address] = curve
            undecided = np.array(left, int)
            if not left:
                return True
        return False

    def joined(self, spans: Mapping[str, tuple[float, float]], rows: Table) -> Template | Misfit:
        """Join what several addresses do to one number, and compare."""
        count = len(next(iter(rows.values())))
        truth = []
        for row in range(count):
            found = self.built({address: float(column[row]) for address, column in rows.items()})
            if found is None:
                return Misfit("")
            truth.append(found)
        right = np.array(truth)
        joints: dict[int, Joint] = {}
        for place, by_address in self.curves.items():
            parts = [curve(rows[address]) for address, curve in by_address.items()]
            for joint in self._candidates(place, list(by_address)):
                if agree(joint(parts), right[:, place], SMOOTH).all():
                    joints[place] = joint
                    break
            else:
                return Misfit(next(iter(by_address)))
        still = np.setdiff1d(np.arange(right.shape[1]), list(self.curves))
        if not agree(right[:, still], self.base.values[still][None]).all():
            return Misfit("")
        return Template(self.base, dict(spans), self.curves, joints)

    def _candidates(self, place: int, addresses: list[str]) -> Iterator[Joint]:
        """Ways in which several addresses may change one number, simplest first."""
        start = float(self.base.values[place])
        if len(addresses) == 1:
            yield lambda parts: parts[0]
            return
        if start != 0:
            yield lambda parts: start * np.prod([part / start for part in parts], axis=0)
        yield lambda parts: start + np.sum([part - start for part in parts], axis=0)
        if len(addresses) <= CORNERED:
            found = self._from_corners(place, addresses)
            if found is not None:
                yield found

    def _from_corners(self, place: int, addresses: list[str]) -> Joint | None:
        """Linear in what each address does by itself, from one end of its span to the other."""
        steps = []
        for address in addresses:
            first, last = self.curves[place][address](np.array(self.ends[address]))
            if first == last:
                return None
            steps.append((first, last))
        corners = []
        for which in product((0, 1), repeat=len(addresses)):
            found = self._corner(
                tuple((a, self.ends[a][end]) for a, end in zip(addresses, which, strict=True))
            )
            if found is None:
                return None
            corners.append((which, float(found[place])))

        def joint(parts: Sequence[Floats]) -> Floats:
            shares = [
                (part - first) / (last - first)
                for part, (first, last) in zip(parts, steps, strict=True)
            ]
            total: Floats = np.zeros(1)
            for which, value in corners:
                weight: Floats = np.full(1, value)
                for share, end in zip(shares, which, strict=True):
                    weight = weight * (share if end else 1 - share)
                total = total + weight
            return total

        return joint

    def _corner(self, changed: tuple[tuple[str, float], ...]) -> Floats | None:
        if changed not in self.corners:
            try:
                self.corners[changed] = self.built(dict(changed))
            except InputError:
                self.corners[changed] = None
        return self.corners[changed]
