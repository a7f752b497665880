"""What the three outputs have in common: who is asked for which part, and where brackets go."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from meanfree.equations.typeset import tree
from meanfree.equations.typeset.tree import Node

SUM, PRODUCT, POWER, ATOM = 1, 2, 3, 4


class Writer:
    """Writes a formula as text of one kind. Subclasses have one method a kind of part."""

    flat = False
    """True where a fraction is written in one line and so binds like a product."""

    def write(self, part: Node) -> str:
        """A part and all that it holds."""
        method: Callable[[Any], str] = getattr(self, type(part).__name__.lower())
        return method(part)

    def inside(self, part: Node, least: int) -> str:
        """A part, in brackets where it binds less than ``least``."""
        written = self.write(part)
        return written if self.binding(part) >= least else self.bracket(written)

    def binding(self, part: Node) -> int:
        """How strongly a part holds together."""
        if isinstance(part, tree.Sum | tree.Relation | tree.Total | tree.Cases):
            return SUM
        if isinstance(part, tree.Number):
            plain = part.value >= 0 and "e" not in f"{part.value:.6g}"
            return ATOM if plain else PRODUCT
        if isinstance(part, tree.Product) or (self.flat and isinstance(part, tree.Fraction)):
            return PRODUCT
        if isinstance(part, tree.Power | tree.Fraction):
            return POWER
        return ATOM

    def base(self, part: tree.Power) -> str:
        """What is raised to a power: (lg x)^2 is not lg x^2."""
        written = self.inside(part.base, ATOM)
        return self.bracket(written) if isinstance(part.base, tree.Call) else written

    def factors(self, part: tree.Product) -> list[str]:
        """The factors of a product; a sum over an index needs no brackets where it stands last.

        In one line a/b c would be read as a/(b c) by some.
        """
        *first, last = part.factors
        flat = self.flat
        least = [POWER if flat and isinstance(f, tree.Fraction) else PRODUCT for f in first]
        written = [self.inside(f, n) for f, n in zip(first, least, strict=True)]
        return [*written, self.inside(last, SUM if isinstance(last, tree.Total) else PRODUCT)]

    def bracket(self, written: str) -> str:
        """Round brackets around what is written."""
        raise NotImplementedError
