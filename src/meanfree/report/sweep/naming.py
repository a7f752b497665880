"""What was asked of every run of a sweep, in words: the columns' names are for programs."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from meanfree.experiment.experiment import Experiment
from meanfree.integrate.observables import QUANTITIES, At, HalfLife, Observable, Peak, ReactionTime
from meanfree.report import wording

_ORDINALS = {1: "Half-life", 2: "2nd half-life", 3: "3rd half-life"}


def in_words(observables: Iterable[Observable], experiment: Experiment) -> dict[str, str]:
    """The words for each column, with its unit: ``Time of HI to 10 % (s)``."""
    found: dict[str, str] = {}
    for one in observables:
        found.update(zip(one.columns, _words(one, experiment), strict=True))
    return found


def _words(one: Observable, experiment: Experiment) -> Iterator[str]:
    gas = getattr(one, "gas", "")
    name = wording.chemical(experiment.gas_named[gas]) if gas else ""
    if isinstance(one, ReactionTime):
        yield f"Time of {name} to {wording.percent(one.conversion)} (s)"
    elif isinstance(one, HalfLife):
        yield f"{_ORDINALS.get(one.ordinal, f'{one.ordinal}th half-life')} of {name} (s)"
    elif isinstance(one, Peak):
        yield f"Time of most {name} (s)"
        yield f"Most {name} (mol)"
    elif isinstance(one, At):
        when = "at the end" if one.time is None else f"at {wording.duration(one.time)}"
        unit = QUANTITIES[one.quantity][1].replace("_per_", "/")
        of = f" of {name}" if name else ""
        shown = f" ({_pretty(unit)})" if unit else ""
        yield f"{one.quantity[:1].upper()}{one.quantity[1:]}{of} {when}{shown}"
    else:
        yield "Length of the run (s)"


def _pretty(unit: str) -> str:
    """``m3`` and ``mol/m3`` as printed."""
    return unit.replace("m3", "m³")
