"""The fill sheet: what to put in, in the terms of a gauge, a balance and a vacuum line."""

from __future__ import annotations

import math
from dataclasses import dataclass

from meanfree.constants import N_A, R
from meanfree.integrate.run import Run
from meanfree.report import wording
from meanfree.report.rows import NONE, Row, Sheet
from meanfree.report.sheets import amount_in


@dataclass(frozen=True)
class _State:
    """Total pressure [Pa] and temperature [K] at filling and at the start of the run."""

    p_fill: float
    T_fill: float
    p_start: float
    T_start: float

    def densities(self, share: float) -> list[float]:
        """Number densities of a share at filling and, where it differs, at the start [1/m^3]."""
        before = share * self.p_fill * N_A / (R * self.T_fill)
        after = share * self.p_start * N_A / (R * self.T_start)
        return [before] if self.same_density else [before, after]

    @property
    def same_density(self) -> bool:
        """True where heating changes pressures but not densities: a rigid vessel throughout."""
        ratio = self.p_fill * self.T_start / (self.p_start * self.T_fill)
        return abs(ratio - 1) < 1e-9


def fill(run: Run) -> Sheet:
    """The fill sheet: partial pressures at filling and in the run, moles, mass, number density."""
    experiment = run.experiment
    shown = wording.units_in_use(experiment)
    initial = experiment.temperature.initial
    state = _State(
        experiment.fill.pressure(experiment.vessel, initial),
        experiment.fill.temperature(initial),
        experiment.initial_pressure,
        initial,
    )
    unit = wording.pretty_unit(shown.pressure)
    filling, start = wording.temperature(state.T_fill), wording.temperature(initial)
    heading = [
        "Gas",
        "as given",
        f"at filling, {filling} ({unit})",
        f"at the start, {start} ({unit})",
    ]
    heading += ["mole fraction", f"amount ({wording.pretty_unit(shown.amount)})", "mass (mg)"]
    heading += ["number density (1/cm³)"] if state.same_density else []
    heading += [] if state.same_density else ["at filling (1/cm³)", "at the start (1/cm³)"]
    total, rows, mass = sum(experiment.moles.values()), [], 0.0
    for name in experiment.fill.names:
        n, gas = experiment.moles[name], experiment.gas_named[name]
        grams = math.nan if gas.molar_mass is None else n * gas.molar_mass.value * 1e3
        mass += grams
        portion = experiment.fill.gases.get(name)
        given = "balance" if portion is None else wording.as_written(portion.quantity)
        share = n / total if total > 0 else 0.0
        rows.append([wording.chemical(gas), given, *_filled(share, n, grams, state, shown)])
    whole = experiment.fill.total
    given = "" if whole is None else wording.as_written(whole.quantity)
    rows.append(["Total", given, *_filled(1.0, total, mass, state, shown)])
    return Sheet(heading, rows, words=(0,))


def _filled(share: float, n: float, grams: float, state: _State, shown: wording.UnitsInUse) -> Row:
    def pressure(p: float) -> str:
        return wording.quantity(p, shown.pressure, "pressure", 4).rsplit(" ", 1)[0]

    return [
        pressure(share * state.p_fill),
        pressure(share * state.p_start),
        wording.number(share, 4),
        amount_in(n, shown.amount),
        NONE if math.isnan(grams) else wording.number(1e3 * grams, 4),
        *(wording.number(1e-6 * density, 4) for density in state.densities(share)),
    ]
