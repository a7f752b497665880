"""Collision frequencies and mean free paths of each gas in a mixture, in space and in a plane.

Spheres and discs differ only in the target (an area or a width) and in the mean speed; the
sums over partners are written once. Source: S. Chapman and T. G. Cowling, The Mathematical
Theory of Non-uniform Gases, 3rd ed. (1970), chapter 5.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from meanfree import constants
from meanfree.collisions._checks import not_negative, one_temperature, positive

Floats = NDArray[np.float64]


def mixture_collision_frequencies(
    molar_masses: Floats,
    diameters: Floats,
    concentrations: Floats,
    temperature: float,
) -> Floats:
    """Collisions per second of one molecule of gas i with the molecules of gas j.

    Row i summed is the collision frequency of a molecule of gas i in the mixture.

    Parameters
    ----------
    molar_masses : [kg/mol], shape (n_gases,)
    diameters : [m], shape (n_gases,)
    concentrations : [mol/m^3], shape (..., n_gases)
    temperature : [K]

    Returns
    -------
    [1/s], shape (..., n_gases, n_gases)

    Raises
    ------
    ValueError : shapes that do not agree, or a value that no gas can have

    Source: Chapman and Cowling (1970), chapter 5.

    >>> import numpy as np
    >>> z = mixture_collision_frequencies(
    ...     np.array([0.004, 0.04]), np.array([2.6e-10, 3.4e-10]), np.array([20.0, 20.0]), 300.0)
    >>> [[f"{value:.2e}" for value in row] for row in z]
    [['4.56e+09', '4.50e+09'], ['4.50e+09', '2.47e+09']]
    """
    sizes, amounts, masses = _checked(molar_masses, diameters, concentrations, "mol/m^3")
    areas = 0.25 * np.pi * (sizes[:, None] + sizes) ** 2
    kelvin = one_temperature(temperature)
    return _frequency_matrix(areas, amounts, masses, 8.0 / np.pi * kelvin)


def mixture_mean_free_paths(
    molar_masses: Floats,
    diameters: Floats,
    concentrations: Floats,
) -> Floats:
    """Mean free path of each gas in a mixture, 1 / sum_j n_j sigma_ij sqrt(1 + m_i / m_j).

    Parameters
    ----------
    molar_masses : [kg/mol], shape (n_gases,)
    diameters : [m], shape (n_gases,)
    concentrations : [mol/m^3], shape (..., n_gases), not all zero

    Returns
    -------
    [m], shape (..., n_gases); also for a gas of which only a trace is there

    Raises
    ------
    ValueError : shapes that do not agree, a value that no gas can have, or no gas at all

    Source: Chapman and Cowling (1970), chapter 5.

    >>> import numpy as np
    >>> path = mixture_mean_free_paths(
    ...     np.array([0.004, 0.04]), np.array([2.6e-10, 3.4e-10]), np.array([20.0, 20.0]))
    >>> [f"{value:.2e}" for value in path]
    ['1.39e-07', '5.72e-08']
    """
    sizes, amounts, masses = _checked(molar_masses, diameters, concentrations, "mol/m^3")
    areas = 0.25 * np.pi * (sizes[:, None] + sizes) ** 2
    return _free_paths(areas, amounts, masses)


def plane_mixture_collision_frequencies(
    molar_masses: Floats,
    diameters: Floats,
    concentrations: Floats,
    temperature: float,
) -> Floats:
    """Collisions per second of one disc of gas i with the discs of gas j.

    Parameters
    ----------
    molar_masses : [kg/mol], shape (n_gases,)
    diameters : [m], shape (n_gases,)
    concentrations : [mol/m^2], shape (..., n_gases)
    temperature : [K]

    Returns
    -------
    [1/s], shape (..., n_gases, n_gases)

    Raises
    ------
    ValueError : shapes that do not agree, or a value that no gas can have
    """
    sizes, amounts, masses = _checked(molar_masses, diameters, concentrations, "mol/m^2")
    kelvin = one_temperature(temperature)
    widths = sizes[:, None] + sizes
    return _frequency_matrix(widths, amounts, masses, 0.5 * np.pi * kelvin)


def plane_mixture_mean_free_paths(
    molar_masses: Floats,
    diameters: Floats,
    concentrations: Floats,
) -> Floats:
    """Mean free path of each gas of discs, 1 / sum_j n_j w_ij sqrt(1 + m_i / m_j).

    Parameters
    ----------
    molar_masses : [kg/mol], shape (n_gases,)
    diameters : [m], shape (n_gases,)
    concentrations : [mol/m^2], shape (..., n_gases), not all zero

    Returns
    -------
    [m], shape (..., n_gases)

    Raises
    ------
    ValueError : shapes that do not agree, a value that no gas can have, or no gas at all
    """
    sizes, amounts, masses = _checked(molar_masses, diameters, concentrations, "mol/m^2")
    return _free_paths(sizes[:, None] + sizes, amounts, masses)


def _checked(
    molar_masses: Floats, diameters: Floats, concentrations: Floats, unit: str
) -> tuple[Floats, Floats, Floats]:
    """Diameters, concentrations and molar masses of a mixture, looked at.

    Raises ValueError where the shapes do not agree or a value is impossible.
    """
    masses = positive("molar_masses", molar_masses, "kg/mol")
    sizes = positive("diameters", diameters, "m")
    amounts = not_negative("concentrations", concentrations, unit)
    if masses.ndim != 1 or sizes.shape != masses.shape or amounts.shape[-1:] != masses.shape:
        raise ValueError(
            "molar_masses, diameters, concentrations: found shapes "
            f"{masses.shape}, {sizes.shape}, {amounts.shape}; "
            "expected (n_gases,), (n_gases,), (..., n_gases)"
        )
    return sizes, amounts, masses


def _frequency_matrix(
    targets: Floats, concentrations: Floats, masses: Floats, shape_kelvin: float
) -> Floats:
    """Collisions per second of one molecule of i with gas j [1/s], shape (..., n, n).

    ``targets`` is sigma_ij [m^2] or the swept width [m]; the mean relative speed is
    sqrt(shape_kelvin R / mu), so ``shape_kelvin`` is 8 T / pi in space, pi T / 2 in a plane.
    """
    reduced = masses[:, None] * masses / (masses[:, None] + masses)
    speeds = np.sqrt(shape_kelvin * constants.R / reduced)
    return np.asarray(constants.N_A * targets * speeds * concentrations[..., None, :])


def _free_paths(targets: Floats, concentrations: Floats, masses: Floats) -> Floats:
    """Mean free path of each gas [m], shape (..., n): mean speed over collision frequency.

    The ratio of mean relative speed to mean speed is sqrt(1 + m_i / m_j) in any number of
    dimensions, so the temperature drops out. Raises ValueError where there is no gas.
    """
    empty = ~(concentrations > 0.0).any(axis=-1)
    if np.any(empty):
        raise ValueError("concentrations: found no gas at all; expected at least one above 0")
    ratios = np.sqrt(1.0 + masses[:, None] / masses)
    encounters = constants.N_A * targets * ratios * concentrations[..., None, :]
    return np.asarray(1.0 / np.sum(encounters, axis=-1))
