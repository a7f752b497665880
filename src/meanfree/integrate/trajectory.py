"""A solution that can be asked at any time: pieces of dense output, joined at the breaks."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike
from scipy.integrate import DenseOutput

from meanfree.equations.system import Floats, Segment


@dataclass
class Stretch:
    """The solution within one segment: accepted times, states there, and what lies between.

    ``times`` [s, n + 1 entries], ``states`` [n + 1 of shape (size,)], ``pieces`` [n].
    """

    segment: Segment
    times: list[float]
    states: list[Floats]
    pieces: list[DenseOutput] = field(default_factory=list)

    def at(self, t: Floats) -> Floats:
        """States at times within this stretch [shape (size, n_times)]."""
        out = np.empty((len(self.states[0]), len(t)))
        if not self.pieces:
            out[:] = self.states[0][:, None]
            return out
        which = np.clip(np.searchsorted(self.times, t, side="left") - 1, 0, len(self.pieces) - 1)
        for piece in np.unique(which):
            here = which == piece
            out[:, here] = self.pieces[piece](t[here])
        # Interpolants are not exact at their own ends; accepted states are.
        place = np.searchsorted(self.times, t)
        hit = (place < len(self.times)) & (np.take(self.times, place, mode="clip") == t)
        if np.any(hit):
            out[:, hit] = np.column_stack([self.states[i] for i in place[hit]])
        return out


INSIDE = np.array([0.0, 0.25, 0.5, 0.75])
"""Where each step is looked at, so that a crossing and its return in one step are seen."""


class Trajectory:
    """The whole solution. Called with times [s] it gives states [shape (size, n_times)].

    At a break it gives the state just before; ``after_break`` the one just after.
    """

    def __init__(self, stretches: Sequence[Stretch]) -> None:
        self.stretches = tuple(stretches)
        self.starts = np.array([s.times[0] for s in stretches])

    @property
    def end(self) -> float:
        """Last time [s]."""
        return self.stretches[-1].times[-1]

    @property
    def times(self) -> Floats:
        """Every accepted time [s]; breaks appear once."""
        return np.unique(np.concatenate([s.times for s in self.stretches]))

    def __call__(self, t: ArrayLike, after_break: bool = False) -> Floats:
        """States at times between 0 and the end [s]; ValueError outside."""
        asked = np.atleast_1d(np.asarray(t, float))
        if asked is self.fine_times and not after_break:
            return self._on_fine_times
        return self._at(asked, after_break)

    @cached_property
    def fine_times(self) -> Floats:
        """Four times in every step and the end [s]: where crossings are looked for."""
        times = self.times
        fine = (times[:-1, None] + np.diff(times)[:, None] * INSIDE).ravel()
        return np.append(fine, times[-1])

    @cached_property
    def _on_fine_times(self) -> Floats:
        """States there, worked out once: every level of every gas is looked for on them."""
        states = self._at(self.fine_times, False)
        states.flags.writeable = False
        return states

    def _at(self, asked: Floats, after_break: bool) -> Floats:
        """States at times that nobody has asked for before."""
        if np.any(asked < 0) or np.any(asked > self.end):
            raise ValueError(f"times must lie between 0 and {self.end:g} s")
        out = np.empty((len(self.stretches[0].states[0]), len(asked)))
        which = self.stretch_of(asked, after_break)
        for index in np.unique(which):
            here = which == index
            out[:, here] = self.stretches[index].at(asked[here])
        return out

    def stretch_of(self, t: Floats, after_break: bool = False) -> np.ndarray:
        """Index of the stretch that each time lies in."""
        side = np.searchsorted(self.starts, t, side="right" if after_break else "left") - 1
        return np.clip(side, 0, len(self.stretches) - 1)

    def cut(self, end: float) -> Trajectory:
        """The same solution up to an earlier end [s]; the last piece keeps its interpolant."""
        kept: list[Stretch] = []
        for stretch in self.stretches:
            if stretch.times[0] >= end and kept:
                break
            if stretch.times[-1] <= end:
                kept.append(stretch)
                continue
            n = int(np.searchsorted(stretch.times, end, side="left"))
            last = stretch.at(np.array([end]))[:, 0]
            kept.append(
                Stretch(
                    stretch.segment,
                    [*stretch.times[:n], end],
                    [*stretch.states[:n], last],
                    stretch.pieces[:n],
                )
            )
        return Trajectory(kept)
