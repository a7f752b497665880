"""scipy's Radau on the plain balances of `compiled_reference`: the reference of references."""

from __future__ import annotations

from typing import Any

import numpy as np
from compiled_reference import derivative, jacobian, legs, numbers_of
from plain_mechanisms import PlainMechanism


def scipy_radau(
    plain: PlainMechanism, levels: np.ndarray, rtol: float = 1e-12
) -> tuple[np.ndarray, np.ndarray]:
    """The same by scipy's Radau with the same equations; its dense output finds the times."""
    from scipy.integrate import Radau
    from scipy.optimize import brentq

    numbers, y = numbers_of(plain)
    amounts = levels.copy()
    amounts[:, 1] *= y[levels[:, 0].astype(int)]
    found, atol = np.full(len(levels), np.nan), 1e-22 * numbers.setting[7]
    out, J = np.empty_like(y), np.empty((len(y), len(y)))

    for start, end, setting in legs(plain, numbers):
        rest = (*numbers.all[:-1], setting)

        def right(t: float, y: np.ndarray, rest: Any = rest) -> np.ndarray:
            derivative(t, y, *rest, out)
            return out.copy()

        def slopes(t: float, y: np.ndarray, rest: Any = rest) -> np.ndarray:
            jacobian(t, y, *rest, J)
            return J.copy()

        method = Radau(right, start, y, end, rtol=rtol, atol=atol, jac=slopes)
        while method.status == "running":
            before = method.y
            method.step()
            for e, (gas, level) in enumerate(amounts):
                g = int(gas)
                if np.isnan(found[e]) and before[g] > level >= method.y[g]:
                    dense = method.dense_output()
                    found[e] = brentq(
                        lambda t, dense=dense, g=g, level=level: dense(t)[g] - level,
                        method.t_old, method.t, xtol=1e-300, rtol=8.9e-16,
                    )  # fmt: skip
        if method.status == "failed":
            return np.full_like(y, np.nan), np.full_like(found, np.nan)
        y = method.y
    return y, found
