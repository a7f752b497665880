"""A kernel for one System: conditions in, what was asked of every run out.

Chooses between the interpreter, which can begin at once, and machine code made for the
mechanism, which has to be compiled; both give the same bits.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from meanfree.equations.bearing import bearing_on
from meanfree.equations.system import System
from meanfree.kernel.cache import Say, silent
from meanfree.kernel.parameters import Variation, columns
from meanfree.kernel.phases import Program, build_program
from meanfree.kernel.records import (
    LEVEL,
    SLOT,
    Conditions,
    Floats,
    Kept,
    Longs,
    Places,
    kept_for,
    remembered,
)
from meanfree.kernel.slots import Name
from meanfree.kernel.slow_steps import waiting_phase
from meanfree.kernel.tableau import RODAS5P, Tableau
from meanfree.kernel.tape import Phase
from meanfree.kernel.watching import (
    Functional,
    Rest,
    request_for,
    slots_per_functional,
    watching_phase,
)

if TYPE_CHECKING:
    from meanfree.kernel.interpreter import Lowering

MOST_STEPS = 200_000
"""Steps after which a run is given up; common practice, no source."""

WORST_MULTIPLIER = 1e5
"""Above this a pivot counts as bad: five digits of sixteen are lost. No source."""

HORIZON = 1e17
"""The longest automatic run [s]."""

EXPECTED_STEPS = 200
"""Steps of an ordinary run, to judge what a job will cost."""

COMPILE = (0.3, 3.0e-4)
"""Seconds to make machine code: at least, and for each operation. Measured."""

KEPT = 0.1
"""Seconds to load machine code that lies in the cache. Measured."""

INTERPRET = 6e-11
"""Seconds that interpreting costs more than machine code, for each operation and lane. Measured."""


@dataclass(frozen=True)
class Task:
    """What to integrate and what to keep.

    ``end`` [s, shape (count,) or (1,)], None where runs end by themselves; then ``watched`` is the
    gas whose conversion counts (-1: none), and none ends before ``at_least`` [s]. ``rtol`` and
    ``atol`` (over the total initial concentration) as in a single run. ``grid`` [s, shape (rows,
    n_times)]. Steps whose elimination meets a multiplier above ``worst_multiplier`` are made again
    with row exchanges.
    """

    end: Floats | None
    rtol: float = 1e-8
    atol: float = 1e-20
    watched: int = -1
    functionals: tuple[Functional, ...] = ()
    grid: Floats | None = None
    most_steps: int = MOST_STEPS
    worst_multiplier: float = WORST_MULTIPLIER
    at_least: float = 0.0


class Kernel:
    """The compiled integrator of one System.

    ``varied`` names numbers that conditions change. ``compiled`` True or False settles how phases
    are carried out; None lets the expected cost decide.
    """

    def __init__(
        self, system: System, tableau: Tableau = RODAS5P, *, compiled: bool | None = None,
        lanes: int | None = None, varied: frozenset[Name] = frozenset(), say: Say = silent,
    ) -> None:  # fmt: skip
        self.system, self.tableau, self.say = system, tableau, say
        self.program: Program = build_program(system, tableau, varied)
        self._compiled, self._lanes = self._told = compiled, lanes
        self._addresses: dict[int, list[int]] = {}
        self._kept: bool | None = None
        self._expected = 0
        self._watchings: dict[Any, tuple[Phase, Phase]] = {}
        self._codes: dict[int, tuple[Lowering, list[Longs]]] = {}
        self._watching_addresses: dict[tuple[int, int], int] = {}

    def run(self, variation: Variation, task: Task) -> Kept:
        """Integrate all conditions of a variation in this thread, without Python's lock."""
        from meanfree.kernel.driver import advance

        compiled, lanes = self.choice(variation.count)
        end = np.atleast_1d(np.array(HORIZON if task.end is None else task.end, float))
        numbers = columns(self.program.layout, variation, task.atol, end)
        grid = np.zeros((1, 0)) if task.grid is None else np.atleast_2d(task.grid)
        size = self.program.layout.size
        bearing = self._bearing(task)
        request = request_for(
            task.functionals, numbers[:size], variation.count, grid, bearing, self.system.n_gases
        )
        free = self.program.end + 1 + slots_per_functional(self.program) * len(task.functionals)
        places = self._places(task, lanes, free)
        rest = Rest(task.watched, bearing, places.most, places.still)
        watching, waiting = self._watching(task, rest if task.end is None else None)
        lowering, codes = self._code(watching, waiting, free + 5 * size)
        work = aligned(lowering.next * lanes).reshape(-1, lanes)
        for value, slot in lowering.constants.items():
            work[slot] = value
        work[SLOT["rtol"]], work[SLOT["most_steps"]] = task.rtol, task.most_steps
        work[SLOT["worst"]], work[SLOT["at_least"]] = task.worst_multiplier, task.at_least
        states = self.program.layout.states
        held = remembered(states) if task.end is None else 1
        method, kept = self.tableau, kept_for(places, request, variation.count)
        advance(
            places,
            work,
            np.zeros((LEVEL + len(task.functionals), lanes), np.int64),
            np.array(self._all_addresses(compiled, lanes, watching, variation.count), np.int64),
            np.array([code.ctypes.data for code in codes], np.int64),
            np.array(self.program.entries, np.int64),
            method.a,
            method.c,
            method.dense,
            self._conditions(variation, numbers),
            request,
            kept,
            aligned(held * (2 + states) * lanes).reshape(held, 2 + states, lanes),
        )
        return kept

    def settle(self, total: int, chunk: int) -> None:
        """Choose for ``total`` conditions in all, of which ``chunk`` come at a time."""
        self._compiled, self._lanes = self._told
        self._compiled, self._lanes = self.choice(total)
        self._expected = total
        if chunk <= 8 and not self._addresses:
            self._lanes = 8
        if self._compiled:
            self._compiled_addresses(self._lanes)

    def _bearing(self, task: Task) -> tuple[int, ...]:
        """Gases that must come to rest before a run of open length does."""
        if task.watched < 0:
            return tuple(range(self.system.n_gases))
        return tuple(bearing_on(self.system, task.watched))

    def _watching(self, task: Task, rest: Rest | None) -> tuple[Phase, Phase]:
        """The phase that follows every step, and the one for what seems to rest."""
        asked = tuple((f.weights, f.levels is None, f.falls, f.peak) for f in task.functionals)
        key = (asked, rest)
        if key not in self._watchings:
            layout = self.program.layout
            steps = rest.bearing if rest is not None else ()
            waiting = waiting_phase(layout, steps, rest.most if rest else 0, HORIZON)
            watching = watching_phase(self.program, task.functionals, rest)
            self._watchings[key] = watching, waiting
        return self._watchings[key]

    def _code(self, watching: Phase, waiting: Phase, first: int) -> tuple[Lowering, list[Longs]]:
        """What the interpreter carries out."""
        from meanfree.kernel.interpreter import Lowering

        if id(watching) not in self._codes:
            lowering = Lowering(first)
            phases = [*self.program.phases, watching, waiting]
            self._codes[id(watching)] = lowering, [lowering.code(phase) for phase in phases]
        return self._codes[id(watching)]

    def choice(self, count: int) -> tuple[bool, int]:
        """(compile, number of lanes) for so many conditions, by expected time."""
        operations = self.program.operations
        compiled = self._pays(operations, count, True) and (
            self._pays(operations, count, False) or self._machine_code_is_kept()
        )
        if self._compiled is not None:
            compiled = self._compiled
        lanes = self._lanes
        if lanes is None:
            slots = self.program.end
            wide = slots * 32 * 8 < (40_000 if compiled else 1_000_000)
            lanes = 32 if wide and count > 8 else 8
        return compiled, lanes

    def _places(self, task: Task, lanes: int, end: int) -> Places:
        program, layout, system = self.program, self.program.layout, self.system
        return Places(
            lanes=lanes,
            size=layout.size,
            states=layout.states,
            gases=system.n_gases,
            unknowns=program.unknowns,
            n_parameters=len(layout.parameters),
            n_stages=self.tableau.stages,
            n_dense=self.tableau.dense.shape[1],
            n_functionals=len(task.functionals),
            heat=system.volume_index - 1 if system.exchanges_heat else -1,
            v=system.volume_index if system.volume_varies else -1,
            T=layout.T_index if layout.has_T else -1,
            atol=layout.atol,
            state=layout.state,
            new=layout.new,
            argument=layout.argument,
            value=layout.value,
            stage=layout.stage(0),
            parameter=layout.first_parameter,
            alarm=program.end,
            most=end,
            still=end + layout.size,
            rest=end + 3 * layout.size,
            begin=end + 4 * layout.size,
            gamma=self.tableau.gamma,
            exponent=-0.5 / (self.tableau.error_order + 1),
            rtol=task.rtol,
            automatic=task.end is None,
            watched=task.watched,
        )

    def _all_addresses(self, compiled: bool, lanes: int, watching: Phase, count: int) -> list[int]:
        """Of every phase. What watches a run differs from job to job: it is compiled by itself.

        The last, for lanes that seem to rest, is always interpreted.
        """
        from meanfree.kernel.interpreter import ADDRESSES

        if not compiled:
            return [ADDRESSES[lanes]] * (len(self.program.phases) + 2)
        own = [*self._compiled_addresses(lanes)]
        key = (id(watching), lanes)
        if key not in self._watching_addresses:
            from meanfree.kernel.cache import file_of
            from meanfree.kernel.generated import addresses, source_of

            operations = len(watching.tape.entries)
            kept = file_of(source_of([watching], lanes)).is_file()
            if not (kept or self._pays(operations, max(count, self._expected), kept)):
                return [*own, ADDRESSES[lanes], ADDRESSES[lanes]]
            self._watching_addresses[key] = addresses([watching], lanes, self.say)[0]
        return [*own, self._watching_addresses[key], ADDRESSES[lanes]]

    @staticmethod
    def _pays(operations: int, count: int, kept: bool) -> bool:
        """True where machine code for so many operations gains more time than it takes to get."""
        saved = INTERPRET * operations * EXPECTED_STEPS * count
        return saved > (KEPT if kept else COMPILE[0] + COMPILE[1] * operations)

    def _machine_code_is_kept(self) -> bool:
        """True where a module with machine code lies in the cache from before."""
        if self._kept is None:
            from meanfree.kernel.cache import file_of
            from meanfree.kernel.generated import source_of

            self._kept = any(
                file_of(source_of(self.program.phases, lanes)).is_file() for lanes in (8, 32)
            )
        return self._kept

    def _compiled_addresses(self, lanes: int) -> list[int]:
        if lanes not in self._addresses:
            from meanfree.kernel.generated import addresses

            self._addresses[lanes] = addresses(self.program.phases, lanes, self.say)
        return self._addresses[lanes]

    def _conditions(self, variation: Variation, numbers: list[Floats]) -> Conditions:
        count = variation.count
        layout = self.program.layout
        varied = [i for i, column in enumerate(numbers) if len(column) > 1]
        own = np.empty((len(varied), count))
        for place, i in enumerate(varied):
            own[place] = numbers[i]
        names = [(n, c) for n, c in layout.parameters.items() if n[0] in ("slope", "switch")]
        breaks = _breaks(variation, [n for n, _ in names])
        return Conditions(
            np.array([column[0] for column in numbers], float),
            np.array(varied, np.int64),
            own,
            breaks,
            np.array([column for _, column in names], np.int64),
            np.zeros((1, breaks.shape[1], 0, 3)),
        )


def _breaks(variation: Variation, changed: list[Name]) -> Floats:
    """See `Conditions`; one row, or one for each condition where some break differs."""
    system = variation.system
    differ = any(name[0] == "break" and int(name[1]) > 0 for name in variation.values)
    found = np.zeros((variation.count if differ else 1, len(system.segments) - 1, 3 + len(changed)))
    for place, segment in enumerate(system.segments[1:]):
        here, number = found[:, place], ("break", place + 1)
        here[:, 0] = variation.get(*number, "start")
        here[:, 1] = variation.get(*number, "retained")
        if system.mode == "program":
            here[:, 2] = variation.get(*number, "temperature")
        for column, name in enumerate(changed, start=3):
            if name[0] == "slope":
                here[:, column] = variation.get(*number, "slope")
            else:
                on = 1.0 if segment.switches is None else segment.switches[int(name[1])]
                here[:, column] = on
    return found


def aligned(length: int) -> Floats:
    """Zeros whose first element lies at a multiple of 64 bytes."""
    raw = np.zeros(length + 8)
    offset = (-raw.ctypes.data // 8) % 8
    return raw[offset : offset + length]
