"""What flows in and out of a vessel that is not quite closed: leaks, pumping, dilution.

A flow becomes steps of its own, one or more for each gas, that bring or take matter. They are kept
apart from the chemistry: what they took is not conversion.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Literal

from meanfree.constants import R
from meanfree.experiment.mechanism import Bath, Step
from meanfree.gases.gas import Gas
from meanfree.rates.fixed import Fixed
from meanfree.rates.source import Source
from meanfree.rates.wall import Wall
from meanfree.sourced import Sourced

Kind = Literal["effusion", "pumping", "dilution", "leak-up"]


@dataclass(frozen=True)
class Flow:
    """One leak, pump or dilution.

    - "effusion": every gas leaves through ``hole`` [m^2], small against the mean free path, into
      vacuum: A ``transmission`` v_i/(4V), so as M^(-1/2);
    - "pumping": every gas leaves at the same ``rate`` [1/s];
    - "dilution": as pumping, and as much of ``entering`` takes its place, mole for mole;
    - "leak-up": ``entering`` comes in so that the pressure of the closed, unfilled vessel rises by
      ``rise`` [Pa/s], as a blank shows.

    ``entering`` maps gases to fractions of what comes in.
    """

    kind: Kind
    hole: Sourced | None = None
    transmission: Sourced = Sourced(1.0, default=True)
    rate: Sourced | None = None
    rise: Sourced | None = None
    entering: Mapping[str, Sourced] | None = None
    source: str = ""

    def steps(self, gases: tuple[Gas, ...], T: float, place: int) -> Iterator[Step]:
        """The steps of this flow; ``T`` [K] at time zero, ``place`` counts flows from 1."""
        if self.kind != "leak-up":
            for gas in gases:
                name = f"{self.kind} {place} of {gas.name}"
                yield Step(name, ((gas.name, 1.0),), (), self._leaving(), source=self.source)
        if self.kind in ("dilution", "leak-up"):
            assert self.entering is not None
            whole = sum(share.value for share in self.entering.values())
            products = tuple((g, share.value / whole) for g, share in self.entering.items())
            name = f"{self.kind} {place}"
            if self.kind == "leak-up":
                assert self.rise is not None
                law = Source(Sourced(self.rise.value / (R * T), "mol/m^3/s", self.source))
                yield Step(name, (), products, law, source=self.source)
            else:
                # k times the sum of all concentrations: what enters replaces what leaves.
                assert self.rate is not None
                yield Step(name, (), products, Fixed(self.rate), bath=Bath(), source=self.source)

    def _leaving(self) -> Fixed | Wall:
        if self.kind == "effusion":
            assert self.hole is not None
            # The molecules that strike the hole are those that would strike as much wall.
            return Wall(self.transmission, "uptake only", area=self.hole)
        assert self.rate is not None
        return Fixed(self.rate)


def flow_steps(flows: tuple[Flow, ...], gases: tuple[Gas, ...], T: float) -> tuple[Step, ...]:
    """The steps of all flows, in order."""
    return tuple(
        step for place, flow in enumerate(flows, start=1) for step in flow.steps(gases, T, place)
    )
