"""What would be left of a gas if nothing reacted: samples drawn and outflow, kept apart.

theta falls with every sample by what it takes, and between them as exp(-int k_out v/w dt), with
k_out the sum of the outflow's rate constants of that gas and v/w the part of it in the hot vessel.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from meanfree.equations.system import Floats

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(5)


class Outflow:
    """The integral of an outflow's rate constant over time, exact to the integrator's own error.

    ``constant`` gives k_out v/w [1/s] at times [s], within the trajectory; ``times`` are those of
    its accepted steps.
    """

    def __init__(self, times: Floats, constant: Callable[[Floats], Floats]) -> None:
        self.times, self.constant = times, constant
        pieces = self._gauss(times[:-1], times[1:])
        self.cumulative = np.concatenate([[0.0], np.cumsum(pieces)])

    def __call__(self, t: Floats) -> Floats:
        """The integral from 0 to each time."""
        place = np.clip(np.searchsorted(self.times, t, side="right") - 1, 0, len(self.times) - 1)
        return np.asarray(self.cumulative[place] + self._gauss(self.times[place], t))

    def _gauss(self, low: Floats, high: Floats) -> Floats:
        half, middle = 0.5 * (high - low), 0.5 * (high + low)
        nodes = middle[:, None] + half[:, None] * _NODES
        values = self.constant(nodes.ravel()).reshape(nodes.shape)
        return np.asarray(half * (values @ _WEIGHTS))
