"""One part of a sweep: conditions by index in, the bytes of a Parquet file out.

A pure function of the campaign and the part's number, so that it gives the same bytes wherever it
runs. A condition that cannot be integrated is kept with its reason.
"""

from __future__ import annotations

import io
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from meanfree.campaigns.campaign import Campaign, makers
from meanfree.campaigns.columns import ENDING
from meanfree.campaigns.designs import Floats
from meanfree.campaigns.possible import impossible_values, reason_of
from meanfree.errors import ComputationError, InputError
from meanfree.integrate.many import Runs
from meanfree.kernel.status import Ending

COMPRESSION = "zstd"

Table = Mapping[str, Floats]
Longs = NDArray[np.int64]


@dataclass(frozen=True)
class Part:
    """A part as it goes to the disk: ``content`` is the whole file."""

    number: int
    rows: int
    content: bytes


def compute_part(campaign: Campaign, number: int) -> Part:
    """Integrate one part of a campaign, in this thread.

    Raises `ComputationError` where this is not the program that planned the campaign: its bits
    could differ.
    """
    own = ", ".join(f"{name} {version}" for name, version in makers().items())
    if own != campaign.identity["made_by"]:
        raise ComputationError(
            f"A worker runs {own}, where the sweep was planned with "
            f"{campaign.identity['made_by']}. Install the same versions on all machines."
        )
    start, stop = campaign.span(number)
    conditions = campaign.design.rows(start, stop)
    values, endings = _integrated(campaign, conditions, stop - start)
    return Part(number, stop - start, _file(campaign, number, conditions, values, endings))


@dataclass
class _Endings:
    """How each run ended: words, and which of them."""

    words: list[str]
    which: Longs

    def say(self, rows: Longs | int, word: str) -> None:
        """The same words for some rows."""
        if word not in self.words:
            self.words.append(word)
        self.which[rows] = self.words.index(word)


def _integrated(campaign: Campaign, conditions: Table, count: int) -> tuple[Floats, _Endings]:
    """Observables [shape (n_columns, count)] and how each run ended."""
    values = np.full((len(campaign.columns.observables), count), np.nan)
    endings = _Endings([ending.sentence for ending in Ending], np.zeros(count, np.int64))
    refused = impossible_values(campaign.experiment, conditions)
    for row, reason in refused.items():
        endings.say(row, reason)
    runs = Runs(campaign.experiment, campaign.observables, workers=1)
    pending = [np.setdiff1d(np.arange(count), np.fromiter(refused, int, len(refused)))]
    while pending:
        rows = pending.pop()
        if not len(rows):
            continue
        try:
            found, marks = runs.arrays({a: column[rows] for a, column in conditions.items()})
        except InputError as error:
            # Some of them make no experiment: halve until those stand alone.
            if len(rows) == 1:
                endings.say(int(rows[0]), reason_of(error))
            else:
                pending += [rows[len(rows) // 2 :], rows[: len(rows) // 2]]
            continue
        values[:, rows] = found
        endings.which[rows] = marks
    return values, endings


def _file(
    campaign: Campaign, number: int, conditions: Table, values: Floats, endings: _Endings
) -> bytes:
    """The Parquet file of a part; its metadata say what it belongs to."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    start, stop = campaign.span(number)
    schema = campaign.columns.schema(
        {**campaign.identity, "campaign": campaign.hash, "part": str(number)}
    )
    used, codes = np.unique(endings.which, return_inverse=True)
    words = [endings.words[which] for which in used]
    # In order of the alphabet, whatever order they were met in.
    order = sorted(range(len(words)), key=words.__getitem__)
    rank = np.argsort(order)
    ending = pa.DictionaryArray.from_arrays(
        pa.array(rank[codes].astype(np.int32)), pa.array([words[i] for i in order], pa.string())
    )
    arrays = [
        pa.array(np.arange(start, stop)),
        *(pa.array(np.ascontiguousarray(conditions[a])) for a in campaign.design.addresses),
        *(pa.array(row, from_pandas=True) for row in values),
        ending,
    ]
    table = pa.Table.from_arrays(arrays, schema=schema)
    out = io.BytesIO()
    # Values seldom repeat: a dictionary of them would only cost time.
    pq.write_table(table, out, compression=COMPRESSION, use_dictionary=[ENDING])
    return out.getvalue()
