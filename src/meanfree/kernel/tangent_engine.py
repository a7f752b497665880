"""A kernel that integrates the derivatives of the state together with the state."""

from __future__ import annotations

import numpy as np

from meanfree.kernel.engine import Kernel
from meanfree.kernel.moving import BREAK, MovingVariation
from meanfree.kernel.parameters import Variation
from meanfree.kernel.records import Conditions, Floats
from meanfree.kernel.slots import Name
from meanfree.kernel.tableau import RODAS5P, Tableau
from meanfree.kernel.tangent_phases import build_tangent_program, tangent


class TangentKernel(Kernel):
    """As `Kernel`, for conditions that move along the same directions as ``variation``.

    The state of a condition is followed by its derivatives, direction after direction, so that
    whatever may be asked of a state may be asked of them.
    """

    def __init__(
        self, variation: MovingVariation, tableau: Tableau = RODAS5P, *,
        compiled: bool | None = None, lanes: int | None = None,
        varied: frozenset[Name] = frozenset(), controlled: bool = True,
    ) -> None:  # fmt: skip
        super().__init__(variation.system, tableau, compiled=compiled, lanes=lanes, varied=varied)
        self.plain = self.program.layout
        directions = variation.directions(self.plain)
        self.program = build_tangent_program(
            variation.system, tableau, directions, varied, controlled
        )

    def _conditions(self, variation: Variation, numbers: list[Floats]) -> Conditions:
        assert isinstance(variation, MovingVariation)
        plain = super()._conditions(variation, numbers)
        later, parameters = self.system.segments[1:], self.program.layout.parameters
        n_directions = len(variation.moves)
        changed = [
            (k, parameters[tangent(k, ("slope",))])
            for k in range(n_directions)
            if tangent(k, ("slope",)) in parameters
        ]
        count = variation.count if _differ(variation) else len(plain.breaks)
        moving = np.zeros((count, len(later), n_directions, 3))
        slopes = np.zeros((count, len(later), len(changed)))
        for place in range(len(later)):
            for k in range(n_directions):
                for column, what in enumerate(("start", "retained", "temperature")):
                    moving[:, place, k, column] = variation.moved(k, BREAK, place + 1, what)
            for column, (k, _) in enumerate(changed):
                slopes[:, place, column] = variation.moved(k, BREAK, place + 1, "slope")
        breaks = np.broadcast_to(plain.breaks, (count, *plain.breaks.shape[1:]))
        return plain._replace(
            breaks=np.ascontiguousarray(np.concatenate([breaks, slopes], axis=2)),
            changed=np.array([*plain.changed, *(slot for _, slot in changed)], np.int64),
            moving=moving,
        )


def _differ(variation: MovingVariation) -> bool:
    """True where breaks move differently in different conditions."""
    return any(
        len(value) > 1
        for each in variation.moves
        for name, value in each.items()
        if name[0] == BREAK
    )
