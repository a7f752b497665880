"""What every rate law offers, so that equations can use a law without knowing it.

A law is a frozen record of the numbers a chemist gives (`Sourced`, in SI) and one
formula, `coefficient`, written over a namespace of functions. The same lines are
evaluated with numpy and read by sympy, so formulas cannot drift from numbers.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, is_dataclass
from itertools import pairwise
from typing import Any, ClassVar, Literal, Protocol

import numpy as np

from meanfree import constants
from meanfree.errors import Problem
from meanfree.gases.gas import Gas
from meanfree.sourced import Sourced


class Functions(Protocol):
    """The functions and constants a formula may use; numpy's or sympy's.

    ``exp``, ``log``, ``log10``, ``sqrt`` take one argument. ``below`` is its third argument
    where x < limit, else its fourth; both are evaluated. ``R`` [J/mol/K], ``k_B``
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
    def below(self, x: Any, limit: Any, then: Any, otherwise: Any, /) -> Any: ...
    def piecewise_linear(self, x: Any, xs: Sequence[Any], ys: Sequence[Any], /) -> Any: ...


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
    def below(x: Any, limit: Any, then: Any, otherwise: Any) -> Any:
        """``then`` where x < limit, else ``otherwise``."""
        return np.where(x < limit, then, otherwise)

    @staticmethod
    def piecewise_linear(x: Any, xs: Sequence[Any], ys: Sequence[Any]) -> Any:
        """Linear between the points, the outer pieces continued beyond them.

        Every point may be a number or an array that broadcasts with x: one entry a step.
        """
        value = None
        for (x0, x1), (y0, y1) in zip(pairwise(xs), pairwise(ys), strict=True):
            piece = y0 + (y1 - y0) / (x1 - x0) * (x - x0)
            value = piece if value is None else np.where(x < x0, value, piece)
        return value


NUMBERS = Numbers()


@dataclass(frozen=True)
class Interior:
    """The inside of a sphere or a cylinder: radius and length [m]; no length: a long one."""

    form: Literal["sphere", "cylinder"]
    radius: float
    length: float | None = None


class Surroundings(Protocol):
    """What a law may ask of the vessel: its form and area, where those are known."""

    @property
    def surface_to_volume(self) -> float | None: ...  # [1/m]
    @property
    def interior(self) -> Interior | None: ...
    @property
    def filling_volume(self) -> float: ...  # [m^3]
    @property
    def is_rigid(self) -> bool: ...


@dataclass(frozen=True)
class StepContext:
    """What a law may know of the step it serves.

    ``partners`` are the colliding molecules, repeated as the step is written
    (``2 NOCl`` gives two of them), empty where the step has orders of its own.
    ``order`` is the overall order without the bath gas M. ``temperature`` [K] is the run's where
    it is constant, else None. ``bath`` maps each gas to its initial mole fraction.
    ``reactants`` are the molecules of the left side, repeated as written. ``temperatures`` [K] are
    the lowest and the highest that are known before the run.
    """

    partners: tuple[Gas, ...]
    order: float
    temperature: float | None = None
    pressure: float | None = None
    surroundings: Surroundings | None = None
    bath: Mapping[str, float] | None = None
    gases: Mapping[str, Gas] | None = None
    reactants: tuple[Gas, ...] = ()
    temperatures: tuple[float, float] | None = None
    has_bath: bool = False


class Formula:
    """One of the formulas of a law that has several; a subclass is a frozen dataclass.

    A law with one formula for all its steps is its own formula, as a class. One whose formula
    varies (with the number of points of a table, say) gives one of these: equal ones are
    differentiated and compiled once.
    """

    word: ClassVar[str] = ""

    @property
    def slots(self) -> tuple[str, ...]:
        """Names of the numbers that `coefficient` takes, in order."""
        raise NotImplementedError

    def coefficient(self, fn: Functions, T: Any, p: Any, M: Any, numbers: Sequence[Any]) -> Any:
        """As `Law.coefficient`."""
        raise NotImplementedError


class Law:
    """Base of the rate laws. A subclass is a frozen dataclass of `Sourced` fields.

    Attributes
    ----------
    word : the law's name in a case file.
    slots : names of the numbers that `coefficient` takes, in order.
    counted : address in `inputs()` of a number whose size follows `k_counts` (a rate constant, or
        the first of several that follow it alike), or "".
    bath_inside : True where `coefficient` itself uses M (falloff); otherwise a step
        written with ``+ M`` multiplies the coefficient by M.
    pair_needed : True where the step must be an encounter of two molecules.
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

    def template(self, context: StepContext) -> Template:
        """The formula of this law for this step."""
        return type(self)

    def problems(self, context: StepContext) -> Iterator[Problem]:
        """What makes this law impossible for this step; keys as in the step's table."""
        if self.pair_needed and len(context.partners) != 2:
            found = " + ".join(gas.name for gas in context.reactants) or "nothing"
            yield Problem("reaction", found, "two molecules on the left: this law is an encounter")

    def cautions(self, context: StepContext) -> Iterator[str]:
        """What a reader should know about this law in this step, in whole sentences."""
        yield from ()

    def switch_times(self) -> tuple[float, ...]:
        """Times at which the clock switches the step on or off [s], zero left out."""
        return ()

    def is_on(self, t: float) -> bool:
        """Whether the step runs just after a time [s]."""
        return True

    def strains(self, low: float, high: float) -> Iterator[tuple[str, bool]]:
        """What a run from ``low`` to ``high`` [K] strains: (what is so, is that an error)."""
        yield from ()

    def rate_constant(self, context: StepContext, T: Any, p: Any = 0.0, M: Any = 0.0) -> Any:
        """`coefficient` with this law's numbers, evaluated with numpy."""
        return self.template(context).coefficient(NUMBERS, T, p, M, self.numbers(context))

    def inputs(self) -> dict[str, Sourced]:
        """The numbers a reader may vary, by their place in the step's table: ``A``, ``k0.A``."""
        named = [(f.name, getattr(self, f.name)) for f in fields(self)]  # type: ignore[arg-type]
        return {key: value for name, part in named for key, value in _numbers_in(name, part)}


def _numbers_in(address: str, part: object) -> Iterator[tuple[str, Sourced]]:
    """Every `Sourced` in a field, with its address: attributes, keys and indices joined by dots."""
    if isinstance(part, Sourced):
        yield address, part
    elif isinstance(part, Mapping):
        for key, value in part.items():
            yield from _numbers_in(f"{address}.{key}", value)
    elif isinstance(part, tuple):
        for index, value in enumerate(part):
            yield from _numbers_in(f"{address}.{index}", value)
    elif is_dataclass(part) and not isinstance(part, type):
        for f in fields(part):
            yield from _numbers_in(f"{address}.{f.name}", getattr(part, f.name))


Template = type[Law] | Formula
"""What equations see of a law: its word, its slots and its coefficient. Hashable."""
