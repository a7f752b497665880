"""The README's table of outside checks lists what the tests check, and nothing else."""

from __future__ import annotations

import validation


def test_every_row_has_its_test_and_every_test_its_row() -> None:
    listed = {test for test, _, _ in validation.table()}
    assert listed == set(validation.asking())


def test_the_table_is_read_as_it_is_written() -> None:
    one = validation.Check("a.py: test", "mean speed", "a book", "397.419", 397.42, "m/s")
    line = "| mean speed | a book | 397.419 m/s | 397.42 | +2.5e-06 | `a.py: test` |"
    assert validation.rows([one]) == [line]
    two = validation.Check("a.py: test", "mean speed", "a book", "100", 99.0, "m/s")
    line = "| mean speed | a book | 2 values |  | at most 1.0 % | `a.py: test` |"
    assert validation.rows([one, two]) == [line]
