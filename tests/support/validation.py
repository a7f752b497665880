"""Checks against the outside: each is asserted, recorded, and a row of the README's table.

A test asks for the fixture `checked` and calls it once a value. `validation_table.py` runs those
tests and writes the table from what they recorded; every later run holds its own rows to it.
"""

from __future__ import annotations

import ast
import math
import re
from collections.abc import Iterable
from dataclasses import dataclass
from decimal import Decimal
from functools import cache
from pathlib import Path
from typing import Any, Protocol

README = Path(__file__).parents[2] / "README.md"
TESTS = Path(__file__).parents[1]
BEGIN = "<!-- validation: written by tests/support/validation_table.py -->"
END = "<!-- end of validation -->"
HEAD = "| quantity | source | published | ours | difference | test |\n|---|---|---|---|---|---|"
ROUNDING = "rounding"
SHOWN = 1e-5
"""Six digits of our value are shown: one unit of the last is at most this share of it."""


class Checked(Protocol):
    """A check against a published value, which the README's table then lists."""

    def __call__(
        self,
        quantity: str,
        ours: Any,
        printed: str,
        unit: str,
        source: str,
        *,
        rel: float | None = None,
        within: float | None = None,
        slack: float = 0.0,
    ) -> None: ...


@dataclass(frozen=True)
class Check:
    """One value of ours beside a published one."""

    test: str
    quantity: str
    source: str
    published: str
    ours: float
    unit: str

    @property
    def difference(self) -> float:
        """Ours over published, less one."""
        return self.ours / float(self.published) - 1.0


@dataclass(frozen=True)
class Row:
    """What a line of the table says: one value, or how many and how far the worst is off."""

    published: str
    ours: str
    difference: str


def half_unit(printed: str) -> float:
    """Half a unit of the last printed digit."""
    exponent = Decimal(printed).as_tuple().exponent
    assert isinstance(exponent, int)
    return 0.5 * 10.0**exponent


def share(value: float, signed: bool = True) -> str:
    """A relative difference in words of two digits."""
    if abs(value) < 1e-12:
        return ROUNDING
    sign = "+" if signed and value > 0 else ""
    size = value if signed else abs(value)
    if abs(value) >= 1e-4:
        digits = max(0, 1 - math.floor(math.log10(abs(100 * value))))
        return f"{sign}{100 * size:.{digits}f} %"
    return f"{sign}{size:.1e}"


def rows(checks: Iterable[Check]) -> list[str]:
    """The lines of the table, one for all values of a quantity that a test compares."""
    groups: dict[tuple[str, str, str], list[Check]] = {}
    for one in checks:
        groups.setdefault((one.test, one.quantity, one.source), []).append(one)
    lines = []
    for (test, quantity, source), found in groups.items():
        if len(found) == 1:
            one = found[0]
            unit = f" {one.unit}" if one.unit else ""
            cells = [f"{one.published}{unit}", f"{one.ours:.6g}", share(one.difference)]
        else:
            worst = max(abs(one.difference) for one in found)
            off = share(worst, signed=False)
            cells = [f"{len(found)} values", "", off if off == ROUNDING else f"at most {off}"]
        lines.append("| " + " | ".join([quantity, source, *cells, f"`{test}`"]) + " |")
    return lines


def asking() -> dict[str, Path]:
    """The tests that ask for the fixture, as the table names them, with their modules."""
    found = {}
    for path in sorted(TESTS.rglob("test_*.py")):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if not isinstance(node, ast.FunctionDef) or not node.name.startswith("test_"):
                continue
            if "checked" in {one.arg for one in node.args.args}:
                found[f"{path.relative_to(TESTS).as_posix()}: {node.name}"] = path
    return found


def table_text() -> str:
    """What stands between the marks in the README."""
    text = README.read_text(encoding="utf-8")
    return text[text.index(BEGIN) + len(BEGIN) : text.index(END)]


@cache
def table() -> dict[tuple[str, str, str], Row]:
    """The README's rows by test, quantity and source."""
    found = {}
    for line in table_text().splitlines():
        if not line.startswith("| ") or line.startswith("| quantity"):
            continue
        quantity, source, published, ours, difference, test = line.strip("| ").split(" | ")
        found[test.strip("`"), quantity, source] = Row(published, ours.strip(), difference)
    return found


def is_current(one: Check) -> str | None:
    """What the README says otherwise; None where it agrees."""
    row = table().get((one.test, one.quantity, one.source))
    if row is None:
        return "no row of the README"
    if row.published.endswith(" values"):
        bound = 0.0 if row.difference == ROUNDING else _worst(row.difference)
        # two digits of the worst are shown, and six of a value count
        within = abs(one.difference) <= 1.05 * bound + SHOWN
        return None if within else f"the README has {row.difference}"
    same = math.isclose(one.ours, float(row.ours), rel_tol=SHOWN)
    return None if same and row.published.startswith(one.published) else f"the README has {row}"


def _worst(text: str) -> float:
    number = re.search(r"[-+.0-9e]+", text.removeprefix("at most "))
    assert number is not None, text
    return float(number[0]) * (0.01 if text.endswith("%") else 1.0)
