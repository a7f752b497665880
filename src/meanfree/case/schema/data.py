"""The tables ``[[data]]``: which columns of which file are what."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, create_model

from meanfree.case.schema.base import Later, Length, Line, Table, Time

_COLUMN = Later("t", "2", kinds=("string", "integer"))
_COEFFICIENT = Later("85 L/mol/cm", "2.5e-19 cm^2")
_SD = Later("0.5 torr", "2 %", "estimated", kinds=("string", "object"))


class ColumnTable(Table):
    """A column of the file, by its name in the heading or by its number, and its unit."""

    column: Annotated[Any, _COLUMN] = Field(description="name in the heading, or number from 1")
    unit: Line | None = Field(None, description="unit of the numbers in the column")


class TimeColumnTable(ColumnTable):
    """The column of times."""

    zero: Time | None = Field(
        None, description="what the clock of the column shows when the run begins"
    )


class _SignalBase(ColumnTable):
    """The column of readings, and what was read."""

    hints: ClassVar[dict[str, str]] = {"of": 'is = "concentration of NO", say'}
    path: Length | None = Field(None, description="an absorbance: length of the light's way")
    coefficients: dict[str, Annotated[Any, _COEFFICIENT]] = Field(
        default_factory=dict,
        description="an absorbance: each gas that absorbs with its coefficient (to the base 10) "
        "or its cross-section (to the base e)",
    )
    base: Literal["10", "e"] = Field("10", description="an absorbance: base of its logarithm")
    counts: Line = Field(
        "events",
        description='a rate constant: what it counts, "events", "loss of A" or "formation of X"',
    )


_IS = Field(
    description='what was read: "total pressure", "partial pressure of A", "concentration of A", '
    '"number density of A", "conversion of A", "mole fraction of A", "absorbance", '
    '"rate constant of STEP"; a sum of gases as "concentration of A + B"'
)
# "is" is a word of Python, so that the field cannot be written in a class.
_FIELDS: dict[str, Any] = {"is": (Line, _IS)}
SignalTable: Any = create_model(
    "SignalTable", __base__=_SignalBase, __doc__=_SignalBase.__doc__, **_FIELDS
)


class LayoutTable(Table):
    """How a file is written, where that cannot be seen from its lines."""

    delimiter: Literal["tab", "comma", "semicolon", "bar", "blanks"] | None = Field(
        None, description="what stands between the columns; default: as the lines show"
    )
    decimal: Literal[".", ","] = Field(".", description='the decimal mark, "." or ","')
    skip: int = Field(0, description="lines to skip before the table", ge=0, le=10_000)
    heading: int | None = Field(
        None, description="lines of heading, the names in the first", ge=0, le=20
    )


class BlankTable(LayoutTable):
    """A run without the reaction, whose signal is taken off."""

    file: Line = Field(description="file of the blank run, inside the case file's folder")
    time: TimeColumnTable | None = Field(None, description="default: as in the run")
    column: Annotated[Any, _COLUMN] | None = Field(
        None, description="column of the signal; default: as in the run"
    )
    subtract: Literal["signal", "change"] = Field(
        description='"signal": all of it (a base line); "change": its change since its start (a '
        "leak, a drift)"
    )


class DataTable(LayoutTable):
    """One measured run."""

    hints: ClassVar[dict[str, str]] = {"conditions": "a table [data.conditions] with addresses"}
    name: Line | None = Field(None, description="name of the run; default: that of the file")
    file: Line = Field(description="file of readings, inside the case file's folder")
    time: TimeColumnTable | None = Field(None, description='such as { column = "t", unit = "min" }')
    temperature: ColumnTable | None = Field(
        None, description="temperatures, in place of times, where rate constants were measured"
    )
    signal: SignalTable = Field(
        description='such as { column = "p", unit = "torr", is = "total pressure" }'
    )
    sd: Annotated[Any, _SD] = Field(
        "estimated",
        description="standard deviation of a reading: a quantity, a share of each reading "
        '("2 %"), { column = "s" }, or "estimated" from the scatter about the fit',
    )
    blank: BlankTable | None = Field(None, description="a blank run to subtract")
    conditions: dict[str, Any] = Field(
        default_factory=dict,
        description='what differs from the case, by address: "temperature.value" = "500 K"',
    )
