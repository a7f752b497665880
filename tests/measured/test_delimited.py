"""Files of readings as instruments write them, and every refusal by its whole text."""

from __future__ import annotations

import pytest

from meanfree.errors import Problem
from meanfree.measured.delimited import LARGEST, Layout, cells_of, column, decoded, number

ROWS = ((0.0, 1.5), (10.0, -2e3))


def read(text, wanted=(1, 2), layout=None):
    """Both columns of a text, or the problems with it."""
    layout = layout or Layout()
    cells = cells_of(text, layout, wanted)
    if isinstance(cells, Problem):
        return [cells]
    columns, problems = [], []
    for one in wanted:
        found, wrong = column(cells, one, layout, "here")
        columns.append(found)
        problems += wrong
    return problems or tuple(zip(*(c.values for c in columns), strict=True))


@pytest.mark.parametrize(
    "text",
    [
        "t,p\n0,1.5\n10,-2e3\n",
        "t\tp\n0\t1.5\n10\t-2000\n",
        "t;p\n0;1.5\n10;-2e3",
        "t|p\n0|1.5\n10|-2e3\n",
        "t p\n0 1.5\n10   -2E+3\n",
        "# made on a Monday\n\n% by hand\nt,p\n\n0,1.5\n# a break\n10,-2e3\n",
        '"t","p"\n"0","1.5"\n"10","-2e3"\n',
        "t,p,remark\n0,1.5,ok\n10,-2e3,\n",
        "t,p\r\n0,1.5\r\n10,\u22122e3\r\n",
        " t , p \n 0 , +1.50 \n 10 , -2.e3 \n",
    ],
)
def test_one_table_written_in_many_ways(text):
    assert read(text, ("t", "p")) == ROWS


def test_no_heading():
    assert read("0 1.5\n10 -2000\n") == ROWS
    assert read("0 1.5\n10 -2000\n", layout=Layout(heading=0)) == ROWS


def test_heading_with_a_line_of_units():
    text = "t,p\nmin,torr\n0,1.5\n10,-2000\n"
    assert read(text, ("t", "p"), Layout(heading=2)) == ROWS
    assert [str(p) for p in read(text, ("t", "p"))] == [
        'line 2, column t: found "min"; expected a number',
        'line 2, column p: found "torr"; expected a number',
    ]


def test_lines_before_the_table():
    assert (
        read("Logger 3\nno, table, yet\nt,p\n0,1.5\n10,-2000\n", ("t", "p"), Layout(skip=2)) == ROWS
    )


def test_decimal_comma():
    text = "t;p\n0;1,5\n10;-2,0e3\n"
    assert read(text, ("t", "p"), Layout(decimal=",")) == ROWS
    assert [str(p) for p in read(text, ("t", "p"))] == [
        f"line {line}, column p: found {cell}, with a comma; expected a decimal point, "
        'or decimal = ","'
        for line, cell in ((2, '"1,5"'), (3, '"-2,0e3"'))
    ]
    assert [str(p) for p in read("0;1.5\n1;2\n", layout=Layout(decimal=","))] == [
        'line 1, column 2: found "1.5", with a point; expected a decimal comma, or decimal = "."'
    ]


def test_what_is_no_number():
    found = [str(p) for p in read("t,p\n0,nan\n1,\n2\n3,1e999\n4,1_000\n5,0x10\n", ("t", "p"))]
    assert found == [
        'line 2, column p: found "nan"; expected a number',
        "line 3, column p: found an empty cell; expected a number; a comment (#) takes a line out",
        "line 4, column p: found 1 cells; expected a number; a comment (#) takes a line out",
        'line 5, column p: found "1e999"; expected a number',
        'line 6, column p: found "1_000"; expected a number',
        'line 7, column p: found "0x10"; expected a number',
    ]


def test_many_wrong_cells_are_counted():
    text = "t,p\n" + "".join(f"{i},x\n" for i in range(100))
    found = read(text, ("t", "p"))
    assert len(found) == 21
    assert str(found[-1]) == "column p: found 80 more of that kind; expected numbers"


def test_columns_that_are_not_there():
    text = "t,p,p\n0,1,2\n1,2,3\n"
    assert [str(p) for p in read(text, ("time", "p"))] == [
        'here: found "time", which heads no column; expected one of "t", "p", "p", or a number',
        'here: found "p", a name of 2 columns; expected its number, 2 or 3',
    ]
    assert [str(p) for p in read(text, (1, 4))] == [
        "here: found column 4; expected a column from 1 to 3"
    ]


def test_files_that_hold_no_table():
    none = "found no line that is not blank or a comment; expected a table of readings"
    assert [str(p) for p in read("")] == [none]
    assert [str(p) for p in read("# t,p\n\n")] == [none]
    assert [str(p) for p in read("t,p\n", ("t", "p"))] == [
        "found 1 lines, all of them heading; expected lines of readings"
    ]


def test_bytes():
    assert decoded("t,µ\n".encode("utf-8-sig")) == "t,µ\n"
    assert decoded("t,µ\n".encode("utf-16")) == "t,µ\n"
    assert str(decoded(b"t,p\n0,\xb5\n")) == (
        "line 2: found bytes that are not UTF-8; expected a text file in UTF-8"
    )
    assert str(decoded(b"t\n\0\n")) == "line 2: found a zero byte; expected a text file"
    assert str(decoded(b" " * (LARGEST + 1))) == (
        "found a file larger than 16 MiB; expected one of at most 16 MiB: fewer readings, "
        "thinned out"
    )


@pytest.mark.parametrize("text", ["", "-", "1 2", "1e", "--1", "1.2.3", "١", "inf"])
def test_not_a_number(text):
    assert number(text) is None
