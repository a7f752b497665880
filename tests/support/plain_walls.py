"""Loss on a wall as a textbook writes it: roots found, not fitted; complex numbers allowed."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.constants import R
from scipy.optimize import brentq
from scipy.special import j0, j1

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import Step
from meanfree.rates.wall import Wall


def on_the_wall(experiment: Experiment, law: Wall, step: Step, T: Any, p: Any) -> Any:
    """gamma v S/4V; 1/k = L^2/D + 2 V (2 - gamma)/(gamma v S); or the slowest mode x^2 D/a^2.

    In a sphere L = r/pi, in a cylinder 1/L^2 = (2.405/r)^2 + (pi/length)^2.
    """
    mass = experiment.gas_named[step.reactants[0][0]].molar_mass.value
    v, gamma = np.sqrt(8 * R * T / (np.pi * mass)), law.uptake.value
    volume, shape = experiment.vessel.volume.value, experiment.vessel.shape
    if shape.form == "sphere":
        radius = (3 * volume / (4 * np.pi)) ** (1 / 3)
        surface, curvature = 3 / radius, (np.pi / radius) ** 2
    else:
        length = shape.length.value
        radius = (volume / (np.pi * length)) ** 0.5
        surface = 2 / radius + 2 / length
        curvature = (2.404825557695773 / radius) ** 2 + (np.pi / length) ** 2
    if law.form == "uptake only":
        return gamma * v / 4 * surface
    power = (T / law.diffusion_at.value) ** law.diffusion_power.value
    D = law.diffusion.value * power * law.diffusion_pressure.value / p
    if law.form == "quick":
        return 1 / (1 / curvature / D + 2 * (2 - gamma) / (gamma * v * surface))
    h = gamma * v / (2 * (2 - gamma))
    if shape.form == "sphere":
        return (_mode("sphere", h * radius / D) / radius) ** 2 * D
    across = (_mode("cylinder", h * radius / D) / radius) ** 2
    return (across + (_mode("slab", h * length / 2 / D) * 2 / length) ** 2) * D


_MODES = {
    "sphere": (np.pi, lambda x: 1 - x / np.tan(x), lambda x: x / np.sin(x) ** 2 - 1 / np.tan(x)),
    "cylinder": (
        2.404825557695773,
        lambda x: x * j1(x) / j0(x),
        lambda x: x * (1 + (j1(x) / j0(x)) ** 2),
    ),
    "slab": (np.pi / 2, lambda x: x * np.tan(x), lambda x: np.tan(x) + x / np.cos(x) ** 2),
}
"""End of the first branch, B of the first eigenvalue x, and dB/dx (Carslaw and Jaeger, 1959)."""


def _mode(geometry: str, B: Any) -> Any:
    """The first eigenvalue; its change under a complex step follows from dB/dx."""
    end, biot, slope = _MODES[geometry]
    x = brentq(lambda x: biot(x) - np.real(B), 1e-9, end * (1 - 1e-12), xtol=1e-15, rtol=1e-15)
    return x + 1j * np.imag(B) / slope(x) if np.iscomplexobj(B) else x
