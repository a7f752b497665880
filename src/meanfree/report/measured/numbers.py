"""Numbers with their errors, as a reader wants them: no digit that says nothing."""

from __future__ import annotations

import math

from meanfree import units
from meanfree.measured.fits import Estimate
from meanfree.measured.straight_lines import Interval
from meanfree.report import wording

OPEN = "open"


def with_error(value: float, error: float, unit: str = "") -> str:
    """A number with its standard error, which has two digits: ``0.8800 ± 0.0037 L/mol/min``.

    >>> with_error(0.87999, 0.0036949), with_error(185714.2, 1775.6), with_error(3.0, math.nan)
    ('0.8800 ± 0.0037', '185 700 ± 1 800', '3.00')
    >>> with_error(0.0021250, 2.9e-6), with_error(1.859e7, 4.9e5)
    ('(2.1250 ± 0.0029) × 10⁻³', '(1.859 ± 0.049) × 10⁷')
    """
    tail = f" {wording.pretty_unit(unit)}" if unit else ""
    if not (math.isfinite(error) and error > 0 and math.isfinite(value)):
        return wording.number(value) + tail
    digits = significant(value, error)
    power = math.floor(math.log10(max(abs(value), error)))
    if -4 < power < 6 and math.floor(math.log10(error)) > -4:
        return f"{wording.number(value, digits)} ± {wording.number(error, 2)}{tail}"
    scale = 10.0**power
    mantissa = wording.number(value / scale, digits)
    small = wording.number(error / scale, 2)
    return f"({mantissa} ± {small}) × {wording.power_of_ten(scale)}{tail}"


def significant(value: float, error: float) -> int:
    """Digits of a value so that it ends where two digits of its error end."""
    if value == 0 or not math.isfinite(error) or error <= 0:
        return 3
    gap = math.floor(math.log10(abs(value))) - math.floor(math.log10(error))
    return min(max(gap + 2, 2), 12)


def interval(low: float, high: float, error: float = math.nan) -> str:
    """A 95 % interval: ``0.872 to 0.888``, with open ends named."""
    if not (math.isfinite(low) or math.isfinite(high)):
        return OPEN
    if not math.isfinite(high):
        return f"above {_end(low, error)}"
    if not math.isfinite(low) or (low == 0 and high > 0):
        return f"below {_end(high, error)}"
    return f"{_end(low, error)} to {_end(high, error)}"


def _end(value: float, error: float) -> str:
    return wording.number(value, significant(value, error))


def of_interval(found: Interval, factor: float = 1.0, unit: str = "") -> str:
    """A number with its 95 % interval: ``185.7 kJ/mol (181.5 to 189.9)``."""
    error = found.error * factor
    digits = significant(found.value * factor, error)
    value = wording.number(found.value * factor, digits)
    tail = f" {wording.pretty_unit(unit)}" if unit else ""
    return f"{value}{tail} ({interval(found.low * factor, found.high * factor, error)})"


def estimate(one: Estimate) -> str:
    """An estimate with its standard error and unit."""
    return with_error(one.value, one.stderr, one.parameter.unit)


def limits(one: Estimate) -> str:
    """The 95 % interval of an estimate."""
    return interval(one.low, one.high, one.stderr)


def deviation(value: float, unit: str, dimension: str) -> str:
    """A standard deviation [SI] in a unit, without the zero of its scale."""
    zero = units.from_si(0.0, unit, dimension)
    tail = f" {wording.pretty_unit(unit)}" if unit else ""
    return wording.number(units.from_si(value, unit, dimension) - zero, 2) + tail


def finite(value: float | None) -> float | None:
    """A number for JSON: null where it is not finite."""
    return value if value is not None and math.isfinite(value) else None
