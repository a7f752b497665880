"""The equations evaluated with plain arrays: linear in the steps, for mechanisms of any size."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from meanfree.constants import R
from meanfree.equations import templates, thermal
from meanfree.equations.powers import powers
from meanfree.equations.system import Floats, Segment, System
from meanfree.rates.law import NUMBERS


@dataclass(frozen=True)
class Coefficients:
    """Rate coefficients of every one-way step with their derivatives, each shape (n_steps,)."""

    k: Floats
    by_T: Floats
    by_p: Floats
    by_M: Floats


@dataclass(frozen=True)
class State:
    """A state taken apart: c [mol/m^3], the volume ratios v and w = v + dead T, T [K], p [Pa]."""

    x: Floats
    c: Floats
    v: float
    w: float
    T: float
    p: float


class ArrayEquations:
    """Right-hand side and Jacobian of a System.

    The methods take a time [s], a state [shape (size,)] and the segment it lies in.
    """

    def __init__(self, system: System) -> None:
        self.system = system
        self.net_owner = system.net.owner
        self.change = np.bincount(self.net_owner, system.net.value, system.n_steps).astype(float)
        self._terms()
        self.varying = [
            bool(templates.depends_on(block.law) - {"T"}) or system.mode != "isothermal"
            for block in system.blocks
        ]
        self.constant = not any(self.varying) and system.mode == "isothermal"
        self._kept: Coefficients | None = None
        self._properties: tuple[float, thermal.Properties] | None = None

    def _terms(self) -> None:
        """Concentration powers as padded arrays; column n_gases is a gas of concentration 1."""
        system = self.system
        rows = [system.orders.row(j) + system.guards.row(j) for j in range(system.n_steps)]
        width = max([len(row) for row in rows], default=0)
        self.term_gas = np.full((width, system.n_steps), system.n_gases, np.intp)
        self.term_order = np.ones((width, system.n_steps))
        for j, row in enumerate(rows):
            for m, (gas, order) in enumerate(row):
                self.term_gas[m, j], self.term_order[m, j] = gas, order

    # The state and what follows from it

    def unpack(self, t: float, y: Floats, segment: Segment) -> State:
        """The state in the words of the trade."""
        system = self.system
        x = y[: system.n_gases]
        v = float(y[system.volume_index]) if system.volume_varies else 1.0
        if system.temperature_varies:
            T = float(y[system.temperature_index])
        else:
            T = segment.temperature + segment.slope * (t - segment.start)
        w = v + system.dead * T
        c = x / w
        p = system.held_pressure if system.volume_varies else R * T * float(c.sum())
        return State(x, c, v, w, T, p)

    def baths(self, c: Floats) -> Floats:
        """M of every step [mol/m^3, shape (n_steps,)]; 1 where a step has none."""
        system = self.system
        M = np.ones(system.n_steps)
        has = system.bath >= 0
        if np.any(has):
            rows = system.baths
            weighted = np.bincount(rows.owner, rows.value * c[rows.column], len(system.others))
            M[has] = (system.others * c.sum() + weighted)[system.bath[has]]
        return M

    def coefficients(self, T: float, p: float, M: Floats) -> Coefficients:
        """Rate coefficients at a temperature [K], pressure [Pa] and baths [mol/m^3]."""
        if self.constant and self._kept is not None:
            return self._kept
        n = self.system.n_steps
        k, by_T, by_p, by_M = np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n)
        for block, varies in zip(self.system.blocks, self.varying, strict=True):
            at = block.steps
            if varies:
                parts = templates.compiled(block.law)(T, p, M[at], *block.numbers)
                k[at], by_T[at], by_p[at], by_M[at] = parts
            else:
                k[at] = block.law.coefficient(NUMBERS, T, p, M[at], list(block.numbers))
        self._reverse(T, k, by_T, by_p, by_M)
        result = Coefficients(k, by_T, by_p, by_M)
        if self.constant:
            self._kept = result
        return result

    def _reverse(self, T: float, k: Floats, by_T: Floats, by_p: Floats, by_M: Floats) -> None:
        """k_rev = k_fwd / K_c(T), in place."""
        reverses = self.system.reverses
        if not len(reverses.step):
            return
        forward = reverses.forward
        nothing = np.zeros(len(forward))
        dG = dH = nothing
        if self.system.thermal is not None:
            dG = self.of_reaction(self.properties(T).g)[forward]
            dH = self.of_reaction(self.properties(T).h)[forward]
        lnK, slope = thermal.ln_Kc(reverses, T, self.change[forward], dG, dH)
        inverse = np.exp(-lnK)
        at = reverses.step
        k[at] = k[forward] * inverse
        by_T[at] = by_T[forward] * inverse - k[at] * slope
        by_p[at] = by_p[forward] * inverse
        by_M[at] = by_M[forward] * inverse

    def properties(self, T: float) -> thermal.Properties:
        """Heat capacities and energies of the gases at T [K], evaluated once a temperature."""
        if self._properties is None or self._properties[0] != T:
            table = self.system.thermal
            assert table is not None, "an energy balance needs the gases' energies"
            self._properties = (T, thermal.properties(table, T))
        return self._properties[1]

    def of_reaction(self, quantity: Floats) -> Floats:
        """Sum of net numbers times a quantity of the gases, shape (n_steps,)."""
        net = self.system.net
        weights = net.value * quantity[net.column]
        return np.bincount(self.net_owner, weights, self.system.n_steps).astype(float)

    def net_rates(self, rates: Floats) -> Floats:
        """Forward minus reverse on the forward steps, zero on the reverse ones.

        Near equilibrium the two nearly cancel. Taking the difference once, before it is spread
        over gases and heat, keeps its rounding out of everything that is conserved.
        """
        reverses, net = self.system.reverses, rates.copy()
        net[reverses.forward] -= rates[reverses.step]
        net[reverses.step] = 0.0
        return net

    def of_gases(self, rates: Floats) -> Floats:
        """Net formation of each gas from the rates of the steps, shape (n_gases,)."""
        net = self.system.net
        weights = net.value * rates[self.net_owner]
        return np.bincount(net.column, weights, self.system.n_gases).astype(float)

    def products(self, c: Floats) -> tuple[Floats, Floats]:
        """Product of concentration powers [shape (n_steps,)] and its derivative by each term."""
        padded = np.append(c, 1.0)[self.term_gas]
        value, slope = powers(padded, self.term_order, self.system.total_concentration)
        by_term = slope.copy()
        for m in range(len(by_term)):
            for other in range(len(by_term)):
                if other != m:
                    by_term[m] *= value[other]
        return np.prod(value, axis=0), by_term

    def rates(self, t: float, y: Floats, segment: Segment) -> Floats:
        """Rate of every one-way step [mol/m^3/s, shape (n_steps,)]."""
        state = self.unpack(t, y, segment)
        M = self.baths(state.c)
        rates = self.coefficients(state.T, state.p, M).k * self.products(state.c)[0]
        rates *= np.where(self.system.bath_inside, 1.0, M)
        return rates if segment.switches is None else rates * segment.switches

    def reaction_energies(self, T: float) -> tuple[Floats, Floats]:
        """Energy of each step in the balance of this vessel [J/mol] and its slope [J/mol/K].

        dU = dH - change R T in a rigid vessel, dH in a piston. Open steps carry the enthalpy of
        what flows; a stated heat release replaces -dH; light taken in lowers dH.
        """
        system = self.system
        of_gases = self.properties(T)
        dH, slope = self.of_reaction(of_gases.h), self.of_reaction(of_gases.cp)
        given = ~np.isnan(system.heat_given)
        dH, slope = np.where(given, -system.heat_given, dH), np.where(given, 0.0, slope)
        dH[system.open_steps], slope[system.open_steps] = 0.0, 0.0
        dH = dH - system.photon
        if system.volume_varies:
            return dH, slope
        return dH - self.change * R * T, slope - self.change * R

    def capacity(self, x: Floats, T: float) -> tuple[float, Floats, float]:
        """Heat capacity over V0 [J/m^3/K], of each gas [J/mol/K], and its slope [J/m^3/K^2]."""
        of_gases = self.properties(T)
        each = of_gases.cp if self.system.volume_varies else of_gases.cp - R
        return float(x @ each) + self.system.wall, each, float(x @ of_gases.cp_slope)

    # Right-hand side and Jacobian

    def derivative(self, t: float, y: Floats, segment: Segment) -> Floats:
        """dy/dt [shape (size,)]."""
        system = self.system
        state = self.unpack(t, y, segment)
        rates = self.net_rates(self.rates(t, y, segment)) * state.v
        out = np.zeros(system.size)
        n, opened = system.n_gases, len(system.open_steps)
        out[:n] = self.of_gases(rates)
        out[n : n + opened] = rates[system.open_steps]
        dT = segment.slope
        if system.temperature_varies:
            exchanged = system.exchange * (system.surroundings - state.T)
            released = -float(rates @ self.reaction_energies(state.T)[0])
            dT = (released + exchanged) / self.capacity(state.x, state.T)[0]
            out[system.temperature_index] = dT
            if system.exchanges_heat:
                out[n + opened] = exchanged
        if system.volume_varies:
            # From the steps and not from the gases: a fast step that keeps the number of molecules
            # must not leave its rounding in the volume.
            growth = R * state.T / system.held_pressure * float(rates @ self.change)
            out[system.volume_index] = growth + state.v / state.T * dT
        return out

    def jacobian(self, t: float, y: Floats, segment: Segment) -> sparse.csc_array:
        """d(dy/dt)/dy as a sparse array [shape (size, size)]."""
        from meanfree.equations.jacobian import assemble

        return assemble(self, t, y, segment)
