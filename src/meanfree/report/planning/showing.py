"""A number of any dimension as a reader wants it, in the units of the case."""

from __future__ import annotations

from meanfree.experiment.experiment import Experiment
from meanfree.report import wording
from meanfree.report.rows import NONE

_LENGTHS = ((1.0, "m"), (1e-2, "cm"), (1e-3, "mm"), (1e-6, "µm"), (1e-9, "nm"))


def shown(value: float | None, dimension: str, experiment: Experiment, digits: int = 3) -> str:
    """An SI value with its unit; a dash where there is none."""
    if value is None:
        return NONE
    units = wording.units_in_use(experiment)
    match dimension:
        case "time":
            return wording.duration(value)
        case "temperature":
            return wording.temperature(value)
        case "temperature difference":
            return f"{wording.number(value, digits)} K"
        case "fraction":
            return wording.percent(value)
        case "length":
            return length(value, digits)
        case "pressure":
            return wording.quantity(value, units.pressure, "pressure", digits)
        case "concentration":
            return wording.quantity(value, units.concentration, "concentration", digits)
        case "amount":
            return wording.quantity(value, units.amount, "amount", digits)
        case "volume":
            return (
                f"{wording.number(value, digits)} m³"
                if value >= 0.1
                else f"{wording.number(value * 1e3, digits)} L"
            )
        case "diffusivity":
            return f"{wording.number(value * 1e4, digits)} cm²/s"
        case "molar energy":
            return f"{wording.number(value * 1e-3, digits)} kJ/mol"
        case "frequency":
            return f"{wording.number(value, digits)} 1/s"
        case "conductance":
            return f"{wording.number(value, digits)} W/K"
    return wording.number(value, digits)


def length(value: float, digits: int = 3) -> str:
    """A length in the unit in which it is a number between one and a thousand, about.

    >>> length(0.15), length(3.2e-7), length(0.0)
    ('15.0 cm', '320 nm', '0 m')
    """
    for size, name in _LENGTHS:
        if value >= size:
            return f"{wording.number(value / size, digits)} {name}"
    return f"{wording.number(value, digits)} m"
