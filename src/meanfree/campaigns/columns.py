"""The schema of a sweep on disk: one row a condition, units in the names of the columns.

``index`` counts the conditions of the design from 0; then a column for each address, for each
observable, and ``ending``, in words. What was not reached is null.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import inputs
from meanfree.integrate.observables import Observable

if TYPE_CHECKING:
    import pyarrow as pa

INDEX = "index"
ENDING = "ending"


@dataclass(frozen=True)
class Columns:
    """Names of the columns: ``conditions`` maps addresses to theirs."""

    conditions: dict[str, str]
    units: dict[str, str]
    observables: tuple[str, ...]

    @property
    def names(self) -> tuple[str, ...]:
        """All of them in order."""
        return (INDEX, *self.conditions.values(), *self.observables, ENDING)

    def schema(self, metadata: dict[str, str]) -> pa.Schema:
        """The Arrow schema; each condition names its address and unit."""
        import pyarrow as pa

        fields = [pa.field(INDEX, pa.int64(), nullable=False)]
        for address, name in self.conditions.items():
            about = {"address": address, "unit": self.units[address]}
            fields.append(pa.field(name, pa.float64(), nullable=False, metadata=about))
        fields += [pa.field(name, pa.float64()) for name in self.observables]
        fields.append(pa.field(ENDING, pa.dictionary(pa.int32(), pa.string()), nullable=False))
        return pa.schema(fields, metadata=metadata)


def columns_of(
    experiment: Experiment, addresses: Sequence[str], observables: Sequence[Observable]
) -> Columns:
    """The columns of a sweep over these addresses."""
    known = inputs(experiment)
    units = {address: known[address].unit for address in addresses}
    conditions = {address: with_unit(address, units[address]) for address in addresses}
    return Columns(conditions, units, tuple(c for o in observables for c in o.columns))


def with_unit(address: str, unit: str) -> str:
    """An address with its unit as part of a name.

    >>> with_unit("steps.d.A", "L/mol/s"), with_unit("steps.d.k", "1/s"), with_unit("steps.d.n", "")
    ('steps.d.A_L_per_mol_per_s', 'steps.d.k_per_s', 'steps.d.n')
    """
    head, *below = unit.replace("^", "").replace("**", "").split("/")
    words = [] if head.strip() in ("", "1") else [head]
    words += [f"per_{part}" for part in below]
    tail = "_".join(word.strip().replace("*", "_").replace(" ", "_") for word in words)
    return f"{address}_{tail}" if tail else address
