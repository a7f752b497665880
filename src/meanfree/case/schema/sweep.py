"""The table ``[sweep]``: many conditions of one case, and what is asked of each."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Field

from meanfree.case.schema.base import Later, Line, Number, Table
from meanfree.sourced import Sourced

_VALUE = Later("480 K", kinds=("string", "number"))


class VaryTable(Table):
    """How one number is varied: values, a range, or a normal spread."""

    values: list[Annotated[Any, _VALUE]] | None = Field(None, description="grid: these values")
    between: list[Annotated[Any, _VALUE]] | None = Field(
        None, description='lowest and highest value, such as ["400 K", "600 K"]'
    )
    points: Annotated[Sourced, Number(1, 1e6)] | None = Field(
        None, description="grid: points in that range, its ends included; default: 11"
    )
    spacing: Literal["linear", "log", "normal"] | None = Field(
        None, description='"linear" (default) or "log"; quasi-random also "normal"'
    )
    mean: Annotated[Any, _VALUE] = Field(None, description="normal: the mean; default: the case's")
    sd: Annotated[Any, Later("2 K", kinds=("string", "number"))] = Field(
        None, description="normal: the standard deviation"
    )


class SweepTable(Table):
    """What `sweep` runs."""

    design: Literal["grid", "list", "quasi-random"] | None = Field(
        None,
        description="every combination, the rows of a file, or a Sobol sequence; default: list "
        "where a file is named, quasi-random where samples are, else grid",
    )
    vary: dict[str, VaryTable] = Field(
        default_factory=dict, description="how each number is varied, by its address"
    )
    samples: Annotated[Sourced, Number(1, 2**40)] | None = Field(
        None, description="quasi-random: conditions, a power of two; default: 1024"
    )
    seed: Annotated[Sourced, Number(0, 2**32 - 1)] = Field(
        Sourced(1.0, default=True), description="quasi-random: seed of the scrambling"
    )
    file: Line | None = Field(
        None,
        description="list: a table inside the case file's folder, one condition a row, headed by "
        'addresses with their unit: "temperature.value [K]"',
    )
    observables: list[Line] | None = Field(
        None,
        description='such as "reaction time of NO to 0.9", "half-life of NO", "2nd half-life of '
        'NO", "peak of NO", "conversion of NO at 10 min", "total pressure at 1 h", "total '
        'pressure" (at the end) or "length of the run"; default: half-life and conversion of the '
        "watched gas, total pressure and length of the run",
    )
    part: Annotated[Sourced, Number(16, 2**20)] | None = Field(
        None, description="conditions in one file of the results; default: from their number"
    )
