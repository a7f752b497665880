"""Kernels made before, by what they are made of, so that the next call for many runs finds one."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Hashable
from dataclasses import dataclass
from threading import Lock

import numpy as np

from meanfree.equations.system import System
from meanfree.integrate.conditions import Block
from meanfree.kernel.engine import Kernel
from meanfree.kernel.slots import Name

MOST = 8
"""Kernels that are kept: those of a fit or a map with its variants; each holds its formulas."""


@dataclass
class Kept:
    """A kernel, and how many conditions it was to carry out by now."""

    kernel: Kernel
    conditions: int = 0

    def settle(self, count: int, chunk: int) -> None:
        """Choose how to carry out ``count`` more, ``chunk`` at a time.

        Those before count too: many small jobs are worth a compilation as one large one is.
        """
        self.conditions += count
        self.kernel.settle(self.conditions, chunk)


_KEPT: OrderedDict[Hashable, Kept] = OrderedDict()
_ONE_AT_A_TIME = Lock()


def kernel_for(block: Block) -> Kept:
    """A kernel that serves the conditions of a block; the one made before where there is one."""
    system, varied = block.variation.system, frozenset(block.variation.values)
    key = (block.structure, varied, _written_in(system, varied))
    with _ONE_AT_A_TIME:
        kept = _KEPT.pop(key, None) or Kept(Kernel(system, varied=varied))
        _KEPT[key] = kept
        if len(_KEPT) > MOST:
            _KEPT.popitem(last=False)
    return kept


def _written_in(system: System, varied: frozenset[Name]) -> Hashable:
    """Numbers that stand in the formulas of a kernel themselves: zeros and ones of the laws, and
    stated energies of steps."""
    found: list[bytes] = []
    for b, block in enumerate(system.blocks):
        literal = np.where((block.numbers == 0) | (block.numbers == 1), block.numbers, np.nan)
        for slot, position in np.ndindex(literal.shape):
            if ("number", b, slot, position) in varied:
                literal[slot, position] = np.nan
        found.append(literal.tobytes())
    for name, values in (("heat", system.heat_given), ("photon", system.photon)):
        moved = np.array([(name, j) in varied for j in range(system.n_steps)], bool)
        found.append(np.where(moved, np.nan, values).tobytes())
    return tuple(found)
