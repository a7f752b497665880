"""The System: an experiment as index arrays and numbers, ready for any reader.

It is frozen and holds no formulas but those of the laws it names. Readers (`arrays`,
`symbolic`, the typesetter, the kernel) turn it into something that can be evaluated.

State, in this order, every entry scaled by the volume V0 at time zero:
``x`` [mol/m^3] amount over V0 of each gas (vessel and dead space together), ``ledger``
[mol/m^3] the extent over V0 of each open step and, last, the heat taken in [J/m^3] where heat is
exchanged, ``v`` = V/V0 where the volume varies, ``T`` [K] where it follows an energy balance.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from meanfree.rates.law import Template

Floats = NDArray[np.float64]
Integers = NDArray[np.intp]


@dataclass(frozen=True)
class Rows:
    """Sparse rows: entries ``start[j]:start[j+1]`` of ``column`` and ``value`` belong to row j."""

    start: Integers
    column: Integers
    value: Floats

    @classmethod
    def of(cls, rows: list[list[tuple[int, float]]]) -> Rows:
        """Rows from lists of (column, value)."""
        lengths = [len(row) for row in rows]
        flat = [entry for row in rows for entry in row]
        return cls(
            np.concatenate([[0], np.cumsum(lengths)]).astype(np.intp),
            np.array([column for column, _ in flat], np.intp),
            np.array([value for _, value in flat], float),
        )

    def row(self, j: int) -> list[tuple[int, float]]:
        """(column, value) of one row."""
        part = slice(self.start[j], self.start[j + 1])
        entries = zip(self.column[part], self.value[part], strict=True)
        return [(int(column), float(value)) for column, value in entries]

    @property
    def owner(self) -> Integers:
        """The row of every entry."""
        return np.repeat(np.arange(len(self.start) - 1), np.diff(self.start)).astype(np.intp)


@dataclass(frozen=True)
class LawBlock:
    """The steps of one law that share a formula.

    ``numbers`` [SI, shape (n_slots, n)] for ``steps`` [shape (n,)].
    ``addresses[i]`` is the prefix under which the inputs of step ``steps[i]`` are found.
    """

    law: Template
    steps: Integers
    numbers: Floats
    addresses: tuple[str, ...]


@dataclass(frozen=True)
class Reverses:
    """Steps whose rate constant is that of a forward step over K_c(T).

    ``step`` runs with the coefficient of ``forward``. Where ``given`` is True ln K (1 bar) is
    ``lnK_at`` - enthalpy/R (1/T - 1/at); elsewhere it follows from the gases' Gibbs energies.
    All of shape (n,); ``lnK_at`` [1], ``at`` [K], ``enthalpy`` [J/mol].
    """

    step: Integers
    forward: Integers
    given: NDArray[np.bool_]
    lnK_at: Floats
    at: Floats
    enthalpy: Floats


@dataclass(frozen=True)
class Thermal:
    """Cp, H and S of each gas as Chebyshev series in x, linear in ln T from ``low`` to ``high``.

    ``low``, ``high`` [K, shape (n_gases,)]; ``cp`` [J/mol/K], ``cp_slope``
    its derivative by x, ``h`` [J/mol], ``s`` [J/mol/K], each
    of shape (n_terms, n_gases).
    """

    low: Floats
    high: Floats
    cp: Floats
    cp_slope: Floats
    h: Floats
    s: Floats


@dataclass(frozen=True)
class Segment:
    """A stretch of time without a break.

    From ``start`` to ``end`` [s] a programmed temperature is ``temperature`` [K] + ``slope``
    [K/s] (t - start). ``switches`` [shape (n_steps,)] multiplies each rate (a lamp that is on or
    off). ``retained`` is the fraction that stays when a sample is drawn at ``start``.
    """

    start: float
    end: float
    temperature: float
    slope: float = 0.0
    switches: Floats | None = None
    retained: float = 1.0
    drawn: float = 0.0


@dataclass(frozen=True)
class System:
    """Everything the equations of one experiment need; see the module for the state.

    ``net`` and ``orders`` are rows over the gases, one a one-way step (forward and reverse are
    two). ``guards`` are rows of gases that a step consumes although its rate would not fall to
    zero with them: its rate stops smoothly at zero. ``bath`` [shape (n_steps,)] is the row of
    ``baths`` that M is taken from, -1 without M; M = ``others`` sum(c) + sum(value c).
    ``bath_inside`` marks steps whose law uses M itself.
    ``heat_given`` [J/mol, shape (n_steps,)] is a stated heat release, NaN where it follows from
    the gases; ``photon`` [J/mol, shape (n_steps,)] is light energy that a step takes in.
    ``dead`` is V_d/(V0 T_d) [1/K]; ``exchange`` is G/V0 [W/m^3/K]; ``wall`` is C_wall/V0 [J/m^3/K].
    """

    gases: tuple[str, ...]
    steps: tuple[str, ...]
    net: Rows
    orders: Rows
    guards: Rows
    blocks: tuple[LawBlock, ...]
    reverses: Reverses
    bath: Integers
    baths: Rows
    others: Floats
    bath_inside: NDArray[np.bool_]
    heat_given: Floats
    photon: Floats
    open_steps: Integers
    thermal: Thermal | None
    holds: Literal["volume", "pressure"]
    mode: Literal["isothermal", "program", "energy"]
    initial_volume: float
    held_pressure: float
    dead: float
    exchange: float
    surroundings: float
    wall: float
    segments: tuple[Segment, ...]
    initial_x: Floats
    initial_temperature: float

    @property
    def n_gases(self) -> int:
        """Number of gases."""
        return len(self.gases)

    @property
    def n_steps(self) -> int:
        """Number of one-way steps."""
        return len(self.steps)

    @property
    def volume_varies(self) -> bool:
        """True where v is a state."""
        return self.holds == "pressure"

    @property
    def temperature_varies(self) -> bool:
        """True where T is a state."""
        return self.mode == "energy"

    @property
    def exchanges_heat(self) -> bool:
        """True where the ledger ends with the heat taken in."""
        return self.temperature_varies and self.exchange > 0

    @property
    def n_ledger(self) -> int:
        """Number of ledger entries."""
        return len(self.open_steps) + int(self.exchanges_heat)

    @property
    def size(self) -> int:
        """Number of states."""
        varying = int(self.volume_varies) + int(self.temperature_varies)
        return self.n_gases + self.n_ledger + varying

    @property
    def volume_index(self) -> int:
        """Where v stands in the state (meaningless where the volume is held)."""
        return self.n_gases + self.n_ledger

    @property
    def temperature_index(self) -> int:
        """Where T stands in the state (meaningless where it is not one)."""
        return self.size - 1

    @cached_property
    def total_concentration(self) -> float:
        """Initial amount of all gases over V0 [mol/m^3]; 1 where the vessel is empty."""
        total = float(np.sum(self.initial_x))
        return total if total > 0 else 1.0

    @cached_property
    def initial_state(self) -> Floats:
        """The state at time zero [shape (size,)]."""
        y = np.zeros(self.size)
        y[: self.n_gases] = self.initial_x
        if self.volume_varies:
            y[self.volume_index] = 1.0
        if self.temperature_varies:
            y[self.temperature_index] = self.initial_temperature
        return y

    @cached_property
    def step_index(self) -> dict[str, int]:
        """Position of each one-way step by name."""
        return {name: j for j, name in enumerate(self.steps)}
