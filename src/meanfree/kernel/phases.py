"""The phases of one step of a Rosenbrock method for one System.

``factor`` settles the step size, evaluates the Jacobian, factorises and makes the first stage; the
other stages follow; ``judge`` decides about the step. ``accept`` takes a new state over, ``start``
finds the time scale for a first step; ``assemble`` and ``evaluate`` serve the path with pivoting.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from meanfree.equations.system import System
from meanfree.kernel import control
from meanfree.kernel.balances import Balances, Matrix
from meanfree.kernel.elimination import Plan, plan
from meanfree.kernel.slots import Layout, Name
from meanfree.kernel.tableau import Tableau
from meanfree.kernel.tape import Op, Phase, Tape


@dataclass
class Program:
    """The phases with what one needs to know of their slots.

    ``entries``: block, row, column and slot; block 0 is the matrix before factorisation, block
    1 + k what couples the derivatives in direction k to the state. ``end`` is the first slot that
    no phase uses.
    """

    layout: Layout
    tableau: Tableau
    plan: Plan
    unknowns: int
    step: list[Phase]
    accept: Phase
    start: Phase
    assemble: Phase
    evaluate: Phase
    judge: Phase
    entries: list[tuple[int, int, int, int]]
    end: int
    operations: int = field(default=0)

    @property
    def phases(self) -> list[Phase]:
        """All phases, in the order in which the driver knows them."""
        return [self.accept, self.start, self.assemble, self.evaluate, self.judge, *self.step]


def build_program(
    system: System, tableau: Tableau, varied: frozenset[Name] = frozenset()
) -> Program:
    """The phases of a System; baths border the matrix where that needs fewer products."""
    candidates = []
    for border in (False, True):
        writer = Writer(Layout(system, tableau.stages, varied=varied), tableau, border)
        if border and not writer.balances.baths:
            continue
        candidates.append(writer)
    best = min(candidates, key=lambda w: w.plan.products + tableau.stages * w.plan.entries)
    return best.write()


class Writer:
    """Writes the phases for one layout; baths border the matrix or are put in."""

    def __init__(self, layout: Layout, tableau: Tableau, border: bool) -> None:
        self.tableau, self.layout = tableau, layout
        self.balances = Balances(self.layout, border)
        tape = Tape()
        state = self._state(tape, self.layout.state)
        _, jacobian = self.balances.both(tape, state)
        matrix = self.balances.system_matrix(tape, jacobian, tape.input(0))
        self.plan = plan(self.balances.unknowns, matrix, self.balances.bordering)

    def _state(self, tape: Tape, first: int) -> list[int]:
        return [tape.input(first + i) for i in range(self.layout.size)]

    def write(self) -> Program:
        """All phases, and where things lie."""
        layout, tableau = self.layout, self.tableau
        first = self._own_slots(layout.first_parameter + len(layout.parameters))
        slots: dict[tuple[int, int], int] = {}
        for b in self.plan.order:
            slots[b, b] = first + len(slots)
            for r in self.plan.rows[b]:
                slots[r, b] = first + len(slots)
            for c in self.plan.columns[b]:
                slots[b, c] = first + len(slots)
        self.factors = slots
        step = [self._factor()]
        step += [self._stage(s) for s in range(1, tableau.stages)]
        judge = self._judging()
        assemble, matrix = self._assemble(first + len(slots))
        return Program(
            layout,
            tableau,
            self.plan,
            self.balances.unknowns,
            step,
            self._accept(),
            self._start(),
            assemble,
            self._evaluate(),
            judge,
            [*((0, *key, slot) for key, slot in matrix.items()), *self._couplings()],
            first + len(slots) + len(matrix),
            sum(len(phase.tape.entries) for phase in (*step, judge)),
        )

    def _own_slots(self, first: int) -> int:
        """The first slot behind those that a writer needs besides."""
        return first

    def _couplings(self) -> list[tuple[int, int, int, int]]:
        return []

    def _factor(self) -> Phase:
        layout, t = self.layout, Tape()
        outputs: dict[int, int] = {}
        shift = control.step_size(layout, t, self.tableau.gamma, outputs)
        rhs, jacobian = self.balances.both(t, self._state(t, layout.state))
        matrix = self.balances.system_matrix(t, jacobian, shift)
        worst = self._eliminate(t, matrix)
        outputs.update({self.factors[key]: matrix[key] for key in self.factors})
        outputs[layout.scalar("bad")] = worst
        for i, value in enumerate(self._solve(t, rhs, matrix)[: layout.size]):
            outputs[layout.stage(0) + i] = value
        return Phase("factor", t, outputs)

    def _eliminate(self, t: Tape, matrix: Matrix) -> int:
        """LU factors in place, pivots inverted; the largest multiplier among the gases."""
        zero, n = t.const(0.0), self.layout.system.n_gases
        worst = zero
        for b in self.plan.order:
            matrix[b, b] = t.div(t.const(1.0), matrix[b, b])
            for r in self.plan.rows[b]:
                multiplier = matrix[r, b] = t.mul(matrix.get((r, b), zero), matrix[b, b])
                if r < n and b < n:
                    worst = t.max(t.unary(Op.ABS, multiplier), worst)
                for c in self.plan.columns[b]:
                    matrix[r, c] = t.nmadd(multiplier, matrix[b, c], matrix.get((r, c), zero))
        return worst

    def _solve(self, t: Tape, rhs: list[int], matrix: Matrix) -> list[int]:
        """Solution for all unknowns; the baths' rows have nothing on their right."""
        x = [*rhs, *[t.const(0.0)] * (self.balances.unknowns - len(rhs))]
        for b in self.plan.order:
            for r in self.plan.rows[b]:
                x[r] = t.nmadd(matrix[r, b], x[b], x[r])
        for b in reversed(self.plan.order):
            total = x[b]
            for c in self.plan.columns[b]:
                total = t.nmadd(matrix[b, c], x[c], total)
            x[b] = t.mul(total, matrix[b, b])
        return x

    def rates(self, t: Tape, argument: list[int]) -> list[int]:
        """What the stages evaluate."""
        return self.balances.derivative(t, argument)

    def _solved(self, t: Tape, rhs: list[int], matrix: Matrix) -> list[int]:
        """A stage, from its right-hand side and the factors."""
        return self._solve(t, rhs, matrix)[: self.layout.size]

    def _stage(self, s: int) -> Phase:
        layout, t, method = self.layout, Tape(), self.tableau
        size = layout.size
        stages = [[t.input(layout.stage(q) + i) for i in range(size)] for q in range(s)]
        outputs: dict[int, int] = {}
        argument = self._argument(t, s, stages)
        if s + 1 == method.stages or self._continues(s + 1):
            outputs.update({layout.argument + i: value for i, value in enumerate(argument)})
        rhs = self.rates(t, argument)
        inverse_h = t.input(layout.scalar("inverse_h"))
        for i in range(size):
            earlier = t.combine(
                (float(method.c[s, q]), stages[q][i]) for q in range(s) if method.c[s, q]
            )
            rhs[i] = t.madd(inverse_h, earlier, rhs[i])
        matrix = {key: t.input(slot) for key, slot in self.factors.items()}
        new = self._solved(t, rhs, matrix)
        outputs.update({layout.stage(s) + i: value for i, value in enumerate(new)})
        return Phase(f"stage_{s}", t, outputs)

    def _continues(self, s: int) -> bool:
        """True where the argument of a stage is that of the one before plus its result."""
        a = self.tableau.a
        return bool(s > 1 and a[s, s - 1] == 1 and (a[s, : s - 1] == a[s - 1, : s - 1]).all())

    def _argument(self, t: Tape, s: int, stages: list[list[int]]) -> list[int]:
        layout, a = self.layout, self.tableau.a
        if self._continues(s):
            before = self._state(t, layout.argument)
            return [t.add(w, u) for w, u in zip(before, stages[s - 1], strict=True)]
        state = self._state(t, layout.state)
        return [
            t.combine(((float(a[s, q]), stages[q][i]) for q in range(s) if a[s, q]), state[i])
            for i in range(layout.size)
        ]

    def _judging(self) -> Phase:
        """Whether the step is accepted; a phase of its own, which holds fewer numbers at once."""
        layout, t, outputs = self.layout, Tape(), dict[int, int]()
        argument = self._state(t, layout.argument)
        last = self._state(t, layout.stage(self.tableau.stages - 1))
        control.judge(layout, t, self.tableau.error_order, argument, last, outputs)
        return Phase("judge", t, outputs)

    def _accept(self) -> Phase:
        t, outputs = Tape(), dict[int, int]()
        control.accept(self.layout, t, outputs)
        return Phase("accept", t, outputs)

    def _start(self) -> Phase:
        """1 over the shortest time in which a derivative changes: max |J f|/|f| over the states."""
        layout, t = self.layout, Tape()
        rhs, jacobian = self.balances.both(t, self._state(t, layout.state))
        change = [*rhs]
        if self.balances.border:
            change += [
                t.combine((w, rhs[i]) for i, w in weights.items())
                for weights in self.balances.weights
            ]
        second = [t.const(0.0)] * layout.states
        for (row, column), value in jacobian.items():
            second[row] = t.madd(value, change[column], second[row])
        fastest = t.const(0.0)
        for f, df in zip(rhs, second, strict=True):
            size = t.unary(Op.ABS, f)
            ratio = t.select(size, t.div(t.unary(Op.ABS, df), size), t.const(0.0))
            fastest = t.max(ratio, fastest)
        return Phase("start", t, {layout.scalar("first"): fastest})

    def _assemble(self, first: int) -> tuple[Phase, dict[tuple[int, int], int]]:
        layout, t = self.layout, Tape()
        _, jacobian = self.balances.both(t, self._state(t, layout.state))
        shift = t.input(layout.scalar("inverse_h_gamma"))
        matrix = self.balances.system_matrix(t, jacobian, shift)
        slots = {key: first + place for place, key in enumerate(sorted(matrix))}
        return Phase("assemble", t, {slots[key]: matrix[key] for key in slots}), slots

    def _evaluate(self) -> Phase:
        layout, t = self.layout, Tape()
        rhs = self.rates(t, self._state(t, layout.argument))
        return Phase("evaluate", t, {layout.value + i: value for i, value in enumerate(rhs)})
