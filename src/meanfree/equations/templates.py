"""The formula of each rate law as compiled functions, with its derivatives.

sympy differentiates every law's template once; numpy evaluates the results. A law whose
coefficient is constant during a run never comes here, so short runs need no sympy.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import Any

from meanfree.rates.law import Template

Compiled = Callable[..., tuple[Any, Any, Any, Any]]

_COMPILED: dict[Template, Compiled] = {}
_DEPENDS: dict[Template, frozenset[str]] = {}


class Symbols:
    """The `Functions` of sympy. Constants stay symbols with ``readable``, else numbers."""

    def __init__(self, readable: bool = False) -> None:
        import sympy

        from meanfree import constants

        self._sympy = sympy
        self.exp, self.log, self.sqrt = sympy.exp, sympy.log, sympy.sqrt
        self.pi = sympy.pi
        self.R: Any = sympy.Symbol("R", positive=True) if readable else constants.R
        self.k_B: Any = sympy.Symbol("k_B", positive=True) if readable else constants.k_B
        self.N_A: Any = sympy.Symbol("N_A", positive=True) if readable else constants.N_A

    def log10(self, x: Any) -> Any:
        """Decimal logarithm."""
        return self._sympy.log(x) / self._sympy.log(10)

    def below(self, x: Any, limit: Any, then: Any, otherwise: Any) -> Any:
        """``then`` where x < limit, else ``otherwise``."""
        from meanfree.equations.branches import choose

        return choose(x, limit, then, otherwise)

    def fall_moment(self, n: int, h: Any) -> Any:
        """The integral of s^n exp(-h s) over s from 0 to 1."""
        from meanfree.equations.branches import fall_moment

        return fall_moment(n, h)

    def piecewise_linear(self, x: Any, xs: Any, ys: Any) -> Any:
        """Linear between the points, the outer pieces continued beyond them."""
        value = None
        for (x0, x1), (y0, y1) in zip(pairwise(xs), pairwise(ys), strict=True):
            piece = y0 + (y1 - y0) / (x1 - x0) * (x - x0)
            value = piece if value is None else self.below(x, x0, value, piece)
        return value


def formula(law: Template, n_slots: int | None = None, readable: bool = False) -> tuple[Any, Any]:
    """(expression, symbols) of a law's template.

    The symbols are T, p, M and then one for each of the law's slots.
    """
    import sympy

    T, p, M = sympy.symbols("T p M", positive=True)
    slots = [sympy.Symbol(name, real=True) for name in law.slots[:n_slots]]
    return law.coefficient(Symbols(readable), T, p, M, slots), (T, p, M, *slots)


def compiled(law: Template) -> Compiled:
    """The compiled template of a law.

    f(T, p, M, *numbers) -> (k, dk/dT, dk/dp, dk/dM), arrays of shape (n_steps,).
    """
    if law not in _COMPILED:
        import sympy

        from meanfree.equations.branches import FOR_ARRAYS

        expression, symbols = formula(law)
        T, p, M = symbols[:3]
        parts = [expression, *(sympy.diff(expression, symbol) for symbol in (T, p, M))]
        _COMPILED[law] = sympy.lambdify(symbols, parts, [FOR_ARRAYS, "numpy"], cse=True)
    return _COMPILED[law]


def depends_on(law: Template) -> frozenset[str]:
    """Which of "T", "p" and "M" the coefficient of a law depends on."""
    if law not in _DEPENDS:
        expression, symbols = formula(law)
        _DEPENDS[law] = frozenset(str(s) for s in symbols[:3] if s in expression.free_symbols)
    return _DEPENDS[law]
