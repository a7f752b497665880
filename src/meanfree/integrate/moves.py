"""How the numbers of a System move with the inputs of its experiment.

The one place where addresses meet derivatives. No law and no way to fill a vessel is differentiated
by hand: Systems are built at a few values of each address, and their numbers, which are smooth
and cost no integration, are differenced to sixth order. What rate constants do at the run's
temperature follows from those numbers by the chain rule in the kernel.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from meanfree.equations.system import Floats
from meanfree.errors import InputError, Problem
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs, with_inputs
from meanfree.integrate.conditions import Block, blocks_of
from meanfree.integrate.numbers import numbers_of, same_structure, structure_of
from meanfree.kernel.moving import MovingVariation
from meanfree.kernel.slots import Name

STEP = 2e-3
"""Step over the size of an input. Numbers follow inputs by powers and logarithms: with h = 2e-3 the
next term, h^6/140 of the seventh derivative, is 2e-15 for 1/value; rounding gives 1e-13."""

Places = tuple[tuple[int, ...], tuple[float, ...]]

CENTRAL: Places = ((-3, -2, -1, 1, 2, 3), (-1 / 60, 3 / 20, -3 / 4, 3 / 4, -3 / 20, 1 / 60))
AHEAD: Places = ((0, 1, 2, 3, 4, 5, 6), (-49 / 20, 6.0, -15 / 2, 20 / 3, -15 / 4, 6 / 5, -1 / 6))
"""Places and weights of sixth order (B. Fornberg, Math. Comp. 51 (1988) 699, tables 1 and 3)."""

NOTHING = 4e-15
"""A relative change of a number that is rounding, not an effect."""

SEVERAL = 8
"""From so many conditions on their numbers are found together."""

END = ("end",)


@dataclass(frozen=True)
class Stencil:
    """Values at which an input is tried, and the weights of the derivative."""

    values: Floats
    weights: Floats


def known_addresses(experiment: Experiment, addresses: Sequence[str]) -> dict[str, Input]:
    """The inputs at some addresses.

    Raises InputError for an address that is not there or comes twice.
    """
    from difflib import get_close_matches

    known = inputs(experiment)
    problems = []
    for place, address in enumerate(addresses):
        if address not in known:
            near = get_close_matches(address, known, n=3, cutoff=0.5) or list(known)
            problems.append(
                Problem("sensitivities", f"{address!r}, an unknown address", " or ".join(near))
            )
        elif address in addresses[:place]:
            problems.append(Problem("sensitivities", f"{address!r} twice", "each address once"))
    if problems:
        raise InputError(problems)
    return {address: known[address] for address in addresses}


def moving(block: Block, table: Mapping[str, Floats], addresses: Sequence[str]) -> MovingVariation:
    """The conditions of a block with the derivatives of their numbers by every address.

    ``table`` holds the columns of all conditions, of which the block takes its rows. Derivatives
    are by the value in the unit and convention of the file.

    Raises
    ------
    InputError
        An address is not there, or its value is one at which the equations change their form.
    """
    known = known_addresses(block.experiment, addresses)
    own = {address: np.asarray(column)[block.rows] for address, column in table.items()}
    found = None
    if len(block.rows) >= SEVERAL:
        found = _together(block, own, known)
    if found is None:
        found = _one_by_one(block, own, known)
    plain = block.variation
    return MovingVariation(plain.system, plain.count, plain.values, tuple(found))


def stencil(at: Input, value: float) -> Stencil:
    """Where to try an input that stands at ``value``, within its bounds."""
    span = value - at.low if np.isfinite(at.low) else abs(value)
    h = STEP * (span if span > 0 else 1.0)
    places, weights = CENTRAL
    if value - 3 * h < at.low:
        places, weights = AHEAD
    elif value + 3 * h > at.high:
        places, weights = tuple(-p for p in AHEAD[0]), tuple(-w for w in AHEAD[1])
    values = value + h * np.array(places, float)
    return Stencil(values, np.array(weights) / h)


def _one_by_one(
    block: Block, table: Mapping[str, Floats], known: Mapping[str, Input]
) -> list[dict[Name, Floats]]:
    """Every System of every condition is built."""
    count, problems = len(block.rows), list[Problem]()
    structure = structure_of(block.variation.system)
    moves: list[dict[Name, Floats]] = []
    for address, at in known.items():
        rows: list[dict[Name, float]] = []
        for row in range(count):
            inputs_here = {a: float(column[row]) for a, column in table.items()}
            tried = stencil(at, inputs_here.get(address, at.value))
            built = [
                numbers_of(with_inputs(block.experiment, {**inputs_here, address: float(value)}))
                for value in tried.values
            ]
            if any(one.structure != structure for one in built):
                problems.append(_other_form(address))
                break
            rows.append(_differenced([one.by_name for one in built], tried.weights))
        names = {name for row in rows for name in row}
        moves.append({name: np.array([row.get(name, 0.0) for row in rows]) for name in names})
    if problems:
        raise InputError(problems)
    return moves


def _other_form(address: str) -> Problem:
    return Problem(
        "sensitivities",
        f"{address!r}, at whose value the equations change their form",
        "a value with some room on both sides: two breaks that coincide, say, part when one of "
        "them moves",
    )


def _differenced(seen: Sequence[Mapping[Name, float]], weights: Floats) -> dict[Name, float]:
    found = {}
    for name in seen[0]:
        values = np.array([numbers[name] for numbers in seen])
        largest = np.max(np.abs(values))
        if np.all(np.abs(values - values[0]) <= NOTHING * largest):
            continue
        found[name] = float(weights @ (values - values[0]))
    return found


def _together(
    block: Block, table: Mapping[str, Floats], known: Mapping[str, Input]
) -> list[dict[Name, Floats]] | None:
    """All conditions at once, None where their numbers follow no form."""
    count = len(block.rows)
    shifted: list[dict[str, Floats]] = []
    weights: list[Floats] = []
    for address, at in known.items():
        here = table.get(address, np.full(count, at.value))
        stencils = [stencil(at, float(value)) for value in here]
        if len({len(s.values) for s in stencils}) > 1:
            return None
        for place in range(len(stencils[0].values)):
            column = np.array([s.values[place] for s in stencils])
            shifted.append({**table, address: column})
        weights.append(np.array([s.weights for s in stencils]).T)
    columns: dict[str, Floats] = {}
    for a in dict.fromkeys([*table, *known]):
        still = np.full(count, known[a].value if a in known else np.nan)
        columns[a] = np.concatenate([part.get(a, still) for part in shifted])
    try:
        whole = next(iter(blocks_of(block.experiment, columns, count * len(shifted))))
    except InputError:
        return None
    if len(whole.rows) < count * len(shifted):
        return None
    if not same_structure(whole.variation.system, block.variation.system):
        return None
    start, moves = 0, list[dict[Name, Floats]]()
    for each in weights:
        part = slice(start * count, (start + len(each)) * count)
        start += len(each)
        found: dict[Name, Floats] = {}
        for name, column in whole.variation.values.items():
            if len(column) == 1:
                continue
            values = column[part].reshape(len(each), count)
            largest = np.max(np.abs(values))
            if np.all(np.abs(values - values[0]) <= NOTHING * largest):
                continue
            found[name] = np.sum(each * (values - values[0]), axis=0)
        moves.append(found)
    return moves
