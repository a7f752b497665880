"""What every rate law offers, so that equations can use a law without knowing it.

A law is a frozen record of the numbers a chemist gives (`Sourced`, in SI) and one
formula, `coefficient`, written over a namespace of functions. The same lines are
evaluated with numpy and read by sympy, so formulas cannot drift from numbers.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any, ClassVar, Protocol

import numpy as np

from meanfree import constants
from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced


class Functions(Protocol):
    """The functions and constants a formula may use; numpy's or sympy's.

    ``exp``, ``log``, ``log10``, ``sqrt`` take one argument. ``R`` [J/mol/K], ``k_B``
    [J/K], ``N_A`` [1/mol] and ``pi`` are numbers, or symbols where the formula is
    to be read rather than evaluated.
    """

    R: Any
    k_B: Any
    N_A: Any
    pi: Any

    def exp(self, x: Any, /) -> Any: ...
    def log(self, x: Any, /) -> Any: ...
    def log10(self, x: Any, /) -> Any: ...
    def sqrt(self, x: Any, /) -> Any: ...
    def piecewise_linear(self, x: Any, xs: Sequence[float], ys: Sequence[float], /) -> Any: ...


class Numbers:
    """The `Functions` of numpy: numbers in, numbers out."""

    R = constants.R
    k_B = constants.k_B
    N_A = constants.N_A
    pi = float(np.pi)
    exp = staticmethod(np.exp)
    log = staticmethod(np.log)
    log10 = staticmethod(np.log10)
    sqrt = staticmethod(np.sqrt)

    @staticmethod
    def piecewise_linear(x: Any, xs: Sequence[float], ys: Sequence[float]) -> Any:
        """Linear between the points, the outer pieces continued beyond them."""
        grid, values = np.asarray(xs, float), np.asarray(ys, float)
        piece = np.clip(np.searchsorted(grid, x) - 1, 0, len(grid) - 2)
        slope = (values[piece + 1] - values[piece]) / (grid[piece + 1] - grid[piece])
        return values[piece] + slope * (np.asarray(x) - grid[piece])


NUMBERS = Numbers()


class Surroundings(Protocol):
    """What a law may ask of the vessel: its size, and its area where that is known."""

    @property
    def surface_to_volume(self) -> float | None: ...  # [1/m]


@dataclass(frozen=True)
class StepContext:
    """What a law may know of the step it serves.

    ``partners`` are the colliding molecules, repeated as the step is written
    (``2 NOCl`` gives two of them), empty where the step has orders of its own.
    ``order`` is the overall order without the bath gas M. ``temperature`` [K] is the run's where
    it is constant, else None. ``bath`` maps each gas to its initial mole fraction.
    """

    partners: tuple[Gas, ...]
    order: float
    temperature: float | None = None
    pressure: float | None = None
    surroundings: Surroundings | None = None
    bath: Mapping[str, float] | None = None
    gases: Mapping[str, Gas] | None = None


class Law:
    """Base of the rate laws. A subclass is a frozen dataclass of `Sourced` fields.

    Attributes
    ----------
    word : the law's name in a case file.
    slots : names of the numbers that `coefficient` takes, in order.
    counted : the field whose size follows `k_counts` (a rate constant), or "".
    bath_inside : True where `coefficient` itself uses M (falloff); otherwise a step
        written with ``+ M`` multiplies the coefficient by M.
    """

    word: ClassVar[str] = ""
    slots: ClassVar[tuple[str, ...]] = ()
    counted: ClassVar[str] = ""
    bath_inside: ClassVar[bool] = False
    pair_needed: ClassVar[bool] = False

    @staticmethod
    def coefficient(fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """Rate over the product of concentrations, in (m^3/mol)^(order-1)/s.

        T [K], p the total pressure [Pa], M the bath concentration [mol/m^3] weighted
        with the efficiencies of its gases; ``numbers`` one entry a slot, in SI.
        """
        raise NotImplementedError

    def numbers(self, context: StepContext) -> tuple[float, ...]:
        """The slots' values for one step [SI, shape (n_slots,)]."""
        raise NotImplementedError

    def rate_constant(self, context: StepContext, T: Any, p: Any = 0.0, M: Any = 0.0) -> Any:
        """`coefficient` with this law's numbers, evaluated with numpy."""
        return self.coefficient(NUMBERS, T, p, M, self.numbers(context))

    def inputs(self) -> dict[str, Sourced]:
        """The numbers a reader may vary: field name to value."""
        named = {f.name: getattr(self, f.name) for f in fields(self)}  # type: ignore[arg-type]
        return {name: value for name, value in named.items() if isinstance(value, Sourced)}
