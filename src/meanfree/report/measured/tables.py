"""The CSV files of a fit: parameters, every reading with its residual, and k against T."""

from __future__ import annotations

import math

import numpy as np

from meanfree.measured.analyses import Findings
from meanfree.measured.misfit import curve
from meanfree.report.measured.summarising import counts_of
from meanfree.report.tables import Cell, to_csv


def tables(found: Findings) -> dict[str, str]:
    """File name to text."""
    texts = {}
    if found.fit is not None:
        texts["parameters.csv"] = _parameters(found)
        texts["residuals.csv"] = _residuals(found)
    if found.series:
        texts["temperature_series.csv"] = _series(found)
    return texts


def _parameters(found: Findings) -> str:
    assert found.fit is not None
    header = ("address", "value", "unit", "counts", "stderr", "low_95", "high_95", "start")
    rows = []
    for one in found.fit.estimates:
        parameter = one.parameter
        row: list[Cell] = [parameter.address, one.value, parameter.unit]
        row += [counts_of(found.fit, one), _number(one.stderr), _number(one.low)]
        rows.append([*row, _number(one.high), parameter.start])
    return to_csv(header, rows)


def _residuals(found: Findings) -> str:
    """Readings and curves in SI; the axis is time [s], or temperature [K] of rate constants."""
    fit = found.fit
    assert fit is not None
    header = ("run", "line", "time_s", "T_K", "reading_SI", "fitted_SI", "sd_SI", "residual_in_sd")
    rows: list[list[Cell]] = []
    for place, run in enumerate(fit.request.runs):
        readings = run.readings
        shown = curve(run, place, fit.parameters, fit.values)
        sd = fit.misfit.deviation(place)
        rates = readings.signal.is_rate_constant
        sd = sd * readings.values if rates else sd
        columns = np.stack([readings.times, readings.values, shown, sd, fit.residuals_of(place)])
        for line, (axis, value, fitted, error, r) in zip(readings.lines, columns.T, strict=True):
            at: list[Cell] = [None, float(axis)] if rates else [float(axis), None]
            numbers: list[Cell] = [float(value), float(fitted), float(error), float(r)]
            rows.append([run.name, line, *at, *numbers])
    return to_csv(header, rows)


def _series(found: Findings) -> str:
    header = ("step", "run", "T_K", "k_per_event_SI", "stderr_ln_k", "line_SI", "low_95", "high_95")
    rows: list[list[Cell]] = []
    for one in found.series:
        T = np.array([point.temperature for point in one.points])
        low, high = one.band(T)
        for point, line, bottom, top in zip(one.points, one.k(T), low, high, strict=True):
            row: list[Cell] = [one.step, point.run, point.temperature, point.k]
            rows.append([*row, _number(point.error), float(line), float(bottom), float(top)])
    return to_csv(header, rows)


def _number(value: float) -> float | None:
    return value if math.isfinite(value) else None
