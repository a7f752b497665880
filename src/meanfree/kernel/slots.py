"""Where everything lies in the work array, and which numbers a lane takes in.

A `Layout` names the parameters of a System that a phase may read: rate constants, or the
numbers of the laws where those are not constant, and what the vessel and the heat balance need.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

from meanfree.equations.system import System

Name = tuple[str | int, ...]

SCALARS = (
    "t", "h", "stop", "due", "limited", "inverse_h_gamma", "inverse_h", "first", "bad",
    "error", "accepted", "reached", "next_h", "attention", "negative",
    "refused", "tried", "refusals", "steps", "deepest",
    "rtol", "atol_x", "atol_ledger", "atol_heat", "most_steps", "automatic", "worst",
    "theta", "end", "until", "crossed",
    "last", "at_least", "goal", "older", "newer", "verdict", "crosses", "waits",
)  # fmt: skip
"""Slots that every lane has besides its state and its parameters.

Of time: the lane must not step over ``stop``; at ``due`` the next time of the grid comes;
``limited`` > 0 where the step ends at the stop. Of the step just made: ``accepted`` 1 or 0,
``attention`` > 0 where the loop must look at the lane. ``automatic`` > 0
where it must look after every step. ``worst`` is the multiplier above which a
pivot is bad. Counted: ``tried``, ``refusals``, ``steps``. ``theta`` is what drawn samples left;
``end`` ends a run, ``until`` a second one. Of runs of open length: at ``crossed`` a level was
crossed that may end it; ``last`` > 0 in the last segment; it does not end before ``at_least``;
``goal`` of the watched gas; nothing moved away from the states remembered at ``older`` and
``newer`` (-1: none is); ``verdict`` of the step just made, an ending or 0; ``crosses`` > 0 where
it crossed the goal; ``waits`` > 0 where a slow step has yet to act, known once it seems to rest.
"""


@dataclass
class Layout:
    """Slots of the work array for one System and a method with ``stages`` stages.

    The state is the System's, followed by T where a program moves it: then T is a state with a
    known slope. Parameters get their places as phases ask for them; those ``varied`` are never
    taken for fixed numbers. Behind the state lie its derivatives in ``directions``, one block of
    the state's length for each; a direction is the parameters that move along it. Where they are
    ``controlled`` their errors count in the choice of steps as those of the states do.
    """

    system: System
    stages: int
    parameters: dict[Name, int] = field(default_factory=dict)
    varied: frozenset[Name] = frozenset()
    directions: tuple[frozenset[Name], ...] = ()
    controlled: bool = True

    @property
    def has_T(self) -> bool:
        """True where T is a state of the kernel."""
        return self.system.mode != "isothermal"

    @cached_property
    def states(self) -> int:
        """Number of states."""
        return self.system.size + int(self.system.mode == "program")

    @cached_property
    def size(self) -> int:
        """Number of states and of their derivatives."""
        return self.states * (1 + len(self.directions))

    @property
    def T_index(self) -> int:
        """Place of T in the state."""
        return self.states - 1

    def scalar(self, name: str) -> int:
        """Slot of one of `SCALARS`."""
        return SCALARS.index(name)

    @property
    def state(self) -> int:
        """First slot of the state."""
        return self.atol + self.system.n_gases

    @property
    def atol(self) -> int:
        """First slot of the absolute tolerances of the gases [mol/m^3]."""
        return len(SCALARS)

    @property
    def new(self) -> int:
        """First slot of the state after the step."""
        return self.state + self.size

    @property
    def argument(self) -> int:
        """First slot of a stage's argument, for phases that are run one stage at a time."""
        return self.new + self.size

    @property
    def value(self) -> int:
        """First slot of the right-hand side at that argument."""
        return self.argument + self.size

    def stage(self, index: int) -> int:
        """First slot of a stage."""
        return self.value + self.size * (1 + index)

    @property
    def first_parameter(self) -> int:
        """First slot of the parameters."""
        return self.stage(self.stages)

    def parameter(self, *name: str | int) -> int:
        """Slot of a parameter, made when first asked for."""
        place = self.parameters.setdefault(name, len(self.parameters))
        return self.first_parameter + place
