"""How a signal follows the parameters that a measurement is to find, samples drawn or not."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from meanfree import units
from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input
from meanfree.planning.drawing import Drawing
from meanfree.planning.goal import SHARP
from meanfree.planning.readings import Kind, Reading

STEP = 0.01
SHIFTS = np.array([-2.0, -1.0, 1.0, 2.0]) * STEP


def is_relative(known: Input) -> bool:
    """Whether errors of a parameter are stated relative to it: not where it is 0."""
    return known.value != 0


class Following:
    """The signal and its derivatives by the parameters, at times of choice.

    ``kind`` of ``gas`` is read; ``takes`` is the fraction of the contents that each sample takes.
    Raises InputError where a parameter is so near its bound that it cannot be shifted.
    """

    def __init__(
        self,
        experiment: Experiment,
        kind: Kind,
        gas: str,
        parameters: Sequence[str],
        known: Mapping[str, Input],
        takes: float = 0.0,
    ) -> None:
        self.parameters, self.known, self.takes = tuple(parameters), known, takes
        self.scales = [_scale(experiment, known[address]) for address in parameters]
        rows = 4 * len(parameters) + 1
        conditions = {address: np.full(rows, known[address].value) for address in parameters}
        for place, address in enumerate(parameters):
            conditions[address][4 * place : 4 * place + 4] += self.scales[place] * SHIFTS
        try:
            self.drawing = Drawing(experiment, conditions, Reading(kind, gas), takes, SHARP)
        except InputError:
            raise _near_bound() from None

    def at(self, times: Floats) -> tuple[Floats, Floats]:
        """Signal [SI, shape (m,)] at sorted times, each a sample, and its derivatives by each
        relative parameter (absolute where that is 0) [shape (m, n_parameters)]."""
        read = self.drawing.read(times)
        slopes = _derivative(read[:-1].reshape(len(self.parameters), 4, -1))
        return read[-1], slopes * self._relatively()

    def _relatively(self) -> Floats:
        """From derivatives by shifts to those by the relative parameter [shape (n_parameters,)]."""
        sizes = [
            self.known[address].value if is_relative(self.known[address]) else 1.0
            for address in self.parameters
        ]
        return np.asarray(np.array(sizes) / np.array(self.scales))


def _near_bound() -> InputError:
    return InputError.at(
        "plan.samples.parameters", "a parameter near its bound", "one that can change by 2 %"
    )


def _scale(experiment: Experiment, known: Input) -> float:
    """By what a parameter is shifted, over `STEP`: so much that rates change by about as much.

    RT for an energy, a twentieth for a temperature, else the number itself.
    """
    dimension = known.quantity.dimension
    if dimension == "molar energy":
        return units.from_si(R * experiment.temperature.initial, known.unit, dimension)
    if dimension == "temperature":
        return (known.value - known.low) / 20.0
    return known.value if is_relative(known) else 1.0


def _derivative(read: Floats) -> Floats:
    """Five-point derivative of readings at shifted parameters, shape (m, p)."""
    a, b, c, d = (read[:, i] for i in range(4))
    slopes = (a - 8 * b + 8 * c - d) / (12 * STEP)
    if not np.isfinite(slopes).all():
        raise _near_bound()
    return slopes.T
