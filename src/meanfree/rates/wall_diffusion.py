"""First eigenvalues of diffusion in a vessel whose wall takes some of what strikes it.

In a sphere, a long cylinder or between plates of half-width a the slowest mode of diffusion
with D dn/dr = -h n at the wall decays as exp(-x^2 D t/a^2), with B = h a/D and

    sphere    1 - x cot x = B        x^2 from 3 B to pi^2
    cylinder  x J1(x)/J0(x) = B      x^2 from 2 B to 2.405^2
    slab      x tan x = B            x^2 from B to (pi/2)^2

(H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., 1959, sections 3.11,
7.7 and 9.4, from memory). A root of such an equation cannot stand in a formula that sympy
differentiates and a compiled kernel evaluates, and it cannot be found beforehand, for B follows
pressure and temperature through D. So x^2/B is a ratio of polynomials in B, fitted to the roots in
50 digits and written as a sum of fractions: closed, smooth, good to 6e-13 for every B from 0 to
infinity, and free of cancellation, because every number in it is positive.
"""

from __future__ import annotations

from typing import Any, Literal

Geometry = Literal["sphere", "cylinder", "slab"]

_FRACTIONS: dict[str, tuple[float, tuple[tuple[float, float, float, float], ...]]] = {
    "sphere": (
        1.4603221231907851e-05,
        (
            (1.5118186292090405, 0.2687706117672333, 14.405673048039716, 2.3306321245461787),
            (6.044296573927887, 1.2793609185929589, 13.753408606293503, 3.7731620572875864),
            (12.61095547672156, 3.215206021135135, 12.873713379004482, 5.5451963525821775),
            (17.986053304889417, 5.106252246368208, 12.185891777746235, 6.777911922007877),
        ),
    ),
    "cylinder": (
        6.987181077565408e-06,
        (
            (0.7897682762586885, 0.18776650434818035, 10.378801608840357, 2.930543610082131),
            (3.0641702842095686, 0.822944234875125, 9.984171684208608, 3.9073011118379677),
            (6.204493239950921, 1.9001337643640586, 9.456132985301105, 5.0808753201089605),
            (8.688919021865582, 2.8723344721780864, 9.042841896814405, 5.881496156725027),
        ),
    ),
    "slab": (
        1.0701725984844968e-06,
        (
            (0.29333915842726865, 0.09834765312553996, 6.900269241377898, 3.492713778707636),
            (1.0972295050136214, 0.3919968544444828, 6.714519655273176, 3.9870710827432725),
            (2.136804908718016, 0.8172528901123443, 6.471098706606301, 4.564745815485676),
            (2.9150418890788243, 1.159802632417373, 6.284195249591138, 4.949329476216959),
        ),
    ),
}
"""x^2/B = w/(1 + B) + sum (p + q B)/(r + s B + B^2): w, and p, q, r, s of each fraction."""


def eigenvalue_over_biot(B: Any, geometry: Geometry) -> Any:
    """x^2/B for B = h a/D from 0 to 1e150, by plain arithmetic (numbers, arrays, sympy) [1].

    >>> round(eigenvalue_over_biot(0.0, "sphere"), 9)
    3.0
    >>> round(1e9 * eigenvalue_over_biot(1e9, "sphere"), 6)  # pi^2
    9.869604
    """
    weight, fractions = _FRACTIONS[geometry]
    total = weight / (1 + B)
    for p, q, r, s in fractions:
        total = total + (p + q * B) / (r + (s + B) * B)
    return total
