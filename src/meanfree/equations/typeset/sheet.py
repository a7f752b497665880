"""The equations of an experiment as a reader wants them: balances, rates, vessel, temperature."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from meanfree import constants
from meanfree.equations.typeset import names
from meanfree.equations.typeset.flows import flow_lines, flow_terms, sample_lines
from meanfree.equations.typeset.latex import LaTeX
from meanfree.equations.typeset.mathml import mathml
from meanfree.equations.typeset.parts import parts_of
from meanfree.equations.typeset.plain import Plain
from meanfree.equations.typeset.steps import P_STANDARD, Line, StepWriter, T, valued
from meanfree.equations.typeset.surroundings import temperature_lines, vessel_lines
from meanfree.equations.typeset.tree import (
    Concentration,
    Derivative,
    Fraction,
    Node,
    Relation,
    Row,
    Sum,
    Symbol,
    Words,
    add,
    equals,
    multiply,
)
from meanfree.experiment.experiment import Experiment

MOST = 40
"""Gases (and steps) that are set as formulas; of more, so many are shown, as text."""

TERMS_A_LINE = 6


@dataclass(frozen=True)
class Entry:
    """One formula in three outputs.

    ``kind`` is "reaction", "equation" or "number"; ``remark`` is plain text, not escaped for any
    output (no markup is ever in it).
    """

    formula: Node
    kind: str = "equation"
    remark: str = ""

    @property
    def mathml(self) -> str:
        """With ``<math>`` around it; safe to put into a page as it stands."""
        return mathml(self.formula)

    @property
    def latex(self) -> str:
        """For display mathematics, with amsmath; safe to compile."""
        return LaTeX().write(self.formula)

    @property
    def text(self) -> str:
        """One line of Unicode."""
        return Plain().write(self.formula)


@dataclass(frozen=True)
class Group:
    """Entries under one heading (plain text, not escaped for any output)."""

    heading: str
    entries: tuple[Entry, ...]


@dataclass(frozen=True)
class EquationSheet:
    """All equations of an experiment, grouped.

    ``as_text_only`` says that there are too many to set as formulas; ``remark`` then says how many
    of how many are shown.
    """

    title: str
    groups: tuple[Group, ...]
    remark: str = ""
    as_text_only: bool = False

    @property
    def text(self) -> str:
        """The whole sheet for a terminal."""
        blocks = [self.remark] if self.remark else []
        for group in self.groups:
            lines = [group.heading]
            for entry in group.entries:
                note = f"    ({entry.remark})" if entry.remark else ""
                lines.append(f"  {entry.text}{note}")
            blocks.append("\n".join(lines))
        return "\n\n".join(blocks) + "\n"


def equation_sheet(experiment: Experiment, most: int | None = MOST) -> EquationSheet:
    """The equations of an experiment.

    ``most`` is how many gases and steps are shown where there are more (None: all).
    """
    n_gases, n_steps = len(experiment.gases), len(experiment.steps)
    large = n_gases > MOST or n_steps > 2 * MOST
    shown = n_gases if most is None or not large else min(most, n_gases)
    shown_steps = n_steps if most is None or not large else min(most, n_steps)
    baths = {str(step.bath) for step in experiment.steps if step.bath is not None}
    writers = [StepWriter(experiment, j + 1, len(baths) > 1) for j in range(n_steps)]
    groups = [Group("Balances", _entries(_balances(experiment, writers, shown)))]
    groups += [Group(_heading(w), _entries(w.lines())) for w in writers[:shown_steps]]
    groups.append(Group("Flows", _entries(flow_lines(experiment))))
    groups.append(Group("Samples", _entries(sample_lines(experiment))))
    groups.append(Group("Vessel", _entries(vessel_lines(experiment))))
    groups.append(Group("Temperature", _entries(temperature_lines(experiment, writers))))
    groups.append(Group("Constants", _entries(_constants(groups))))
    remark = ""
    if shown < n_gases or shown_steps < n_steps:
        remark = f"Shown: {shown} of {n_gases} gases and {shown_steps} of {n_steps} steps."
    title = names.visible(experiment.title)
    return EquationSheet(title, tuple(group for group in groups if group.entries), remark, large)


def _entries(lines: Iterator[Line]) -> tuple[Entry, ...]:
    return tuple(Entry(line.formula, line.kind, line.remark) for line in lines)


def _heading(writer: StepWriter) -> str:
    name, number = names.visible(writer.step.name), str(writer.number)
    return f"Step {number}" if name == number else f"Step {number}, {name}"


def _balances(experiment: Experiment, writers: list[StepWriter], shown: int) -> Iterator[Line]:
    """dn/dt of every gas; then the concentrations, and their own balance where V is constant."""
    made: dict[str, list[tuple[float, Node]]] = {gas.name: [] for gas in experiment.gases}
    for writer in writers:
        for name, number in writer.step.net.items():
            for sign, rate in writer.rate_symbols() if number else []:
                made[name].append((sign * number, rate))
    gases = experiment.gases[:shown]
    for gas in gases:
        made[gas.name] += flow_terms(experiment, gas)
    for gas in gases:
        left = Derivative(Symbol("n", names.gas_label(gas)))
        yield Line(_balance(left, made[gas.name], Symbol("V")), "equation", _idle(made[gas.name]))
    dead = experiment.vessel.dead_space is not None
    any_gas = Words("X")
    space: Node = Symbol("V")
    if dead:
        space = add(space, multiply(Symbol("V", "d"), Fraction(T, Symbol("T", "d"))))
    remark = "for every gas X" + (", at one pressure in vessel and dead space" if dead else "")
    yield Line(
        equals(Concentration(any_gas), Fraction(Symbol("n", any_gas), space)), "equation", remark
    )
    if experiment.vessel.is_rigid and not dead:
        for gas in gases:
            if made[gas.name]:
                left = Derivative(Concentration(names.gas_label(gas)))
                yield Line(_balance(left, made[gas.name], None))


def _idle(terms: list[tuple[float, Node]]) -> str:
    return "" if terms else "takes no part"


def _balance(left: Node, terms: list[tuple[float, Node]], factor: Node | None) -> Relation:
    """A sum of rates, V in front of it; a long one goes over several lines."""
    whole = add(*(multiply(number, rate) for number, rate in terms))
    if not isinstance(whole, Sum) or len(whole.terms) <= TERMS_A_LINE:
        return equals(left, whole if factor is None else multiply(factor, whole))
    rows: list[Node] = []
    for start in range(0, len(whole.terms), TERMS_A_LINE):
        chunk = whole.terms[start : start + TERMS_A_LINE]
        parts: list[Node | str] = []
        if start:
            parts.append("−" if chunk[0][0] < 0 else "+")
            chunk = ((1, chunk[0][1]), *chunk[1:])
        elif factor is not None:
            parts += [factor, "("]
        parts.append(Sum(chunk))
        if factor is not None and start + TERMS_A_LINE >= len(whole.terms):
            parts.append(")")
        rows.append(Row(tuple(parts)))
    return Relation(left, tuple(rows))


def _constants(groups: list[Group]) -> Iterator[Line]:
    """The physical constants that the sheet uses, with their values."""
    used = {p for g in groups for e in g.entries for p in parts_of(e.formula)}
    R, k_B, N_A = Symbol("R"), Symbol("k", "B"), Symbol("N", "A")
    known: list[tuple[Node, float, str]] = [
        (R, constants.R, "J mol^-1 K^-1"),
        (k_B, constants.k_B, "J K^-1"),
        (N_A, constants.N_A, "mol^-1"),
        (P_STANDARD, constants.STANDARD_PRESSURE, "Pa"),
    ]
    for symbol, value, unit in known:
        if symbol in used:
            yield Line(valued(symbol, value, names.unit(unit)), "number", "")
