"""Steps as a chemist writes them, and what a written step means.

Orders, net stoichiometric numbers and counting conventions follow from the text of
a step here and nowhere else.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from meanfree.rates.law import Law
from meanfree.sourced import Sourced

Amounts = tuple[tuple[str, float], ...]


@dataclass(frozen=True)
class GivenEquilibrium:
    """An equilibrium constant that the reader supplies.

    ``kind`` says how it counts: "Kp" [Pa^dn], "Kc" [(mol/m^3)^dn] or "K" (1 bar, a pure
    number). It holds at ``at`` [K]; ``enthalpy`` [J/mol] carries it to another temperature.
    """

    kind: Literal["Kp", "Kc", "K"]
    constant: Sourced
    at: Sourced
    enthalpy: Sourced | None = None


@dataclass(frozen=True)
class Uncertainty:
    """k is good to a factor of ``factor`` at ``sigmas`` standard deviations."""

    factor: float
    sigmas: float = 1.0


@dataclass(frozen=True)
class Bath:
    """The bath gas M of a step: relative efficiencies, 1 for every gas not named."""

    efficiencies: Mapping[str, float] = field(default_factory=dict)
    others: float = 1.0

    def efficiency(self, gas: str) -> float:
        """The relative efficiency of one gas."""
        return self.efficiencies.get(gas, self.others)


@dataclass(frozen=True)
class Step:
    """One reaction as written, one way (``reverse`` adds the other way).

    ``reactants`` and ``products`` are (gas, coefficient) pairs, each gas once, in the
    order written. ``stated_orders`` is None where the orders are the coefficients.
    ``counts`` is what a quoted k counts: "events", "loss of A" or "formation of X".
    """

    name: str
    reactants: Amounts
    products: Amounts
    law: Law
    stated_orders: Amounts | None = None
    bath: Bath | None = None
    reverse: Literal["thermochemistry"] | GivenEquilibrium | None = None
    counts: str = "events"
    heat: Sourced | None = None
    photon: Sourced | None = None
    uncertainty: Uncertainty | None = None
    source: str = ""
    valid: tuple[Sourced, Sourced] | None = None

    @property
    def orders(self) -> dict[str, float]:
        """Order in each gas, without M."""
        return dict(self.reactants if self.stated_orders is None else self.stated_orders)

    @property
    def order(self) -> float:
        """Overall order without M."""
        return sum(self.orders.values())

    @property
    def net(self) -> dict[str, float]:
        """Net stoichiometric number of every gas in the step; may hold zeros."""
        return net_numbers(self.reactants, self.products)

    @property
    def reverse_orders(self) -> dict[str, float]:
        """Orders of the reverse that detailed balance asks for: a_i + nu_i, zeros left out."""
        orders = self.orders
        for gas, number in self.net.items():
            orders[gas] = orders.get(gas, 0.0) + number
        return {gas: order for gas, order in orders.items() if order != 0.0}

    @property
    def change_of_moles(self) -> float:
        """Sum of the net stoichiometric numbers."""
        return sum(self.net.values())

    @property
    def partners(self) -> tuple[str, ...]:
        """The colliding molecules, repeated as written; empty unless it is an encounter of two."""
        if self.stated_orders is not None or sum(n for _, n in self.reactants) != 2:
            return ()
        names = [gas for gas, n in self.reactants for _ in range(int(n))]
        return tuple(names) if len(names) == 2 else ()

    @property
    def reaction(self) -> str:
        """The step as text: ``2 NOCl → 2 NO + Cl2``."""
        arrow = "→" if self.reverse is None else "⇌"
        bath = " + M" if self.bath is not None else ""
        left, right = side(self.reactants) + bath, side(self.products) + bath
        return f"{left} {arrow} {right}".strip()


def net_numbers(reactants: Amounts, products: Amounts) -> dict[str, float]:
    """Right-hand minus left-hand coefficient of every gas that is written."""
    net: dict[str, float] = {}
    for gas, number in reactants:
        net[gas] = net.get(gas, 0.0) - number
    for gas, number in products:
        net[gas] = net.get(gas, 0.0) + number
    return net


def side(amounts: Amounts) -> str:
    """One side of a reaction as text."""
    return " + ".join(gas if n == 1 else f"{n:g} {gas}" for gas, n in amounts)
