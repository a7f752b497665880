"""A number that knows its unit and where it comes from."""

from __future__ import annotations

from dataclasses import dataclass, replace


@dataclass(frozen=True, slots=True)
class Sourced:
    """A value in SI with the unit it was written in and its source.

    ``value`` is always SI with mol. ``unit`` is the unit to show it in, empty
    for a pure number; ``dimension`` says in what sense (a "K" may be a temperature or an
    energy), in the words of `meanfree.units`. ``per`` is the number of counted molecules per
    event where a rate constant was written as loss or formation of one gas, else 1. ``default``
    marks a value that the reader did not give.
    """

    value: float
    unit: str = ""
    source: str = ""
    dimension: str = ""
    per: float = 1.0
    default: bool = False

    def __float__(self) -> float:
        return self.value

    def with_value(self, value: float, source: str | None = None) -> Sourced:
        """The same quantity with another SI value (and source, if one is given)."""
        return replace(
            self, value=value, source=self.source if source is None else source, default=False
        )
