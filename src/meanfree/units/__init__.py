"""The edge at which text becomes SI: quantities with units, read behind our own gate.

pint knows the units; the gate decides what text may reach it, so that nothing is evaluated
and nothing is guessed. Everything about pint stays in this room, imported on first use.
"""

from __future__ import annotations

from meanfree.units.dimensions import (
    any_phrase,
    equilibrium_constant,
    phrase,
    rate_constant,
    rate_constant_in_pressures,
    si_unit,
)
from meanfree.units.gate import QuantityError
from meanfree.units.reading import from_si, read, read_any, read_number, to_si

__all__ = [
    "QuantityError",
    "any_phrase",
    "equilibrium_constant",
    "from_si",
    "phrase",
    "rate_constant",
    "rate_constant_in_pressures",
    "read",
    "read_any",
    "read_number",
    "si_unit",
    "to_si",
]
