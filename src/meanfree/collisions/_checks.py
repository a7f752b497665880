"""Refusals and plain numbers shared by the functions of this room.

Kinetic theory gives a finite answer to many impossible questions (a negative
mass squared away, a temperature in degrees), so each argument is looked at once.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

Numbers: TypeAlias = float | NDArray[np.float64]
"""A number, or an array of numbers that broadcasts with the other arguments."""


def _first_bad(array: NDArray[np.float64], good: NDArray[np.bool_]) -> str:
    """Quote the first value that fails, with its place where there are several."""
    place = tuple(int(index) for index in np.argwhere(~good)[0])
    where = f" at index {', '.join(map(str, place))}" if place else ""
    return f"{float(array[place]):g}{where}"


def _numbers(name: str, value: Numbers, expected: str) -> NDArray[np.float64]:
    array = np.asarray(value)
    if array.dtype.kind not in "iuf":  # text, booleans, complex numbers, objects
        raise ValueError(f"{name}: found {value!r}; expected {expected}")
    return array.astype(np.float64, copy=False)


def positive(name: str, value: Numbers, unit: str) -> NDArray[np.float64]:
    """The argument as floats, each finite and above zero.

    Raises ValueError that names the argument, the first wrong value and the unit.
    """
    expected = f"a finite number above 0 [{unit}]"
    array = _numbers(name, value, expected)
    good = np.isfinite(array) & (array > 0.0)
    if not good.all():
        raise ValueError(f"{name}: found {_first_bad(array, good)}; expected {expected}")
    return array


def not_negative(name: str, value: Numbers, unit: str) -> NDArray[np.float64]:
    """The argument as floats, each finite and not below zero; else ValueError."""
    expected = f"a finite number not below 0 [{unit}]"
    array = _numbers(name, value, expected)
    good = np.isfinite(array) & (array >= 0.0)
    if not good.all():
        raise ValueError(f"{name}: found {_first_bad(array, good)}; expected {expected}")
    return array


def finite(name: str, value: Numbers, unit: str) -> NDArray[np.float64]:
    """The argument as floats, each finite; else ValueError."""
    expected = f"a finite number [{unit}]"
    array = _numbers(name, value, expected)
    good = np.isfinite(array)
    if not good.all():
        raise ValueError(f"{name}: found {_first_bad(array, good)}; expected {expected}")
    return array


def one_temperature(value: float) -> float:
    """A single temperature [K], finite and above zero; else ValueError."""
    kelvin = positive("temperature", value, "K")
    if kelvin.ndim:
        raise ValueError(
            f"temperature: found an array of shape {kelvin.shape}; expected one number [K]"
        )
    return float(kelvin)


def plain(result: NDArray[np.float64] | np.float64) -> Numbers:
    """A Python float for a single number, else the array.

    numpy's own scalars print as ``np.float64(1.5)``, also in generated code.
    """
    return float(result) if np.ndim(result) == 0 else np.asarray(result)
