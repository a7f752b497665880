"""Rosenbrock methods as numbers: coefficients, error estimate and dense output.

Notation of Hairer and Wanner, Solving Ordinary Differential Equations II, section IV.7: with
``u_i`` the scaled stages, (1/(h gamma) I - J) u_i = f(y + sum a_ij u_j) + sum (c_ij/h) u_j. The
last stage is the error estimate, and y1 = y + sum a_sj u_j + u_s.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Tableau:
    """A stiffly accurate Rosenbrock method with s stages.

    ``a``, ``c`` [1, shape (s, s)] are strictly lower triangular; ``dense`` [1, shape (s, d)] gives
    the d coefficient vectors of the dense output, y(theta) = (1 - theta) y0 + theta (y1 + (1 -
    theta) (k_1 + theta (k_2 + …))), k_j = sum dense_ij u_i. ``order`` is that of the method,
    ``error_order`` that of the embedded one.
    """

    name: str
    order: int
    error_order: int
    gamma: float
    a: Floats
    c: Floats
    dense: Floats
    source: str

    @property
    def stages(self) -> int:
        """Number of stages."""
        return len(self.a)

    @property
    def weights(self) -> Floats:
        """y1 = y + sum weights_i u_i."""
        weights = self.a[-1].copy()
        weights[-1] += 1.0
        return np.asarray(weights, float)

    def classical(self) -> tuple[Floats, Floats, Floats]:
        """(alpha, Gamma, b) of the untransformed method, Gamma with gamma on its diagonal.

        Gamma = (I/gamma - C)^-1, alpha = a Gamma, b = weights Gamma.
        """
        inverse = np.linalg.inv(np.eye(self.stages) / self.gamma - self.c)
        Gamma: Floats = np.asarray(inverse, np.float64)
        alpha: Floats = np.asarray(self.a @ Gamma, np.float64)
        b: Floats = np.asarray(self.weights @ Gamma, np.float64)
        return alpha, Gamma, b


def _lower(rows: list[list[float]]) -> Floats:
    size = len(rows)
    table = np.zeros((size, size))
    for i, row in enumerate(rows):
        table[i, : len(row)] = row
    return table


_RODAS4_A = [
    [],
    [1.544000000000000],
    [0.9466785280815826, 0.2557011698983284],
    [3.314825187068521, 2.896124015972201, 0.9986419139977817],
    [1.221224509226641, 6.019134481288629, 12.53708332932087, -0.6878860361058950],
]

RODAS4 = Tableau(
    name="RODAS4",
    order=4,
    error_order=3,
    gamma=0.25,
    a=_lower([*_RODAS4_A, [*_RODAS4_A[-1], 1.0]]),
    c=_lower(
        [
            [],
            [-5.6688],
            [-2.430093356833875, -0.2063599157091915],
            [-0.1073529058151375, -9.594562251023355, -20.47028614809616],
            [7.496443313967647, -10.24680431464352, -33.99990352819905, 11.70890893206160],
            [
                8.083246795921522, -7.981132988064893, -31.52159432874371, 16.31930543123136,
                -6.058818238834054,
            ],
        ]
    ),
    dense=np.array(
        [
            [10.12623508344586, -7.487995877610167, -34.80091861555747, -7.992771707568823,
             1.025137723295662, 0.0],
            [-0.6762803392801253, 6.087714651680015, 16.43084320892478, 24.76722511418386,
             -6.594389125716872, 0.0],
        ]
    ).T.copy(),
    source="Hairer and Wanner, Solving Ordinary Differential Equations II, 1996, RODAS",
)  # fmt: skip

_RODAS5P_A = [
    [],
    [3.0],
    [2.849394379747939, 0.45842242204463923],
    [-6.954028509809101, 2.489845061869568, -10.358996098473584],
    [2.8029986275628964, 0.5072464736228206, -0.3988312541770524, -0.04721187230404641],
    [-7.502846399306121, 2.561846144803919, -11.627539656261098, -0.18268767659942256,
     0.030198172008377946],
]  # fmt: skip

RODAS5P = Tableau(
    name="Rodas5P",
    order=5,
    error_order=4,
    gamma=0.21193756319429014,
    a=_lower([*_RODAS5P_A, [*_RODAS5P_A[-1], 1.0], [*_RODAS5P_A[-1], 1.0, 1.0]]),
    c=_lower(
        [
            [],
            [-14.155112264123755],
            [-17.97296035885952, -2.859693295451294],
            [147.12150275711716, -1.41221402718213, 71.68940251302358],
            [165.43517024871676, -0.4592823456491126, 42.90938336958603, -5.961986721573306],
            [24.854864614690072, -3.0009227002832186, 47.4931110020768, 5.5814197821558125,
             -0.6610691825249471],
            [30.91273214028599, -3.1208243349937974, 77.79954646070892, 34.28646028294783,
             -19.097331116725623, -28.087943162872662],
            [37.80277123390563, -3.2571969029072276, 112.26918849496327, 66.9347231244047,
             -40.06618937091002, -54.66780262877968, -9.48861652309627],
        ]
    ),
    dense=np.array(
        [
            [25.948786856663858, -2.5579724845846235, 10.433815404888879, -2.3679251022685204,
             0.524948541321073, 1.1241088310450404, 0.4272876194431874, -0.17202221070155493],
            [-9.91568850695171, -0.9689944594115154, 3.0438037242978453, -24.495224566215796,
             20.176138334709044, 15.98066361424651, -6.789040303419874, -6.710236069923372],
            [11.419903575922262, 2.8879645146136994, 72.92137995996029, 80.12511834622643,
             -52.072871366152654, -59.78993625266729, -0.15582684282751913, 4.883087185713722],
        ]
    ).T.copy(),
    source="Steinebach, BIT Numerical Mathematics 63 (2023) 27, Rodas5P",
)  # fmt: skip

TABLEAUX = {"RODAS4": RODAS4, "Rodas5P": RODAS5P}
