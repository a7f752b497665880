"""The kernel's arithmetic gives the same equations as the other readers of a System."""

from __future__ import annotations

import numpy as np
import pytest
from random_experiments import FRAMES, random_experiment, random_state
from tape_values import values_of

from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.build import build_system
from meanfree.equations.system import Segment
from meanfree.kernel.balances import Balances
from meanfree.kernel.parameters import Variation, parameter
from meanfree.kernel.slots import Layout
from meanfree.kernel.tape import Tape

INDICES = range(2 * len(FRAMES))


def matrices(index: int, border: bool, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """dy/dt and J of the kernel at a state, the baths' unknowns put in again."""
    system = build_system(random_experiment(index))
    layout = Layout(system, 6)
    balances, tape = Balances(layout, border), Tape()
    state = [tape.input(layout.state + i) for i in range(layout.size)]
    rhs, jacobian = balances.both(tape, state)
    variation = Variation(system, 1)
    numbers = [parameter(layout, variation, name)[0] for name in layout.parameters]
    slots = {layout.first_parameter + i: value for i, value in enumerate(numbers)}
    slots |= {layout.state + i: value for i, value in enumerate(y)}
    values = values_of(tape, slots)
    J = np.zeros((balances.unknowns, balances.unknowns))
    for (row, column), value in jacobian.items():
        J[row, column] = values[value]
    size = layout.size
    full = J[:size, :size].copy()
    if border:
        for place, weights in enumerate(balances.weights):
            for gas, weight in weights.items():
                full[:, gas] += J[:size, size + place] * weight
    return np.array([values[v] for v in rhs]), full


@pytest.mark.parametrize("border", [False, True])
@pytest.mark.parametrize("index", INDICES)
def test_right_hand_side_and_jacobian(index: int, border: bool) -> None:
    system = build_system(random_experiment(index))
    first = system.segments[0]
    y = random_state(index, system)
    t = 10.0
    arrays = ArrayEquations(system)
    dy, J = arrays.derivative(t, y, first), arrays.jacobian(t, y, first).toarray()
    z = y
    if system.mode == "program":
        z = np.append(y, first.temperature + first.slope * t)
    rhs, full = matrices(index, border, z)
    # The same terms in another order. exp(-E/RT) turns rounding of an exponent of 100 into 2e-14.
    # G = H - TS loses up to a factor of 30 more.
    scale = np.abs(J) @ np.abs(y) + np.abs(dy)
    assert np.all(np.abs(rhs[: len(y)] - dy) <= 1e-11 * scale)
    rows = np.abs(J).max(axis=1)[:, None] + np.abs(dy)[:, None] / np.abs(y).max()
    assert np.all(np.abs(full[: len(y), : len(y)] - J) <= 1e-10 * np.abs(J) + 1e-11 * rows)
    if system.mode == "program":
        # T is a state of the kernel alone: its column is a derivative by temperature.
        step = 1e-3
        shifted = [
            arrays.derivative(t, y, Segment(0.0, 1e9, z[-1] + d - first.slope * t, first.slope))
            for d in (step, -step)
        ]
        numeric = (shifted[0] - shifted[1]) / (2 * step)
        # Central difference: step^2/6 of the third derivative, (E/RT^2)^3 k at most 1e-4 of k.
        bound = 1e-6 * np.abs(numeric) + 1e-9 * scale
        assert np.all(np.abs(full[: len(y), -1] - numeric) <= bound)
