"""Write the README's table of outside checks from what the tests find.

    python tests/support/validation_table.py

Runs every test that asks for the fixture `checked`, the slow ones in their full size.
"""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parent))

import validation


class Recorder:
    """Takes in what the tests record."""

    def __init__(self) -> None:
        self.checks: list[validation.Check] = []

    def pytest_runtest_logreport(self, report: Any) -> None:
        """Keep the checks of a test that ran."""
        if report.when == "call" and report.passed:
            found = [value for name, value in report.user_properties if name == "published"]
            self.checks += [validation.Check(**one) for one in found]


def main() -> int:
    """Run the tests, write the table."""
    recorder = Recorder()
    os.environ["MEANFREE_VALIDATION"] = "write"
    modules = dict.fromkeys(map(str, validation.asking().values()))
    arguments = ["-q", "-p", "no:cacheprovider", *modules]
    status = pytest.main(arguments, plugins=[recorder])
    if status != 0:
        return int(status)
    lines = validation.rows(recorder.checks)
    text = validation.README.read_text(encoding="utf-8")
    before, after = text.split(validation.BEGIN)[0], text.split(validation.END)[1]
    body = "\n".join(["", validation.HEAD, *lines, ""])
    written = before + validation.BEGIN + body + validation.END + after
    validation.README.write_text(written, encoding="utf-8")
    print(f"{len(lines)} rows of {len(recorder.checks)} values")
    return 0


if __name__ == "__main__":
    sys.exit(main())
