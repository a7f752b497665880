"""Sweeps read back: as one table, or part by part where that would not fit."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from meanfree.campaigns.store import PARTS_FOLDER, growing_folder, identity_in, part_name
from meanfree.errors import InputError

if TYPE_CHECKING:
    import pandas as pd


def read_sweep(folder: str | Path, columns: Sequence[str] | None = None) -> pd.DataFrame:
    """The results of a sweep, one row a condition in the order of the design.

    ``folder`` is what ``meanfree sweep`` left (an unfinished one gives the parts that are there).
    Columns: ``index``, the conditions (address and unit of the case), the observables (NaN is what
    was not reached), and ``ending`` in words; ``columns`` picks some of them, which also saves
    memory.

    Raises
    ------
    InputError
        There is no sweep in that folder, or no such column.
    """
    import pandas as pd

    frames = list(read_sweep_parts(folder, columns))
    if not frames:
        raise InputError.at(str(folder), "a sweep of which no part is finished", "a finished one")
    together = {
        name: pd.api.types.union_categoricals([frame[name] for frame in frames])
        if isinstance(frames[0][name].dtype, pd.CategoricalDtype)
        else pd.concat([frame[name] for frame in frames], ignore_index=True)
        for name in frames[0].columns
    }
    return pd.DataFrame(together)


def read_sweep_parts(
    folder: str | Path, columns: Sequence[str] | None = None
) -> Iterator[pd.DataFrame]:
    """The same part by part: memory for one part at a time. Raises as `read_sweep`."""
    for table in arrow_parts(part_files(Path(folder)), columns):
        frame: pd.DataFrame = table.to_pandas()
        yield frame


def part_files(folder: Path) -> list[Path]:
    """The finished parts of a sweep, in order. Raises `InputError` where there is no sweep."""
    for place, parts in ((folder, folder / PARTS_FOLDER), (folder, folder)):
        if identity_in(place) is not None and parts.is_dir():
            return sorted(parts.glob(part_name(0).replace("000000", "*")))
    if identity_in(growing_folder(folder)) is not None:
        return part_files(growing_folder(folder))
    raise InputError.at(str(folder), "no sweep", "a folder that meanfree sweep left")


def arrow_parts(files: Sequence[Path], columns: Sequence[str] | None = None) -> Iterator[Any]:
    """Arrow tables, one a part."""
    import pyarrow.parquet as pq

    for file in files:
        if columns is not None:
            known = pq.read_schema(file).names
            wrong = [name for name in columns if name not in known]
            if wrong:
                raise InputError.at("columns", repr(wrong[0]), "some of " + ", ".join(known))
        yield pq.read_table(file, columns=None if columns is None else list(columns))
