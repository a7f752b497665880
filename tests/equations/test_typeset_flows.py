"""Flows and samples written out: evaluated as they stand, they are what is computed."""

from __future__ import annotations

from dataclasses import replace

import pytest
from encounters import molecule
from formula_values import Known, texts, value
from laboratory import experiment, si, step

from meanfree.constants import R
from meanfree.equations.arrays import ArrayEquations
from meanfree.equations.build import build_system
from meanfree.equations.typeset import EquationSheet, equation_sheet
from meanfree.equations.typeset.names import gas_label
from meanfree.equations.typeset.tree import (
    Concentration,
    Node,
    Relation,
    Row,
    Symbol,
    Total,
)
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.flows import Flow
from meanfree.experiment.samples import Sample
from meanfree.experiment.temperature import Adiabatic
from meanfree.experiment.vessel import Shape
from meanfree.rates.falloff import Falloff
from meanfree.rates.limits import PowerLaw
from meanfree.rates.termolecular import Termolecular
from meanfree.rates.wall import Wall

GASES = [molecule(name) for name in ("N2O4", "NO2", "Ar", "He")]
FILL = {"N2O4": 1.5, "Ar": 4.0, "He": 2.0}
FLOWS = (
    Flow("effusion", hole=si(3e-9), transmission=si(0.5)),
    Flow("pumping", rate=si(2e-3)),
    Flow("dilution", rate=si(1e-3), entering={"Ar": si(1.0), "He": si(3.0)}),
    Flow("leak-up", rise=si(0.2), entering={"Ar": si(1.0)}),
)
T = 400.0


def flowing(holds: str = "volume") -> Experiment:
    made = experiment([step("N2O4 -> 2 NO2", 0.01)], FILL, gases=GASES, T=T, holds=holds, until=9.0)
    return replace(made, flows=FLOWS)


def numbers(sheet: EquationSheet, heading: str) -> Known:
    """Symbol and value of every number of a group, as printed."""
    found: Known = {}
    for group in sheet.groups:
        for entry in group.entries if group.heading == heading else ():
            if entry.kind == "number":
                assert isinstance(entry.formula, Relation)
                (right,) = entry.formula.rows
                assert isinstance(right, Row)
                first = right.parts[0]
                assert isinstance(first, Node)
                found[entry.formula.left] = value(first, {})
    return found


@pytest.mark.parametrize("holds", ["volume", "pressure"])
def test_balances_with_flows_are_what_is_computed(holds: str) -> None:
    """Each balance, evaluated as written, is the derivative that the integrator gets."""
    made = flowing(holds)
    system, sheet = build_system(made), equation_sheet(made)
    c = dict(zip(system.gases, system.initial_x, strict=True))
    known = numbers(sheet, "Flows")
    assert len(known) == len(FLOWS)
    known[Total(Concentration(Symbol("i")))] = sum(c.values())
    known |= {Symbol("V"): 1.0, Symbol("r", "1"): 0.01 * c["N2O4"]}
    for gas in GASES:
        assert gas.molar_mass is not None
        known[Concentration(gas_label(gas))] = c[gas.name]
        speed = (8 * R * T / (3.141592653589793 * gas.molar_mass.value)) ** 0.5
        known[Symbol("v", gas_label(gas))] = speed
    expected = ArrayEquations(system).derivative(0.0, system.initial_state, system.segments[0])
    for i, entry in enumerate(sheet.groups[0].entries[: len(GASES)]):
        assert isinstance(entry.formula, Relation)
        # The numbers of the flows are those of the steps behind them, added in another order.
        assert value(entry.formula.rows[0], known) == pytest.approx(expected[i], rel=1e-12)


def test_what_all_flows_bring_is_in_the_energy_balance() -> None:
    """(sum n C) dT/dt = -V sum r dU + R T q: q is the sum of the flows' parts of the balances."""
    made = replace(flowing(), temperature=Adiabatic(si(T)))
    lines = texts(equation_sheet(made))
    assert "q_flow = V (−a_f1 Σᵢ vᵢ [i] − k_f2 Σᵢ [i] + s_f4)" in lines
    (balance,) = [line for line in lines if line.startswith("(Σᵢ nᵢ C_V,i) dT/dt")]
    assert balance.endswith("= −V r₁ ΔU₁ + R T q_flow")
    piston = texts(equation_sheet(replace(flowing("pressure"), temperature=made.temperature)))
    assert not any(line.endswith("R T q_flow") for line in piston)


def test_samples_are_written_as_what_they_leave() -> None:
    made = flowing()
    drawn = (Sample(si(2.0), fraction=si(0.1)), Sample(si(5.0), volume=si(2e-5)))
    rigid = texts(equation_sheet(replace(made, samples=drawn)))
    # 20 mL of 1 L
    assert {"n(X) → 0.9 n(X)", "n(X) → 0.98 n(X)"} <= set(rigid)
    piston = texts(equation_sheet(replace(flowing("pressure"), samples=drawn)))
    assert {"n(X) → 0.9 n(X)", "n(X) → n(X) − 2×10⁻⁵ m³ [X]"} <= set(piston)


def test_nothing_is_written_where_nothing_flows() -> None:
    headings = [group.heading for group in equation_sheet(replace(flowing(), flows=())).groups]
    assert not {"Flows", "Samples"} & set(headings)


def test_an_exponential_of_nothing_is_left_out() -> None:
    law = Termolecular(si(50.0), n=si(-1.5), T_ref=si(300.0))
    made = experiment([step("N2O4 + He + M -> 2 NO2 + He + M", law)], FILL, gases=GASES, T=T)
    assert any(line.endswith("= A (T/T_ref)^n") for line in texts(equation_sheet(made)))


def test_a_number_that_is_k_itself_stands_once() -> None:
    made = experiment([step("N2O4 + He + M -> 2 NO2 + He + M", Termolecular(si(50.0)))], FILL,
                      gases=GASES, T=T)  # fmt: skip
    found = [line for line in texts(equation_sheet(made)) if line.startswith("k₁ = ")]
    assert found == ["k₁ = 50 m⁶ mol⁻² s⁻¹"]


def test_what_depends_on_pressure_is_shown_as_filled() -> None:
    """Neither the empty vessel's k of a wall (free flight) nor that of falloff, which is 0."""
    limits = Falloff(PowerLaw(si(0.02)), PowerLaw(si(0.3)))
    D = {"diffusion": si(2e-5), "diffusion_at": si(T), "diffusion_pressure": si(1e5)}
    steps = [
        step("N2O4 -> 2 NO2", Wall(si(0.05), "exact", **D)),
        step("N2O4 + M -> 2 NO2 + M", limits),
    ]
    made = experiment(steps, FILL, gases=GASES, T=T)
    made = replace(made, vessel=replace(made.vessel, shape=Shape("sphere")))
    entries = [e for g in equation_sheet(made).groups for e in g.entries]
    shown = {e.text.split(" ")[0]: e for e in entries if e.remark.endswith("as filled")}
    M = sum(FILL.values())
    assert shown["k₂"].text == f"k₂ = {0.3 * 0.02 * M / (0.3 + 0.02 * M):.6g} s⁻¹"
    context = made.context(steps[0])
    wall = steps[0].law.rate_constant(context, T, M * R * T)
    assert shown["k₁"].text == f"k₁ = {wall:.6g} s⁻¹"
    assert wall < 0.9 * steps[0].law.rate_constant(context, T, 0.0)
