"""Which entries a factorisation fills and in which order unknowns go, worked out once.

Minimum degree (Markowitz: the pivot with the fewest products), gases first; v, T and the baths
M border the matrix and go last, so that what is sparse stays sparse.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

Pair = tuple[int, int]


@dataclass(frozen=True)
class Plan:
    """``order`` of the pivots; ``rows[b]``, ``columns[b]``: what is left in column and row of b."""

    order: tuple[int, ...]
    rows: dict[int, tuple[int, ...]]
    columns: dict[int, tuple[int, ...]]

    @property
    def entries(self) -> int:
        """Entries of both factors."""
        return sum(1 + len(self.rows[b]) + len(self.columns[b]) for b in self.order)

    @property
    def products(self) -> int:
        """Products of one factorisation."""
        return sum(len(self.rows[b]) * (1 + len(self.columns[b])) for b in self.order)


def plan(size: int, pattern: Iterable[Pair], last: Iterable[int] = ()) -> Plan:
    """Order the elimination of a square pattern; ``last`` go at the end, in their order."""
    in_row: list[set[int]] = [set() for _ in range(size)]
    in_column: list[set[int]] = [set() for _ in range(size)]
    for r, c in pattern:
        if r != c:
            in_row[r].add(c)
            in_column[c].add(r)
    tail = list(last)
    left = set(range(size)) - set(tail)
    order: list[int] = []
    rows: dict[int, tuple[int, ...]] = {}
    columns: dict[int, tuple[int, ...]] = {}
    while left or tail:
        if left:
            b = min(left, key=lambda i: (len(in_row[i]) * len(in_column[i]), i))
            left.discard(b)
        else:
            b = tail.pop(0)
        rows[b], columns[b] = tuple(sorted(in_column[b])), tuple(sorted(in_row[b]))
        order.append(b)
        for r in rows[b]:
            in_row[r].discard(b)
            for c in columns[b]:
                if c != r:
                    in_row[r].add(c)
                    in_column[c].add(r)
        for c in columns[b]:
            in_column[c].discard(b)
    return Plan(tuple(order), rows, columns)
