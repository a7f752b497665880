"""The textbook's straight line: readings turned into 1/c, ln c or c^(1-q) and laid along a ruler.

It is here so that published values can be matched. It changes the scatter of the readings: with
1/c the last, smallest concentrations rule the slope. The fit of the signal does not have that flaw.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from meanfree import units
from meanfree.constants import N_A, R
from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.mechanism import Step
from meanfree.measured.runs import MeasuredRun
from meanfree.measured.straight_lines import Line, straight_line


@dataclass(frozen=True)
class IntegratedLine:
    """An integrated law as a line of one run.

    ``k`` is that of ``step`` per event [SI], ``k_error`` its standard error, ``per_event`` how many
    molecules of ``gas`` one event takes, ``order`` the order in it. ``ordinate`` says what is laid
    off against time, ``how`` how the concentration was had from the readings.
    """

    run: str
    step: str
    gas: str
    order: float
    per_event: float
    line: Line
    k: float
    k_error: float
    ordinate: str
    how: str


def integrated_line(run: MeasuredRun) -> IntegratedLine:
    """The line of a run whose only step takes one gas at an order of its own.

    Raises InputError where there is no such line, or a reading that it cannot show.
    """
    step, gas, order = _single(run)
    loss = -step.net[gas]
    c, how = _concentration(run, step, gas)
    t = run.readings.times
    if np.any(c <= 0):
        line_number = run.readings.lines[int(np.flatnonzero(c <= 0)[0])]
        raise InputError.at(
            "fit.weighting",
            f"a reading of {run.name} (line {line_number}) that leaves no {gas}",
            'weighting = "signal", which can use it',
        )
    y, ordinate = _straightened(c, order, gas)
    try:
        line = straight_line(t, y)
    except ValueError as error:
        raise InputError.at("fit.weighting", str(error), "more readings") from None
    return IntegratedLine(
        run.name,
        step.name,
        gas,
        order,
        loss,
        line,
        line.slope / loss,
        line.slope_error / loss,
        ordinate,
        how,
    )


def _single(run: MeasuredRun) -> tuple[Step, str, float]:
    experiment = run.experiment
    expected = 'weighting = "signal"'
    if experiment.constant_temperature is None:
        raise InputError.at("fit.weighting", "a temperature that changes", expected)
    if len(experiment.steps) != 1 or experiment.steps[0].reverse is not None:
        found = "more than one step, or one that goes back: no straight line"
        raise InputError.at("fit.weighting", found, expected)
    step = experiment.steps[0]
    orders = {gas: order for gas, order in step.orders.items() if order != 0}
    if len(orders) != 1 or step.bath is not None or step.net.get(next(iter(orders)), 0.0) >= 0:
        found = f"{step.reaction}, whose rate depends on more than one gas that it uses up"
        raise InputError.at("fit.weighting", found, expected)
    if not experiment.vessel.is_rigid or experiment.vessel.dead_space is not None:
        found = "a vessel with a piston or dead space, for which the textbook has no line"
        raise InputError.at("fit.weighting", found, expected)
    gas, order = next(iter(orders.items()))
    return step, gas, order


def _straightened(c: Floats, order: float, gas: str) -> tuple[Floats, str]:
    if order == 1:
        return -np.log(c), f"−ln c({gas})"
    power = order - 1
    words = f"1/c({gas})" if order == 2 else f"c({gas})^(1−{order:g})/({order:g}−1)"
    return np.asarray(c**-power / power), words


def _concentration(run: MeasuredRun, step: Step, gas: str) -> tuple[Floats, str]:
    """c of the gas [mol/m^3] worked out of the readings, and how."""
    readings, experiment = run.readings, run.experiment
    T, kind = experiment.temperature.initial, readings.signal.kind
    start = experiment.moles[gas] / experiment.initial_volume
    if kind == "total pressure":
        change = step.change_of_moles
        if change == 0:
            found = f"total pressure of {step.reaction}, which does not change it"
            raise InputError.at("fit.weighting", found, "another signal")
        p = readings.values
        first = float(p[0]) if readings.times[0] == 0 else experiment.initial_pressure
        at_start = first * experiment.moles[gas] / sum(experiment.moles.values())
        factor = step.net[gas] / change
        sign = "−" if factor < 0 else "+"
        how = f"p({gas}) = p0({gas}) {sign} {abs(factor):.4g} (p − p0)"
        return (at_start + factor * (p - first)) / (R * T), how
    if readings.signal.gases != (gas,):
        found = f"{readings.signal.words}, which does not tell {gas} alone"
        raise InputError.at("fit.weighting", found, f"a signal of {gas}")
    if kind == "concentration":
        return readings.values, "as read"
    if kind == "partial pressure":
        return readings.values / (R * T), "c = p/RT"
    if kind == "number density":
        return readings.values / N_A, "c = n/N_A"
    if kind == "conversion":
        return start * (1 - readings.values), "c = c0 (1 − X)"
    found = f"{readings.signal.words}, from which no concentration is worked out here"
    raise InputError.at("fit.weighting", found, 'weighting = "signal"')


def in_file(line: IntegratedLine, run: MeasuredRun) -> tuple[float, float, str]:
    """(k, its error, unit) of a line in the unit of the case, per event."""
    step = run.experiment.steps[0]
    dimension = units.rate_constant(step.order)
    quantity = step.law.inputs().get(step.law.counted)
    unit = quantity.unit if quantity is not None and quantity.unit else units.si_unit(dimension)
    return (
        units.from_si(line.k, unit, dimension),
        units.from_si(line.k_error, unit, dimension),
        unit,
    )
