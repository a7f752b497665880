"""Published stiff problems as mechanisms, with their reference solutions."""

from __future__ import annotations

import numpy as np
from laboratory import experiment, step

# Robertson (1966); reference values at t = 1e11 from the Bari/CWI test set for IVP solvers
# and Hairer & Wanner, Solving Ordinary Differential Equations II. All printed digits.
ROBER_END = np.array([2.0833401497e-08, 8.33336077033e-14, 0.999999979167])

# Schafer (1975), Gottwald (1977); reference values at t = 321.8122 from the IVP test set.
HIRES_END = np.array(
    [
        0.000737131257333,
        0.000144248572632,
        5.88872974097e-05,
        0.00117565134328,
        0.00238635619883,
        0.00623896825274,
        0.00284999839519,
        0.00285000160481,
    ]
)


def rober():
    """Robertson's problem: three labels, rates over nine decades."""
    steps = [
        step("A -> B", 0.04),
        step("2 B -> B + C", 3e7),
        step("B + C -> A + C", 1e4),
    ]
    return experiment(steps, {"A": 1.0}, until=1e11)


def hires():
    """As a mechanism: conversions of labels, one bimolecular step, and a zero-order source."""
    steps = [
        step("y1 -> y2", 1.71),
        step("y2 -> y1", 0.43),
        step("y3 -> y1", 8.32),
        step(" -> y1", 0.0007, "source"),
        step("y2 -> y4", 8.32),
        step("y3 -> y4", 1.71),
        step("y4 -> y3", 0.43),
        step("y5 -> y3", 0.035),
        step("y4 -> y6", 0.69),
        step("y5 -> y6", 1.71),
        step("y6 -> y5", 0.43),
        step("y7 -> y5 + y8", 0.43),
        step("y6 + y8 -> y7", 280.0),
        step("y7 -> y6 + y8", 0.69),
        step("y7 -> y8", 0.69),
    ]
    gases = [f"y{i}" for i in range(1, 9)]
    fill = dict.fromkeys(gases, 0.0) | {"y1": 1.0, "y8": 0.0057}
    return experiment(steps, fill, until=321.8122)


def ladder(n, until=1e3):
    """n labels in a row, each turning into its neighbours and meeting those two away.

    Made up; the Jacobian has five diagonals, so its factors stay sparse. Rates over six decades.
    """
    from meanfree.gases.gas import Gas

    random = np.random.default_rng(1)

    def k():
        return float(10 ** random.uniform(-3, 3))

    steps = []
    for i in range(n - 1):
        steps += [step(f"A{i} -> A{i + 1}", k()), step(f"A{i + 1} -> A{i}", k())]
    for i in range(n - 2):
        steps.append(step(f"A{i} + A{i + 2} -> 2 A{i + 1}", k()))
        steps.append(step(f"2 A{i + 1} -> A{i} + A{i + 2}", k()))
    gases = [Gas.label(f"A{i}") for i in range(n)]
    return experiment(steps, {"A0": 1.0, f"A{n // 2}": 1.0}, gases=gases, until=until)
