"""What an instrument shows of the gas in the vessel: the kinds of signal and their prediction.

A fit compares readings with the signal itself and not with something worked out of it, so that
the scatter of the instrument stays what it is.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from meanfree.constants import N_A, R
from meanfree.equations.system import Floats
from meanfree.measured.prediction import Prediction
from meanfree.sourced import Sourced

ABSORBANCE = "absorbance"
RATE_CONSTANT = "rate constant"
TOTAL_PRESSURE = "total pressure"

DIMENSIONS: dict[str, str] = {
    TOTAL_PRESSURE: "pressure",
    "partial pressure": "pressure",
    "concentration": "concentration",
    "number density": "number density",
    "conversion": "fraction",
    "mole fraction": "fraction",
    ABSORBANCE: "pure",
}
"""The kinds of signal that are read against time, with the dimension of each."""

LEAST: dict[str, bool] = {TOTAL_PRESSURE: True, "partial pressure": True}
"""Kinds of which a negative reading is impossible and not scatter about zero."""

_WRITTEN = re.compile(r"(?P<kind>[a-z]+(?: [a-z]+)?)(?: of (?P<of>.+))?")


@dataclass(frozen=True)
class Signal:
    """What a column of readings is.

    ``gases`` are summed, none for the total pressure. For an absorbance ``path`` [m] is the length
    of the light's way through the gas and ``coefficients`` map each absorbing gas to its
    coefficient as A = path sum(coefficient c): [m^2/mol] in the base of the readings.
    ``step`` is that of a measured rate constant, ``order`` its overall order, and ``per`` what it
    counts over events: the readings divided by it are per event.
    """

    kind: str
    gases: tuple[str, ...] = ()
    path: Sourced | None = None
    coefficients: Mapping[str, Sourced] = field(default_factory=dict)
    step: str = ""
    order: float = 0.0
    per: float = 1.0

    @property
    def is_rate_constant(self) -> bool:
        """True where the readings are rate constants against temperature."""
        return self.kind == RATE_CONSTANT

    @property
    def words(self) -> str:
        """As it is written in a case: ``concentration of A + B``."""
        if self.is_rate_constant:
            return f"{RATE_CONSTANT} of {self.step}"
        return f"{self.kind} of {' + '.join(self.gases)}" if self.gases else self.kind


def take_apart(text: str) -> tuple[str, tuple[str, ...]] | None:
    """(kind, names) of ``"concentration of A + B"``; None where it is no kind that we know.

    >>> take_apart("partial pressure of NO + NO2"), take_apart("colour")
    (('partial pressure', ('NO', 'NO2')), None)
    """
    found = _WRITTEN.fullmatch(" ".join(text.split()))
    if found is None or found["kind"] not in {*DIMENSIONS, RATE_CONSTANT}:
        return None
    kind, of = found["kind"], found["of"]
    if kind == RATE_CONSTANT:
        return None if of is None else (kind, (of.strip(),))
    if (kind == TOTAL_PRESSURE) != (of is None) and kind != ABSORBANCE:
        return None
    names = tuple(part.strip() for part in (of or "").split(" + ")) if of else ()
    return kind, names


def predicted(signal: Signal, prediction: Prediction) -> Floats:
    """The signal that a prediction would give [SI, shape (n_times,)]."""
    if signal.kind == TOTAL_PRESSURE:
        return prediction.pressure
    if signal.kind == ABSORBANCE:
        assert signal.path is not None, "the loader asks for the path"
        absorbing = [
            coefficient.value * prediction.concentration(gas)
            for gas, coefficient in signal.coefficients.items()
        ]
        return np.asarray(signal.path.value * np.sum(absorbing, axis=0))
    if signal.kind == "conversion":
        left = np.sum([prediction.amount(gas) for gas in signal.gases], axis=0)
        start = sum(prediction.filled(gas) for gas in signal.gases)
        return np.asarray(1.0 - left / (start * prediction.retained))
    c = np.asarray(np.sum([prediction.concentration(gas) for gas in signal.gases], axis=0))
    if signal.kind == "partial pressure":
        return np.asarray(c * R * prediction.temperature)
    if signal.kind == "number density":
        return c * N_A
    if signal.kind == "mole fraction":
        return np.asarray(c / prediction.total_concentration)
    return c


@dataclass(frozen=True)
class Change:
    """How a prediction changes with something: the derivatives of its parts.

    ``x`` [shape (n_gases, n_times)], ``spread``, ``temperature`` and ``retained`` [(n_times,)],
    ``filled`` [(n_gases,)] of the amounts over V(0) at time zero.
    """

    x: Floats
    spread: Floats
    temperature: Floats
    retained: Floats
    filled: Floats


def changed(signal: Signal, at: Prediction, by: Change) -> Floats:
    """The derivative of `predicted` [SI, shape (n_times,)]."""
    gases = at.system.gases

    def concentration(x: Floats, dx: Floats) -> Floats:
        return np.asarray(dx / at.spread - x * by.spread / at.spread**2)

    total, d_total = at.total_concentration, concentration(at.x.sum(axis=0), by.x.sum(axis=0))
    if signal.kind == TOTAL_PRESSURE:
        return np.asarray(R * (d_total * at.temperature + total * by.temperature))
    if signal.kind == ABSORBANCE:
        assert signal.path is not None, "the loader asks for the path"
        places = [(gases.index(gas), c.value) for gas, c in signal.coefficients.items()]
        each = [c * concentration(at.x[i], by.x[i]) for i, c in places]
        return np.asarray(signal.path.value * np.sum(each, axis=0))
    summed = [gases.index(gas) for gas in signal.gases]
    x, dx = at.x[summed].sum(axis=0), by.x[summed].sum(axis=0)
    if signal.kind == "conversion":
        filled, d_filled = sum(at.filled(gas) for gas in signal.gases), by.filled[summed].sum()
        start = filled * at.retained
        d_start = d_filled * at.retained + filled * by.retained
        return np.asarray(-dx / start + x * d_start / start**2)
    c, dc = x / at.spread, concentration(x, dx)
    if signal.kind == "partial pressure":
        return np.asarray(R * (dc * at.temperature + c * by.temperature))
    if signal.kind == "number density":
        return dc * N_A
    if signal.kind == "mole fraction":
        return np.asarray(dc / total - c * d_total / total**2)
    return dc


def coefficient_as_used(value: float, *, per_molecule: bool, base: str, written: str) -> float:
    """An absorption coefficient [m^2/mol] in the base of the readings.

    ``value`` [m^2/mol], or [m^2] ``per_molecule``, holds in the base ``written`` ("10" or "e");
    the readings are in ``base``. A cross-section is a matter of natural logarithms.
    """
    molar = value * N_A if per_molecule else value
    if written == base:
        return molar
    return molar / math.log(10) if base == "10" else molar * math.log(10)
