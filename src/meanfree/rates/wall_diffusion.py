"""First eigenvalues of diffusion in a vessel whose wall takes some of what strikes it.

In a sphere, a long cylinder or between plates of half-width a the slowest mode of diffusion
with D dn/dr = -h n at the wall decays as exp(-x^2 D t/a^2), with B = h a/D and

    sphere    1 - x cot x = B        x^2 from 3 B to pi^2
    cylinder  x J1(x)/J0(x) = B      x^2 from 2 B to 2.405^2
    slab      x tan x = B            x^2 from B to (pi/2)^2

(H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., 1959, sections 3.11,
7.7 and 9.4, from memory). A root of such an equation cannot stand in a formula that sympy
differentiates and a compiled kernel evaluates, and it cannot be found beforehand, for B follows
pressure and temperature through D. So x^2 is a ratio of polynomials in B, fitted to the roots in
50 digits: closed, smooth, good to 6e-13 for every B from 0 to infinity, and free of
cancellation, because every coefficient is positive.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal

Geometry = Literal["sphere", "cylinder", "slab"]

_RATIOS: dict[str, tuple[tuple[float, ...], tuple[float, ...]]] = {
    "sphere": (
        (
            3.0000000000011706,
            6.669231472064998,
            5.932762519591092,
            3.1541284111830006,
            1.1301381999728397,
            0.28366262800715397,
            0.04934154516516831,
            0.005533690858964995,
            0.00031753726013901987,
        ),
        (
            1.0,
            1.4230771574125376,
            1.0162686364203568,
            0.46759205011731164,
            0.15056375316635137,
            0.03471439157929122,
            0.005624370374963152,
            0.0005928533587646822,
            3.217325104784538e-05,
        ),
    ),
    "cylinder": (
        (
            2.0000000000000675,
            5.222843386190558,
            5.721438831633959,
            3.6920389562016047,
            1.5711853754827607,
            0.45707479644263266,
            0.08964621238264946,
            0.010964889726530315,
            0.0006526636084183859,
        ),
        (
            1.0,
            1.8614216931012784,
            1.6729864791575795,
            0.94001330654822,
            0.359795180031848,
            0.09603480488415936,
            0.017510031041028665,
            0.0020088500368726017,
            0.00011285537290346001,
        ),
    ),
    "slab": (
        (
            1.0000000000000002,
            3.25962445034507,
            4.590079801099985,
            3.7476921542200228,
            1.9654472877206626,
            0.6831803193458033,
            0.1546055143654131,
            0.020945193055307537,
            0.0013095771036347919,
        ),
        (
            1.0,
            2.5929577836784805,
            3.105885723089401,
            2.2389781251381775,
            1.061230977672209,
            0.33866875783415484,
            0.07114802186053387,
            0.009019518616768533,
            0.0005307516088447265,
        ),
    ),
}
"""x^2 = B/(1 + B) P(B)/Q(B): coefficients of P and of Q, lowest power first."""


def eigenvalue_over_biot(B: Any, geometry: Geometry) -> Any:
    """x^2/B for B = h a/D from 0 to 1e30, by plain arithmetic (numbers, arrays, sympy) [1].

    >>> round(eigenvalue_over_biot(0.0, "sphere"), 9)
    3.0
    >>> round(1e9 * eigenvalue_over_biot(1e9, "sphere"), 6)  # pi^2
    9.869604
    """
    top, bottom = _RATIOS[geometry]
    return _polynomial(top, B) / ((1 + B) * _polynomial(bottom, B))


def _polynomial(coefficients: Sequence[float], B: Any) -> Any:
    total: Any = 0.0
    for coefficient in reversed(coefficients):
        total = coefficient + B * total
    return total
