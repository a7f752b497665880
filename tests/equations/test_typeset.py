"""The equations written out: complete, well formed, harmless, and the same as the numbers."""

from __future__ import annotations

import math
import re
import subprocess
import sys
from dataclasses import replace
from xml.etree import ElementTree

import pytest
from formula_values import Known, texts, value
from random_experiments import MAKERS, random_experiment
from written_cases import dinitrogen_tetroxide, simple

from meanfree.equations.typeset import equation_sheet
from meanfree.equations.typeset.names import SERIES, SLOTS, gas_label, slot
from meanfree.equations.typeset.parts import calls
from meanfree.equations.typeset.plain import Plain
from meanfree.equations.typeset.tree import (
    Call,
    Cases,
    Concentration,
    Node,
    Number,
    Power,
    Relation,
    Symbol,
    Total,
    Words,
    Written,
)
from meanfree.experiment.mechanism import Step
from meanfree.gases.formula import parse_formula
from meanfree.gases.gas import Gas
from meanfree.rates.fixed import Fixed
from meanfree.rates.law import Law, StepContext
from meanfree.sourced import Sourced as S

MATH = "{http://www.w3.org/1998/Math/MathML}"


SIMPLE = """\
Balances
  dn(A)/dt = −V r₁
  dn(lump_1)/dt = V r₁
  [X] = n(X)/V    (for every gas X)
  d[A]/dt = −r₁
  d[lump_1]/dt = r₁

Step 1, A
  A → lump_1
  r₁ = k₁ [A]
  k₁ = 0.5 s⁻¹    (law: fixed, k counts events)

Vessel
  p = R T Σᵢ nᵢ/V    (the volume is held)
  V = 0.001 m³

Temperature
  T = 400 K    (held)

Constants
  R = 8.31446 J mol⁻¹ K⁻¹
"""

RICH = """\
Balances
  dn(N₂O₄)/dt = V (−r₁ + r₋₁)
  dn(NO₂)/dt = V (2 r₁ − 2 r₋₁)
  dn(Ar)/dt = 0    (takes no part)
  [X] = n(X)/(V + V_d T/T_d)    (for every gas X, at one pressure in vessel and dead space)

Step 1, dissociation
  N₂O₄ + M ⇌ 2 NO₂ + M
  r₁ = k₁ [N₂O₄] [M]
  r₋₁ = k₋₁ [NO₂]² [M]
  [M] = [N₂O₄] + [NO₂] + 0.6 [Ar]
  k₁ = A (T/T_ref)^n exp(−E/(R T))    (law: arrhenius, k counts events)
  A = 2×10⁶ m³ mol⁻¹ s⁻¹
  n = 1.5
  T_ref = 300 K
  E = 54000 J mol⁻¹
  k₋₁ = k₁/K_c,1
  K_c,1 = K₁ p°/(R T)
  K₁ = K_given,1 (R T_given,1/p°) exp(−(ΔH°₁/R) (1/T − 1/T_given,1))    (1 bar)
  K_given,1 = 100 mol m⁻³    (a table)
  ΔH°₁ = 57000 J mol⁻¹
  T_given,1 = 340 K

Vessel
  V = (R T/p) Σᵢ nᵢ − T V_d/T_d    (the pressure is held)
  dV/dt = (R T/p) Σᵢ dnᵢ/dt + (V/T) dT/dt
  V = 0.001 m³    (at time zero)
  p = 100000 Pa
  V_d = 2×10⁻⁵ m³    (dead space)
  T_d = 296 K    (dead space)

Temperature
  T = { 300 K + 1 K s⁻¹ t where t < 60 s; 360 K − 0.5 K s⁻¹ (t − 60 s) where t < 90 s; \
345 K after that }

Constants
  R = 8.31446 J mol⁻¹ K⁻¹
  p° = 100000 Pa
"""


def test_text_of_a_simple_case_in_full() -> None:
    assert equation_sheet(simple("A", "lump_1")).text == SIMPLE


def test_text_of_a_rich_case_in_full() -> None:
    assert equation_sheet(dinitrogen_tetroxide()).text == RICH


@pytest.mark.parametrize("index", range(60))
def test_every_formula_is_well_formed(index: int) -> None:
    """MathML parses as XML and has no element without its children; LaTeX braces are paired."""
    experiment = random_experiment(index)
    for group in equation_sheet(experiment).groups:
        for entry in group.entries:
            root = ElementTree.fromstring(entry.mathml)
            assert root.tag == f"{MATH}math"
            assert_arity(root)
            plain = re.sub(r"\\[{}\\]", "", entry.latex)
            assert plain.count("{") == plain.count("}")
            opened, closed = r"\\left(?![a-z])", r"\\right(?![a-z])"
            assert len(re.findall(opened, plain)) == len(re.findall(closed, plain))
            assert entry.text
            assert "\n" not in entry.text


def assert_arity(element: ElementTree.Element) -> None:
    """The numbers of children that MathML Core asks for."""
    wanted = {"mfrac": 2, "msub": 2, "msup": 2, "munder": 2, "msubsup": 3}
    name = element.tag.removeprefix(MATH)
    if name in wanted:
        assert len(element) == wanted[name], ElementTree.tostring(element)
    for child in element:
        assert_arity(child)


@pytest.mark.parametrize("index", range(0, 60, 7))
def test_every_gas_has_its_balance_once(index: int) -> None:
    experiment = random_experiment(index)
    lines = texts(equation_sheet(experiment))
    for gas in experiment.gases:
        head = f"dn({Plain().write(gas_label(gas))})/dt = "
        assert sum(line.startswith(head) for line in lines) == 1


@pytest.mark.parametrize("index", range(60))
def test_balances_hold_every_rate_with_its_number(index: int) -> None:
    """The balance of a gas, evaluated as it is written, is its row of net numbers."""
    experiment = random_experiment(index)
    sheet = equation_sheet(experiment)
    rates = {}
    for j in range(1, len(experiment.steps) + 1):
        rates[Symbol("r", str(j))] = 1.7**j
        rates[Symbol("r", f"−{j}")] = 0.3 + 1.1**j
    balances = [e.formula for e in sheet.groups[0].entries[: len(experiment.gases)]]
    for gas, balance in zip(experiment.gases, balances, strict=True):
        expected = 0.0
        for j, step in enumerate(experiment.steps, start=1):
            back = rates[Symbol("r", f"−{j}")] if step.reverse is not None else 0.0
            expected += step.net.get(gas.name, 0.0) * (rates[Symbol("r", str(j))] - back)
        assert isinstance(balance, Relation)
        found = value(balance.rows[0], {**rates, Symbol("V"): 1.0})
        assert found == pytest.approx(expected, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("index", range(60))
def test_written_rate_constants_are_the_numbers_of_the_laws(index: int) -> None:
    """A formula is evaluated from its own tree, with the numbers as they are printed."""
    experiment = random_experiment(index)
    for j, group in enumerate(equation_sheet(experiment).groups[1:-3]):
        step = experiment.steps[j]
        context = experiment.context(step)
        known: Known = {Symbol("T"): 470.0, Symbol("R"): 8.314462618}
        known |= {Symbol("k", "B"): 1.380649e-23, Symbol("N", "A"): 6.02214076e23}
        known[Symbol("π")] = math.pi
        for name, number in zip(
            step.law.template(context).slots, step.law.numbers(context), strict=True
        ):
            known[slot(name)[0]] = number
        known |= {Concentration(Words("M")): 35.0, Symbol("[M]", str(j + 1)): 35.0}
        known[Symbol("p")] = 1.2e5
        formulas = [e.formula for e in group.entries if e.kind == "equation"]
        for formula in formulas:
            assert isinstance(formula, Relation)
            if formula.left in WITHIN_A_LAW:
                known[formula.left] = formula.rows[0]
            elif formula.left == Call("lg", Symbol("F")):
                known[Symbol("F")] = Power(Number(10.0), formula.rows[0])
        for formula in formulas:
            if formula.left == Symbol("k", str(j + 1)):
                assert_is_rate_constant(formula.rows[0], known, step.law, context)


WITHIN_A_LAW = [Symbol("P", "r"), Symbol("k", "0"), Symbol("k", "∞"), Symbol("F", "c"), Symbol("N")]


def assert_is_rate_constant(formula: Node, known: Known, law: Law, context: StepContext) -> None:
    if {"linear", "k"} & calls(formula):
        return  # given by a table, beside which words stand
    expected = float(law.rate_constant(context, 470.0, 1.2e5, 35.0))
    # The constants above are typed with ten digits.
    assert value(formula, known) == pytest.approx(expected, rel=1e-8)


def test_names_that_are_formulas_get_subscripts_and_others_do_not() -> None:
    plain = Plain()
    shown = {
        "N2O4": "N₂O₄",
        "(CH3)2CO": "(CH₃)₂CO",
        "H3O+": "H₃O⁺",
        "NH4+": "NH₄⁺",
        "[Ca]2+": "[Ca]²⁺",
        "SO4^2-": "SO₄²⁻",
        "e-": "e⁻",
    }
    for name, expected in shown.items():
        assert plain.write(gas_label(Gas(name, parse_formula(name)))) == expected
    assert plain.write(gas_label(Gas("c-C3H6", parse_formula("C3H6")))) == "c-C₃H₆"
    assert plain.write(gas_label(Gas("propene", parse_formula("C3H6")))) == "propene"
    # A label is no formula even where it looks like one.
    assert plain.write(gas_label(Gas.label("N2O4"))) == "N2O4"


def test_cases_are_laid_out_as_rows() -> None:
    written = Written.below(Symbol("x"), 2.0, Symbol("a"), Symbol("b"))
    assert isinstance(written, Cases)
    assert Plain().write(written) == "{ a where x < 2; b otherwise }"


def test_a_large_mechanism_says_how_much_is_shown() -> None:
    names = [f"G{i}" for i in range(100)]
    sheet = equation_sheet(simple(*names))
    assert sheet.as_text_only
    assert sheet.remark == "Shown: 40 of 100 gases and 1 of 1 steps."
    assert sum(text.startswith("dn(") for text in texts(sheet)) == 40
    assert (
        sum(text.startswith("dn(") for text in texts(equation_sheet(simple(*names), None))) == 100
    )


def test_a_long_balance_goes_over_several_lines() -> None:
    steps = tuple(Step(f"s{i}", (("A", 1.0),), (("B", 1.0),), Fixed(S(1.0 + i))) for i in range(14))
    sheet = equation_sheet(replace(simple("A", "B"), steps=steps))
    balance = sheet.groups[0].entries[0]
    assert isinstance(balance.formula, Relation)
    assert len(balance.formula.rows) == 3
    assert balance.text.startswith("dn(A)/dt = V (−r₁ − r₂ − r₃ − r₄ − r₅ − r₆ − r₇")
    assert balance.text.endswith("− r₁₃ − r₁₄)")
    assert "mtable" in balance.mathml
    assert r"\begin{aligned}" in balance.latex


def test_every_number_of_every_law_has_a_symbol_and_a_unit() -> None:
    for index in range(60):
        experiment = random_experiment(index)
        for step in experiment.steps:
            for name in step.law.template(experiment.context(step)).slots:
                assert name in SLOTS or name.partition("_")[0] in SERIES, (step.law.word, name)
    assert MAKERS


def test_writing_needs_no_sympy() -> None:
    code = (
        "import sys; from meanfree.equations.typeset import equation_sheet;"
        "assert not {'sympy', 'matplotlib', 'pandas', 'numba'} & set(sys.modules)"
    )
    subprocess.run([sys.executable, "-c", code], check=True)


def test_sums_over_an_index_stand_without_brackets_only_at_the_end() -> None:
    total = Total(Symbol("n", "i"))
    assert Plain().write(Symbol("V") * total) == "V Σᵢ nᵢ"
    assert Plain().write(total * Symbol("V")) == "(Σᵢ nᵢ) V"
