"""The right-hand side and the Jacobian of a System on a tape.

Columns and rows are the states and, behind them, one unknown for each bath M (and the sum of the
gases where a law asks for p): m = sum(w_i x_i). Kept as unknowns they border the matrix; put in,
they would fill it.
"""

from __future__ import annotations

import numpy as np

from meanfree.constants import R
from meanfree.equations.system import Floats
from meanfree.kernel.rates_tape import Rate, RateWriter, Surrounding
from meanfree.kernel.slots import Layout
from meanfree.kernel.tape import Tape
from meanfree.kernel.thermal_tape import ThermalTape

Matrix = dict[tuple[int, int], int]


class Balances:
    """Writes dy/dt and its derivatives for one layout."""

    def __init__(self, layout: Layout, border: bool) -> None:
        self.layout, self.system = layout, layout.system
        self.rates = RateWriter(layout.system, layout)
        self.border = border
        self.baths = self.rates.bath_matters()
        self.weights = [self._weights(b) for b in self.baths]
        if self.rates.needs_pressure and not self.system.volume_varies:
            self.baths.append(-1)
            self.weights.append(dict.fromkeys(range(self.system.n_gases), 1.0))

    def _weights(self, bath: int) -> dict[int, float]:
        """w_i of M = sum(w_i c_i)."""
        weights = np.full(self.system.n_gases, self.system.others[bath])
        for gas, value in self.system.baths.row(bath):
            weights[gas] += value
        return {i: float(w) for i, w in enumerate(weights) if w != 0}

    @property
    def unknowns(self) -> int:
        """States and, where they border the matrix, baths."""
        return self.layout.states + (len(self.baths) if self.border else 0)

    @property
    def bordering(self) -> list[int]:
        """Unknowns to be eliminated last: v, T, baths."""
        first = self.system.n_gases + self.system.n_ledger
        return list(range(first, self.unknowns))

    def derivative(self, tape: Tape, state: list[int]) -> list[int]:
        """dy/dt of every state."""
        return _Point(self, tape, state, slopes=False).derivative()

    def flows(self, tape: Tape, state: list[int]) -> list[int]:
        """Rate of every one-way step over the volume at time zero [mol/m^3/s]."""
        return _Point(self, tape, state, slopes=False).flows

    def both(self, tape: Tape, state: list[int]) -> tuple[list[int], Matrix]:
        """dy/dt and J, the baths' columns included."""
        point = _Point(self, tape, state, slopes=True)
        return point.derivative(), point.jacobian()

    def system_matrix(self, tape: Tape, jacobian: Matrix, shift: int) -> Matrix:
        """shift I - J, with the rows of the baths below: m - sum(w_i x_i) = 0."""
        matrix = {key: tape.neg(value) for key, value in jacobian.items()}
        for i in range(self.layout.states):
            matrix[i, i] = tape.add(shift, matrix[i, i]) if (i, i) in matrix else shift
        if self.border:
            for place, weights in enumerate(self.weights):
                row = self.layout.states + place
                matrix[row, row] = tape.const(1.0)
                for gas, weight in weights.items():
                    matrix[row, gas] = tape.const(-weight)
        return matrix


class _Point:
    """Everything at one state."""

    def __init__(self, balances: Balances, tape: Tape, state: list[int], slopes: bool) -> None:
        self.b, self.t, self.state = balances, tape, state
        layout, system = balances.layout, balances.system
        self.x = state[: system.n_gases]
        one = tape.const(1.0)
        self.v = state[system.volume_index] if system.volume_varies else one
        self.T: int | None = self._temperature()
        self.w = self.v
        if system.dead:
            assert self.T is not None
            dead = tape.input(layout.parameter("dead"))
            self.w = tape.madd(dead, self.T, self.v)
        self.inverse_w = tape.div(one, self.w)
        self.v_over_w = one if not system.dead else tape.mul(self.v, self.inverse_w)
        c = [tape.mul(x, self.inverse_w) for x in self.x]
        self.c = c
        self.bath_values = [
            tape.combine((w, c[i]) for i, w in weights.items()) for weights in balances.weights
        ]
        self.rates = balances.rates.write(tape, self._surrounding(), slopes)
        self.flows = [tape.mul(self.v, rate.value) for rate in self.rates]
        self.dx = self._net(self.flows)
        self.energies: list[int] = []
        if system.temperature_varies:
            self._energy_balance()

    def _temperature(self) -> int | None:
        layout, system = self.b.layout, self.b.system
        if layout.has_T:
            return self.state[layout.T_index]
        if system.volume_varies or system.dead or self.b.rates.needs_temperature:
            return self.t.input(layout.parameter("T"))
        return None

    def _surrounding(self) -> Surrounding:
        t, system = self.t, self.b.system
        baths = [t.const(1.0)] * len(system.others)
        total = p = None
        for place, bath in enumerate(self.b.baths):
            if bath >= 0:
                baths[bath] = self.bath_values[place]
            else:
                total = self.bath_values[place]
        if system.volume_varies and self.b.rates.needs_held_pressure:
            p = t.input(self.b.layout.parameter("p"))
        elif total is not None:
            assert self.T is not None
            p = t.mul(t.mul(t.const(R), self.T), total)
        return Surrounding(self.c, baths, total, p, self.T)

    def _net(self, flows: list[int]) -> list[int]:
        """Net formation of every gas from something of every step."""
        system, t = self.b.system, self.t
        sums = [t.const(0.0)] * system.n_gases
        for j, flow in enumerate(flows):
            if t.number(flow) == 0:
                continue
            for gas, number in system.net.row(j):
                sums[gas] = t.madd(t.const(number), flow, sums[gas])
        return sums

    def _energy_balance(self) -> None:
        """Energy of each step, heat capacity and dT/dt, with their slopes."""
        system, t, T = self.b.system, self.t, self.T
        assert T is not None and system.thermal is not None
        gases = ThermalTape.on(t, system.thermal, T)
        zero, gas_constant = t.const(0.0), t.const(R)
        cp = [gases.heat_capacity(i) for i in range(system.n_gases)]
        opened = {int(j) for j in system.open_steps}
        self.energy_slopes: list[int] = []
        for j in range(system.n_steps):
            net = system.net.row(j)
            if j in opened:
                energy, slope = zero, zero
            elif np.isnan(system.heat_given[j]):
                energy = t.combine([(n, gases.enthalpy(i)) for i, n in net])
                slope = t.combine([(n, cp[i]) for i, n in net])
            else:
                energy, slope = t.neg(self._stated("heat", j, system.heat_given)), zero
            energy = t.sub(energy, self._stated("photon", j, system.photon))
            if not system.volume_varies:
                change = self.b.rates.change[j]
                energy = t.nmadd(t.const(change * R), T, energy)
                slope = t.sub(slope, t.const(change * R))
            self.energies.append(energy)
            self.energy_slopes.append(slope)
        self.each = cp if system.volume_varies else [t.sub(value, gas_constant) for value in cp]
        capacity = zero
        for x, each in zip(self.x, self.each, strict=True):
            capacity = t.madd(x, each, capacity)
        if system.wall:
            capacity = t.add(capacity, t.input(self.b.layout.parameter("wall")))
        self.inverse_capacity = t.div(t.const(1.0), capacity)
        self.capacity_slope = zero
        for i, x in enumerate(self.x):
            self.capacity_slope = t.madd(x, gases.slope_of_heat_capacity(i), self.capacity_slope)
        heat = zero
        for flow, energy in zip(self.flows, self.energies, strict=True):
            heat = t.nmadd(flow, energy, heat)
        if system.exchange:
            layout = self.b.layout
            self.exchange = t.input(layout.parameter("exchange"))
            around = t.input(layout.parameter("surroundings"))
            self.exchanged = t.mul(self.exchange, t.sub(around, T))
            heat = t.add(heat, self.exchanged)
        self.heating = t.mul(heat, self.inverse_capacity)

    def _stated(self, what: str, j: int, values: Floats) -> int:
        """A stated energy of a step: a number, unless it moves."""
        layout = self.b.layout
        if (what, j) in layout.varied:
            return self.t.input(layout.parameter(what, j))
        return self.t.const(float(values[j]))

    @property
    def dT(self) -> int:
        """dT/dt"""
        if self.b.system.temperature_varies:
            return self.heating
        if self.b.system.mode == "program":
            return self.t.input(self.b.layout.parameter("slope"))
        return self.t.const(0.0)

    def _per(self) -> int:
        """R/p of a piston times T: dv/dt over the net formation of all gases."""
        assert self.T is not None
        return self.t.mul(self.t.input(self.b.layout.parameter("R_over_p")), self.T)

    def derivative(self) -> list[int]:
        """dy/dt"""
        system, t = self.b.system, self.t
        out = [*self.dx, *(self.flows[int(j)] for j in system.open_steps)]
        if system.exchanges_heat:
            out.append(self.exchanged)
        if system.volume_varies:
            growth = t.mul(self._per(), self._change(self.flows))
            if t.number(self.dT) != 0:
                assert self.T is not None
                growth = t.madd(t.div(self.v, self.T), self.dT, growth)
            out.append(growth)
        if self.b.layout.has_T:
            out.append(self.dT)
        return out

    def _change(self, flows: list[int]) -> int:
        """Net formation of all gases together."""
        return self.t.combine(zip(self.b.rates.change, flows, strict=True))

    def jacobian(self) -> Matrix:
        """d(dy/dt)/d(unknown) where it is not zero."""
        matrix: Matrix = {}
        for column, by_step in self._columns().items():
            self._fill(matrix, column, by_step)
        self._heat_and_volume_by_v_and_T(matrix)
        zero = self.t.const(0.0)
        return {key: value for key, value in matrix.items() if value != zero}

    def _columns(self) -> dict[int, dict[int, int]]:
        """Derivative of the flow of each step by each unknown: unknown -> step -> value."""
        t, system, layout = self.t, self.b.system, self.b.layout
        columns: dict[int, dict[int, int]] = {}

        def put(column: int, j: int, value: int) -> None:
            row = columns.setdefault(column, {})
            row[j] = t.add(row[j], value) if j in row else value

        for j, rate in enumerate(self.rates):
            for gas, slope in rate.by_c.items():
                put(gas, j, t.mul(self.v_over_w, slope))
            for place, slope in self._bath_slopes(rate):
                inner = t.mul(self.v_over_w, slope)
                if self.b.border:
                    put(layout.states + place, j, inner)
                else:
                    for gas, weight in self.b.weights[place].items():
                        put(gas, j, t.mul(t.const(weight), inner))
            shrink = self._by_spreading(rate) if system.volume_varies or system.dead else 0
            if system.volume_varies:
                by_v = t.nmadd(self.v_over_w, shrink, rate.value)
                put(system.volume_index, j, by_v)
            if layout.has_T:
                by_T = t.const(0.0) if rate.by_T is None else t.mul(self.v, rate.by_T)
                if system.dead:
                    dead = t.input(layout.parameter("dead"))
                    by_T = t.nmadd(dead, t.mul(self.v_over_w, shrink), by_T)
                put(layout.T_index, j, by_T)
        return columns

    def _bath_slopes(self, rate: Rate) -> list[tuple[int, int]]:
        found = []
        for place, bath in enumerate(self.b.baths):
            slope = rate.by_bath.get(bath) if bath >= 0 else rate.by_sum
            if slope is not None:
                found.append((place, slope))
        return found

    def _by_spreading(self, rate: Rate) -> int:
        """sum(dr/dc c): how a rate falls as its gases spread over more room."""
        t = self.t
        total = t.const(0.0)
        for gas, slope in rate.by_c.items():
            total = t.madd(slope, self.c[gas], total)
        for place, slope in self._bath_slopes(rate):
            total = t.madd(slope, self.bath_values[place], total)
        return total

    def _fill(self, matrix: Matrix, column: int, by_step: dict[int, int]) -> None:
        """Rows of gases, ledger, v and T in one column, from what the flows do there."""
        t, system, layout = self.t, self.b.system, self.b.layout
        zero = t.const(0.0)
        rows: dict[int, int] = {}
        for j in by_step:
            for gas, number in system.net.row(j):
                rows[gas] = t.madd(t.const(number), by_step[j], rows.get(gas, zero))
        for place, j in enumerate(system.open_steps):
            if int(j) in by_step:
                rows[system.n_gases + place] = by_step[int(j)]
        by_T = zero
        if system.temperature_varies:
            heat = zero
            for j, slope in by_step.items():
                heat = t.nmadd(slope, self.energies[j], heat)
            by_T = t.mul(heat, self.inverse_capacity)
            rows[layout.T_index] = by_T
        if system.volume_varies:
            change = t.combine((self.b.rates.change[j], slope) for j, slope in by_step.items())
            growth = t.mul(self._per(), change)
            if system.temperature_varies:
                assert self.T is not None
                growth = t.madd(t.div(self.v, self.T), by_T, growth)
            rows[system.volume_index] = growth
        for row, value in rows.items():
            matrix[row, column] = value

    def _heat_and_volume_by_v_and_T(self, matrix: Matrix) -> None:
        """What dT/dt and dv/dt depend on besides the flows."""
        t, system, layout = self.t, self.b.system, self.b.layout
        zero = t.const(0.0)
        extra: Matrix = {}
        if system.temperature_varies:
            for i, each in enumerate(self.each):
                extra[layout.T_index, i] = t.neg(
                    t.mul(t.mul(self.heating, each), self.inverse_capacity)
                )
            heat = t.neg(t.mul(self.heating, self.capacity_slope))
            for flow, slope in zip(self.flows, self.energy_slopes, strict=True):
                heat = t.nmadd(flow, slope, heat)
            if system.exchange:
                heat = t.sub(heat, self.exchange)
            extra[layout.T_index, layout.T_index] = t.mul(heat, self.inverse_capacity)
            if system.exchanges_heat:
                matrix[system.volume_index - 1, layout.T_index] = t.neg(self.exchange)
        if system.volume_varies and layout.has_T:
            assert self.T is not None
            v_row, T = system.volume_index, self.T
            share = t.div(self.v, T)
            for (_, column), value in list(extra.items()):
                extra[v_row, column] = t.mul(share, value)
            rate = t.div(self.dT, T)
            extra[v_row, v_row] = t.add(extra.get((v_row, v_row), zero), rate)
            growth = t.mul(t.input(layout.parameter("R_over_p")), self._change(self.flows))
            growth = t.nmadd(share, rate, growth)
            extra[v_row, layout.T_index] = t.add(extra.get((v_row, layout.T_index), zero), growth)
        for key, value in extra.items():
            matrix[key] = t.add(matrix.get(key, zero), value)
