"""The phases of a step that carries the derivatives of the state by parameters along.

The variational equations s' = J s + df/dp, solved by the same Rosenbrock method with the same step
and the same factors: their matrix is block triangular with J on its diagonal. Its other block,
d(J s + df/dp)/dy, is kept whole, or the method would lose its order; applied to a stage u it is
the derivative of J along the direction, times u. Source for the methods: Hairer and Wanner, Solving
Ordinary Differential Equations II, 1996, section IV.7; for the block form M. Caracotsios and
W. E. Stewart, Comput. Chem. Eng. 9 (1985) 359.
"""

from __future__ import annotations

from collections.abc import Sequence

from meanfree.equations.system import System
from meanfree.kernel import control
from meanfree.kernel.balances import Matrix
from meanfree.kernel.phases import Program, Writer
from meanfree.kernel.slots import Layout, Name
from meanfree.kernel.tableau import Tableau
from meanfree.kernel.tangents import Tangents
from meanfree.kernel.tape import Phase, Tape

TANGENT = "tangent"


def tangent(direction: int, name: Name) -> Name:
    """The name of a parameter's derivative in a direction."""
    return (TANGENT, direction, *name)


def build_tangent_program(
    system: System,
    tableau: Tableau,
    directions: Sequence[frozenset[Name]],
    varied: frozenset[Name] = frozenset(),
    controlled: bool = True,
) -> Program:
    """The phases of a System with the derivatives of its state in some directions.

    A direction is the names of the parameters that move along it. Without ``controlled`` the
    derivatives' errors do not count in the choice of steps.
    """
    candidates = []
    for border in (False, True):
        layout = Layout(
            system,
            tableau.stages,
            varied=varied,
            directions=tuple(directions),
            controlled=controlled,
        )
        writer = TangentWriter(layout, tableau, border)
        if border and not writer.balances.baths:
            continue
        candidates.append(writer)
    best = min(candidates, key=lambda w: w.plan.products + tableau.stages * w.plan.entries)
    return best.write()


class TangentWriter(Writer):
    """Writes the phases for a layout with directions."""

    def __init__(self, layout: Layout, tableau: Tableau, border: bool) -> None:
        super().__init__(layout, tableau, border)
        # Every parameter has its place before the slots behind them are given away.
        tape = Tape()
        rhs, jacobian = self.balances.both(tape, self._state(tape, layout.state))
        for k, names in enumerate(layout.directions):
            for name in sorted(names & layout.parameters.keys(), key=str):
                layout.parameter(*tangent(k, name))
        wanted = [*rhs, *jacobian.values()]
        tangents = Tangents(tape, wanted)
        self.coupled = []
        for k in range(len(layout.directions)):
            found = tangents.along(self._seeds(tape, k, self._state(tape, layout.state)))
            self.coupled.append(sorted(key for key, value in jacobian.items() if value in found))

    def _blocks(self, values: Sequence[int]) -> list[list[int]]:
        """The state and its derivatives, one list for each."""
        n = self.layout.states
        return [list(values[first : first + n]) for first in range(0, len(values), n)]

    def _seeds(self, t: Tape, k: int, state: Sequence[int]) -> dict[int, int]:
        """What moves in a direction: the state and some parameters."""
        layout, blocks = self.layout, self._blocks(state)
        seeds = dict(zip(blocks[0], blocks[1 + k], strict=True))
        for name in layout.directions[k]:
            if name in layout.parameters:
                place = t.input(layout.parameter(*tangent(k, name)))
                seeds[t.input(layout.parameter(*name))] = place
        return seeds

    def _own_slots(self, first: int) -> int:
        self.coupling: list[dict[tuple[int, int], int]] = []
        for keys in self.coupled:
            self.coupling.append({key: first + i for i, key in enumerate(keys)})
            first += len(keys)
        return first

    def _couplings(self) -> list[tuple[int, int, int, int]]:
        return [
            (1 + k, *key, slot)
            for k, slots in enumerate(self.coupling)
            for key, slot in slots.items()
        ]

    def rates(self, t: Tape, argument: list[int]) -> list[int]:
        """dy/dt, then ds/dt of every direction."""
        rhs = self.balances.derivative(t, self._blocks(argument)[0])
        tangents, everything = Tangents(t, rhs), [*rhs]
        for k in range(len(self.layout.directions)):
            found = tangents.along(self._seeds(t, k, argument))
            everything += [found.get(value, t.const(0.0)) for value in rhs]
        return everything

    def _with_baths(self, t: Tape, u: list[int]) -> list[int]:
        """A change of the states and what it is for the baths."""
        if not self.balances.border:
            return u
        return [
            *u,
            *(
                t.combine((w, u[i]) for i, w in weights.items())
                for weights in self.balances.weights
            ),
        ]

    def _solved(self, t: Tape, rhs: list[int], matrix: Matrix) -> list[int]:
        coupling = [{key: t.input(slot) for key, slot in slots.items()} for slots in self.coupling]
        return self._in_turn(t, rhs, matrix, coupling)

    def _in_turn(
        self, t: Tape, rhs: list[int], matrix: Matrix, coupling: Sequence[Matrix]
    ) -> list[int]:
        """The states' stage, then that of each direction: J's derivative times it on the right."""
        blocks = self._blocks(rhs)
        u = self._solve(t, blocks[0], matrix)[: self.layout.states]
        everything, wide = [*u], self._with_baths(t, u)
        for right, slopes in zip(blocks[1:], coupling, strict=True):
            for (row, column), value in slopes.items():
                right[row] = t.madd(value, wide[column], right[row])
            everything += self._solve(t, right, matrix)[: self.layout.states]
        return everything

    def _factor(self) -> Phase:
        layout, t = self.layout, Tape()
        outputs: dict[int, int] = {}
        shift = control.step_size(layout, t, self.tableau.gamma, outputs)
        state = self._state(t, layout.state)
        rhs, jacobian = self.balances.both(t, self._blocks(state)[0])
        tangents, everything = Tangents(t, [*rhs, *jacobian.values()]), [*rhs]
        coupling: list[Matrix] = []
        for k in range(len(layout.directions)):
            found = tangents.along(self._seeds(t, k, state))
            everything += [found.get(value, t.const(0.0)) for value in rhs]
            slopes = {key: found[jacobian[key]] for key in self.coupled[k]}
            coupling.append(slopes)
            outputs.update({self.coupling[k][key]: value for key, value in slopes.items()})
        matrix = self.balances.system_matrix(t, jacobian, shift)
        worst = self._eliminate(t, matrix)
        outputs.update({self.factors[key]: matrix[key] for key in self.factors})
        outputs[layout.scalar("bad")] = worst
        for i, value in enumerate(self._in_turn(t, everything, matrix, coupling)):
            outputs[layout.stage(0) + i] = value
        return Phase("factor", t, outputs)
