"""The balances of a batch vessel as a textbook writes them, straight from the Experiment.

No arrays, no shared code with the readers under test, and every function takes complex
numbers, so that a derivative by a complex step (Squire and Trapp, SIAM Review 40, 110, 1998) is
exact to rounding.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.polynomial import chebyshev
from plain_walls import on_the_wall
from scipy.constants import N_A, R, e, epsilon_0, k
from scipy.special import gamma as gamma_function

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.mechanism import GivenEquilibrium, Step
from meanfree.experiment.temperature import Exchange, Program, has_energy_balance
from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.capture import Capture
from meanfree.rates.collision import Collision
from meanfree.rates.cross_section import CrossSection
from meanfree.rates.falloff import Falloff
from meanfree.rates.fixed import Fixed
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.source import Source
from meanfree.rates.table import Table
from meanfree.rates.wall import Wall

P0 = 1e5


@dataclass
class Parts:
    """Rates of the one-way steps times the volume ratio, and what they bring."""

    flow: np.ndarray  # [mol/m^3/s over V0], one a one-way step
    net: list[dict[str, float]]
    energy: np.ndarray  # [J/mol]
    opened: list[int]
    capacity: Any  # [J/K/m^3 over V0]
    dy: np.ndarray


def _argument(series: Any, T: Any) -> Any:
    low, high = series.domain
    return np.log(T * T / (low * high)) / np.log(high / low)


def enthalpy(gas: Any, T: Any) -> Any:
    """H [J/mol]"""
    series = gas.thermochemistry
    return chebyshev.chebval(_argument(series, T), series.enthalpy_coefficients)


def entropy(gas: Any, T: Any) -> Any:
    """S [J/mol/K]"""
    series = gas.thermochemistry
    return chebyshev.chebval(_argument(series, T), series.entropy_coefficients)


def heat_capacity(gas: Any, T: Any) -> Any:
    """Cp [J/mol/K]"""
    series = gas.thermochemistry
    return chebyshev.chebval(_argument(series, T), series.heat_capacity_coefficients)


def rate_constant(experiment: Experiment, step: Step, T: Any, p: Any, M: Any) -> Any:
    """k of the step as written, from the definitions of the laws."""
    law = step.law
    if isinstance(law, Fixed):
        return law.k.value
    if isinstance(law, Arrhenius):
        return law.A.value * (T / law.T_ref.value) ** law.n.value * np.exp(-law.Ea.value / (R * T))
    if isinstance(law, Photolysis):
        return law.J.value
    if isinstance(law, Source):
        return law.rate.value
    if isinstance(law, Falloff):
        return _between_limits(law, T, M)
    if isinstance(law, Wall):
        return on_the_wall(experiment, law, step, T, p)
    if isinstance(law, Table):
        return _between_points(law, T)
    a, b = (experiment.gas_named[name] for name in step.partners)
    if isinstance(law, CrossSection):
        return _average(law, a, b, T)
    if isinstance(law, Capture):
        mu = a.molar_mass.value * b.molar_mass.value / (a.molar_mass.value + b.molar_mass.value)
        s = 0.5 if a.name == b.name else 1.0
        if law.attraction != "dispersion":
            return _of_an_ion(law, b if a.charge else a, mu / N_A, T)
        # The average of v (3 pi/2) (2 C6/E)^(1/3), the largest impact that passes -C6/r^6
        # (Levine, Molecular Reaction Dynamics, 2005, section 3.2 (from memory)).
        number = 2 ** (11 / 6) * gamma_function(2 / 3) * np.pi**0.5
        C6 = law.C6.value
        return number * s * N_A * C6 ** (1 / 3) * (mu / N_A) ** -0.5 * (k * T) ** (1 / 6)
    assert isinstance(law, Collision), "a new law needs its definition here"
    d = law.diameter.value if law.diameter else (a.diameter.value + b.diameter.value) / 2
    m_a, m_b = a.molar_mass.value / N_A, b.molar_mass.value / N_A
    speed = np.sqrt(8 * k * T / (np.pi * m_a * m_b / (m_a + m_b)))
    Z = np.pi * d**2 * speed * N_A / (2 if a.name == b.name else 1)
    if law.threshold is not None:
        return law.steric.value * Z * np.exp(-law.threshold.value / (R * T))
    # A/Z = k exp(Ea/RT)/Z at Ea_at, and Ea = E0 + RT/2 there
    E0 = law.Ea.value - R * law.Ea_at.value / 2
    at = law.Ea_at.value
    P = law.A_over_Z.value * np.exp(-law.Ea.value / (R * at)) / np.exp(-E0 / (R * at))
    return P * Z * np.exp(-E0 / (R * T))


def _of_an_ion(law: Capture, neutral: Any, mu: float, T: Any) -> Any:
    """2 pi e sqrt(alpha/mu) in electrostatic units, times K(x) for a neutral with a dipole.

    T. Su and W. J. Chesnavich, J. Chem. Phys. 76, 5183 (1982) (from memory).
    """
    alpha = 4 * np.pi * epsilon_0 * law.polarisability[neutral.name].value  # [C m^2/V]
    langevin = N_A * e / (2 * epsilon_0) * np.sqrt(alpha / mu)
    if law.dipole is None:
        return langevin
    x = law.dipole.value / np.sqrt(2 * alpha * k * T)
    rising = 0.4767 * x + 0.6200
    return langevin * (rising if np.real(x) >= 2 else (x + 0.5090) ** 2 / 10.526 + 0.9754)


def _limit(limit: Any, T: Any) -> Any:
    power = (T / limit.T_ref.value) ** limit.n.value
    return limit.A.value * power * np.exp(-limit.Ea.value / (R * T))


def _between_limits(law: Falloff, T: Any, M: Any) -> Any:
    """k = k0 M/(1 + Pr) F, lg F = lg Fc/(1 + (lg Pr/N)^2) (Troe, J. Phys. Chem. 83, 114, 1979)."""
    low, high = _limit(law.k0, T), _limit(law.kinf, T)
    reduced = low * M / high
    k = low * M / (1 + reduced)
    if law.Fc is None:
        return k
    Fc = law.Fc.constant.value
    for term in law.Fc.terms:
        at = term.scale.value / T if term.rises else T / term.scale.value
        Fc = Fc + term.weight.value * np.exp(-at)
    N = 1 if law.broadening == "unit width" else 0.75 - 1.27 * np.log10(Fc)
    return k * 10 ** (np.log10(Fc) / (1 + (np.log10(reduced) / N) ** 2))


def _between_points(law: Table, T: Any) -> Any:
    """ln k linear in 1/T between the two neighbours of T, or the two last points."""
    kelvins = [point.T.value for point in law.points]
    i = min(max(sum(np.real(T) > hot for hot in kelvins) - 1, 0), len(kelvins) - 2)
    (T0, k0), (T1, k1) = ((p.T.value, p.k.value) for p in law.points[i : i + 2])
    return k0 * np.exp(np.log(k1 / k0) * (1 / T - 1 / T0) / (1 / T1 - 1 / T0))


def _average(law: CrossSection, a: Any, b: Any, T: Any) -> Any:
    """k = s N_A sqrt(8/(pi mu (k_B T)^3)) times the integral of sigma E exp(-E/k_B T) dE.

    Energies in J/mol; Gauss-Legendre between the points, Gauss-Laguerre after the last.
    """
    mu = a.molar_mass.value * b.molar_mass.value / (a.molar_mass.value + b.molar_mass.value) / N_A
    s = 0.5 if a.name == b.name else 1.0
    if law.shape == "points":
        energies = [point.energy.value for point in law.points]
        areas = [point.cross_section.value for point in law.points]
    else:
        energies, areas = [law.threshold.value], [law.cross_section.value]
    integral: Any = 0.0
    nodes, weights = np.polynomial.legendre.leggauss(24)
    for (E0, s0), (E1, s1) in pairwise(zip(energies, areas, strict=True)):
        E = (E0 + E1) / 2 + (E1 - E0) / 2 * nodes
        sigma = s0 + (s1 - s0) * (E - E0) / (E1 - E0)
        integral = integral + np.sum(weights * sigma * E * np.exp(-E / (R * T))) * (E1 - E0) / 2
    nodes, weights = np.polynomial.laguerre.laggauss(24)
    width = R * np.real(T)
    E = energies[-1] + width * nodes
    tails = {
        "line of centres": lambda: areas[0] * (1 - energies[0] / E),
        "constant above threshold": lambda: areas[0],
        "constant": lambda: areas[-1],
        "zero": lambda: 0.0,
        "linear": lambda: (
            areas[-1] + (areas[-1] - areas[-2]) * (E - energies[-1]) / (energies[-1] - energies[-2])
        ),
        "falling as 1/E": lambda: areas[-1] * energies[-1] / E,
    }
    sigma = tails[law.beyond if law.shape == "points" else law.shape]()
    tail = np.sum(weights * sigma * E * np.exp(nodes - E / (R * T))) * width
    return s * N_A * np.sqrt(8 * k * T / (np.pi * mu)) * (integral + tail) / (R * T) ** 2


def _is_lit(law: Photolysis, t: float) -> float:
    """1 between a time at which the lamp goes on and the next at which it goes off, else 0."""
    changes = sorted([(on.value, 1.0) for on in law.on] + [(off.value, 0.0) for off in law.off])
    state = 1.0 - changes[0][1] if changes else 1.0
    for time, after in changes:
        state = after if time <= t else state
    return state


def concentration_constant(experiment: Experiment, step: Step, T: Any) -> Any:
    """K_c(T) [(mol/m^3)^change]"""
    change = sum(n for _, n in step.products) - sum(n for _, n in step.reactants)
    given = step.reverse
    if isinstance(given, GivenEquilibrium):
        at = given.at.value
        # K_c = K (p0/RT)^change = K_p/(RT)^change; only K and K_p follow van 't Hoff with dH
        K_p = {
            "Kp": given.constant.value,
            "Kc": given.constant.value * (R * at) ** change,
            "K": given.constant.value * P0**change,
        }[given.kind]
        heat = 0.0 if given.enthalpy is None else given.enthalpy.value
        return K_p * np.exp(-heat / R * (1 / T - 1 / at)) / (R * T) ** change
    dG = 0.0
    for name, number in [*step.products, *((g, -n) for g, n in step.reactants)]:
        gas = experiment.gas_named[name]
        dG = dG + number * (enthalpy(gas, T) - T * entropy(gas, T))
    return np.exp(-dG / (R * T)) * (P0 / (R * T)) ** change


def program(experiment: Experiment, t: float) -> tuple[float, float]:
    """Temperature and its slope at a time, from the points."""
    points = [(time.value, T.value) for time, T in experiment.temperature.points]
    for (t0, T0), (t1, T1) in pairwise(points):
        if t0 <= t < t1:
            return T0 + (T1 - T0) * (t - t0) / (t1 - t0), (T1 - T0) / (t1 - t0)
    return points[-1][1], 0.0


def parts(experiment: Experiment, t: float, y: np.ndarray) -> Parts:
    """dy/dt and what it is made of, for a state in the order of the System."""
    mode, rigid, V0 = experiment.temperature, experiment.vessel.is_rigid, experiment.initial_volume
    free, names = has_energy_balance(mode), [gas.name for gas in experiment.gases]
    n = dict(zip(names, y[: len(names)] * V0, strict=True))
    T, slope = (
        (y[-1], 0.0)
        if free
        else (mode.initial, 0.0)
        if not isinstance(mode, Program)
        else program(experiment, t)
    )
    V = V0 if rigid else V0 * y[-2 if free else -1]
    # One pressure and composition in hot part and dead space: n = p/R (V/T + Vd/Td), c = p/RT.
    c = {name: n[name] / (V + experiment.dead_capacity * T) for name in names}
    p = R * T * sum(c.values()) if rigid else experiment.held_pressure
    flow, net, energy, opened = [], [], [], []
    for step in experiment.steps:
        M: Any = 1.0
        if step.bath is not None:
            M = sum(step.bath.efficiency(name) * c[name] for name in names)
        lit = _is_lit(step.law, t) if isinstance(step.law, Photolysis) else 1.0
        ways = [(1, lit * rate_constant(experiment, step, T, p, M), dict(step.orders))]
        if step.reverse is not None:
            back = ways[0][1] / concentration_constant(experiment, step, T)
            ways.append((-1, back, step.reverse_orders))
        for sign, constant, orders in ways:
            r = constant
            for name, order in orders.items():
                r = r * c[name] ** order
            if not step.law.bath_inside:
                r = r * M
            if not step.reactants or not step.products:
                opened.append(len(flow))
            numbers = {name: sign * number for name, number in step.net.items()}
            flow.append(r * V / V0)
            net.append(numbers)
            if free:
                energy.append(_energy(experiment, step, sign, numbers, T, rigid))
    return _assemble(experiment, y, np.array(flow), net, np.array(energy), opened, n, T, V, slope)


def _energy(
    experiment: Experiment, step: Step, sign: int, numbers: dict[str, float], T: Any, rigid: bool
) -> Any:
    """Energy that one mole of events takes up: dU in a rigid vessel, dH in a piston."""
    if not step.reactants or not step.products:
        heat: Any = 0.0  # what flows in or out has the enthalpy of the gas
    elif step.heat is not None:
        heat = -sign * step.heat.value
    else:
        heat = sum(
            number * enthalpy(experiment.gas_named[name], T) for name, number in numbers.items()
        )
    if step.photon is not None:
        heat = heat - step.photon.value
    return heat - sum(numbers.values()) * R * T if rigid else heat


def _assemble(
    experiment: Experiment,
    y: np.ndarray,
    flow: np.ndarray,
    net: list[dict[str, float]],
    energy: np.ndarray,
    opened: list[int],
    n: dict[str, Any],
    T: Any,
    V: Any,
    slope: float,
) -> Parts:
    mode, rigid, V0 = experiment.temperature, experiment.vessel.is_rigid, experiment.initial_volume
    names, capacity = list(n), 0.0
    dx = [sum(f * row.get(name, 0.0) for f, row in zip(flow, net, strict=True)) for name in names]
    dy = [*dx, *(flow[j] for j in opened)]
    dT: Any = slope
    if has_energy_balance(mode):
        exchanged = 0.0
        if isinstance(mode, Exchange):
            exchanged = mode.conductance.value * (mode.surroundings.value - T) / V0
            dy.append(exchanged)
        for name in names:
            cp = heat_capacity(experiment.gas_named[name], T)
            capacity = capacity + n[name] / V0 * (cp - R if rigid else cp)
        if isinstance(mode, Exchange) and mode.wall_heat_capacity is not None:
            capacity = capacity + mode.wall_heat_capacity.value / V0
        dT = (exchanged - np.sum(flow * energy)) / capacity
    if not rigid:
        # V = T (R sum(n)/p - Vd/Td), differentiated with the held p
        p = experiment.held_pressure
        dy.append(R * T / p * sum(dx) + V / V0 / T * dT)
    if has_energy_balance(mode):
        dy.append(dT)
    return Parts(flow, net, energy, opened, capacity, np.array(dy))


def derivative(experiment: Experiment, t: float, y: np.ndarray) -> np.ndarray:
    """dy/dt"""
    return parts(experiment, t, y).dy


def complex_step(experiment: Experiment, t: float, y: np.ndarray) -> list[Parts]:
    """`parts` with each state in turn moved by i h, h 1e-30 of its size."""
    moved = []
    for j in range(len(y)):
        z = y.astype(complex)
        z[j] += 1e-30j
        moved.append(parts(experiment, t, z))
    return moved


def jacobian(experiment: Experiment, t: float, y: np.ndarray) -> np.ndarray:
    """d(dy/dt)/dy, shape (size, size)."""
    return np.column_stack([moved.dy.imag / 1e-30 for moved in complex_step(experiment, t, y)])
