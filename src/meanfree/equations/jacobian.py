"""The Jacobian of the array equations, assembled step by step and then bordered by v and T.

Symbols: r_j rate, c = x/w, w = v + dead T, N net numbers. d(dx/dt)/dx_i = v N dr/dc_i / w, and
the rows of v and T follow from those of x.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from scipy import sparse

from meanfree.constants import R
from meanfree.equations.system import Floats, Segment

if TYPE_CHECKING:
    from meanfree.equations.arrays import ArrayEquations, State


def assemble(equations: ArrayEquations, t: float, y: Floats, segment: Segment) -> sparse.csc_array:
    """d(dy/dt)/dy as a sparse array [shape (size, size)]."""
    system = equations.system
    n, opened = system.n_gases, len(system.open_steps)
    state = equations.unpack(t, y, segment)
    by_c, by_T = rate_derivatives(equations, state, segment)
    spread = _net_matrix(equations, opened)
    size = n + system.n_ledger
    by_state = sparse.csr_array(by_c * (1 / state.w))
    inner = (spread @ by_state) * state.v
    blocks = sparse.hstack([inner, sparse.csr_array((n + opened, size - n))])
    if size > n + opened:
        blocks = sparse.vstack([blocks, sparse.csr_array((1, size))])
    if not system.volume_varies and not system.temperature_varies:
        return sparse.csc_array(blocks)
    return _border(equations, t, y, segment, state, by_c, by_T, sparse.csr_array(blocks))


def rate_derivatives(
    equations: ArrayEquations, state: State, segment: Segment
) -> tuple[sparse.csr_array, Floats]:
    """Of net rates: dr/dc [1/s, shape (n_steps, n_gases)], dr/dT at constant c [mol/m^3/s/K].

    In a rigid vessel the pressure a law may use is R T sum(c), and its part is included.
    """
    system = equations.system
    M = equations.baths(state.c)
    factors = equations.coefficients(state.T, state.p, M)
    product, by_term = equations.products(state.c)
    switch = np.ones(system.n_steps) if segment.switches is None else segment.switches
    outside = np.where(system.bath_inside, 1.0, M) * switch
    j = np.arange(system.n_steps)
    width = len(equations.term_gas)
    values = (by_term * factors.k * outside).ravel()
    shape = (system.n_steps, system.n_gases + 1)
    terms = sparse.coo_array((values, (np.tile(j, width), equations.term_gas.ravel())), shape=shape)
    by_c = sparse.csr_array(sparse.csr_array(terms)[:, : system.n_gases])
    by_M = (
        product
        * switch
        * np.where(system.bath_inside, factors.by_M, np.where(system.bath >= 0, factors.k, 0.0))
    )
    if np.any(by_M != 0):
        by_c = sparse.csr_array(by_c + _bath_part(equations, by_M))
    by_p = product * outside * factors.by_p
    by_T = product * outside * factors.by_T
    if not system.volume_varies and np.any(by_p != 0):
        dense = np.outer(by_p * R * state.T, np.ones(system.n_gases))
        by_c = sparse.csr_array(by_c + sparse.csr_array(dense))
        by_T = by_T + by_p * state.p / state.T
    reverses = system.reverses
    if not len(reverses.step):
        return by_c, by_T
    # Forward minus reverse, as in net_rates and for the same reason.
    pairs = np.ones(system.n_steps)
    pairs[reverses.step] = 0.0
    pairing = sparse.csr_array(
        (
            np.concatenate([pairs, -np.ones(len(reverses.step))]),
            (np.concatenate([j, reverses.forward]), np.concatenate([j, reverses.step])),
        )
    )
    return sparse.csr_array(pairing @ by_c), equations.net_rates(by_T)


def _bath_part(equations: ArrayEquations, by_M: Floats) -> sparse.csr_array:
    """dr/dM dM/dc as rows over the gases."""
    system = equations.system
    n_baths = len(system.others)
    weights = np.repeat(system.others[:, None], system.n_gases, axis=1)
    np.add.at(weights, (system.baths.owner, system.baths.column), system.baths.value)
    has = np.flatnonzero((system.bath >= 0) & (by_M != 0))
    chooser = sparse.csr_array(
        (by_M[has], (has, system.bath[has])), shape=(system.n_steps, n_baths)
    )
    return sparse.csr_array(chooser @ sparse.csr_array(weights))


def _net_matrix(equations: ArrayEquations, opened: int) -> sparse.csr_array:
    """Net numbers as a matrix from rates to dx/dt and the open steps' ledger."""
    system = equations.system
    net = system.net
    gas_rows, columns, values = net.column, equations.net_owner, net.value
    ledger = system.n_gases + np.arange(opened)
    return sparse.csr_array(
        (
            np.concatenate([values, np.ones(opened)]),
            (
                np.concatenate([gas_rows, ledger]),
                np.concatenate([columns, system.open_steps]),
            ),
        ),
        shape=(system.n_gases + opened, system.n_steps),
    )


def _border(
    equations: ArrayEquations,
    t: float,
    y: Floats,
    segment: Segment,
    state: State,
    by_c: sparse.csr_array,
    by_T: Floats,
    inner: sparse.csr_array,
) -> sparse.csc_array:
    """The square of gases and ledger with the rows and columns of v and T added."""
    system = equations.system
    n, opened = system.n_gases, len(system.open_steps)
    spread = _net_matrix(equations, opened)
    rates = equations.net_rates(equations.rates(t, y, segment))
    # c depends on v and T through w: dc/dv = -c/w, dc/dT = -c dead/w.
    by_w = -(by_c @ state.c) / state.w
    columns, rate_columns = [], []
    if system.volume_varies:
        per_v = rates + state.v * by_w
        rate_columns.append(per_v)
        columns.append(spread @ per_v)
    if system.temperature_varies:
        per_T = state.v * (by_T + system.dead * by_w)
        rate_columns.append(per_T)
        columns.append(spread @ per_T)
    size, edges = n + system.n_ledger, len(columns)
    right = np.zeros((size, edges))
    right[: n + opened] = np.column_stack(columns)
    by_states = np.column_stack(rate_columns)
    bottom = _edge_rows(equations, state, segment, rates, by_c, by_states)
    if system.exchanges_heat:
        right[-1, -1] = -system.exchange
    top = sparse.hstack([inner, sparse.csr_array(right)])
    return sparse.csc_array(sparse.vstack([top, sparse.csr_array(bottom)]))


def _edge_rows(
    equations: ArrayEquations,
    state: State,
    segment: Segment,
    rates: Floats,
    by_c: sparse.csr_array,
    by_edges: Floats,
) -> Floats:
    """Rows of dv/dt and dT/dt over the whole state [shape (1 or 2, size)]."""
    system = equations.system
    n, size = system.n_gases, system.size
    dT, T_row = segment.slope, np.zeros(size)
    if system.temperature_varies:
        dT, T_row = _temperature_row(equations, state, rates, by_c, by_edges)
    if not system.volume_varies:
        return T_row[None, :]
    per = R * state.T / system.held_pressure
    v_row = np.zeros(size)
    change = equations.change
    v_row[:n] = per * (change @ by_c) * state.v / state.w
    v_row[n + system.n_ledger :] = per * (change @ by_edges)
    v_row += state.v / state.T * T_row
    v_row[system.volume_index] += dT / state.T
    if not system.temperature_varies:
        return v_row[None, :]
    v_row[system.temperature_index] += (
        R / system.held_pressure * state.v * (change @ rates) - state.v * dT / state.T**2
    )
    return np.vstack([v_row, T_row])


def _temperature_row(
    equations: ArrayEquations,
    state: State,
    rates: Floats,
    by_c: sparse.csr_array,
    by_edges: Floats,
) -> tuple[float, Floats]:
    """dT/dt = (released + exchanged)/capacity and its derivative by every state."""
    system = equations.system
    n = system.n_gases
    energy, energy_slope = equations.reaction_energies(state.T)
    capacity, each, capacity_slope = equations.capacity(state.x, state.T)
    released = -float(rates @ energy) * state.v
    dT = (released + system.exchange * (system.surroundings - state.T)) / capacity
    row = np.zeros(system.size)
    row[:n] = (-(energy @ by_c) * state.v / state.w - dT * each) / capacity
    row[n + system.n_ledger :] = -(energy @ by_edges) / capacity
    by_T = -float(rates @ energy_slope) * state.v - system.exchange - dT * capacity_slope
    row[system.temperature_index] += by_T / capacity
    return dT, row
