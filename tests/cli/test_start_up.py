"""What the quick commands must not load: each of these libraries costs a reader a wait."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

CASES = sorted((Path(__file__).parents[2] / "cases").glob("*.toml"))
SLOW = ("chemicals", "fluids", "pandas", "sympy", "numba", "matplotlib", "scipy.integrate")

_CODE = """
import sys
from meanfree.cli.app import run
status = run(sys.argv[2:])
print(status, [m for m in sys.argv[1].split() if m in sys.modules], file=sys.stderr)
"""


def loaded(*arguments: str) -> str:
    """Exit status of a command in a fresh interpreter, and the slow libraries that it loaded."""
    words = [sys.executable, "-c", _CODE, " ".join(SLOW), *arguments]
    return subprocess.run(words, capture_output=True, text=True, check=True).stderr.strip()


def test_there_are_cases_to_check() -> None:
    assert len(CASES) >= 5


@pytest.mark.parametrize("case", CASES, ids=lambda path: path.stem)
def test_check_loads_no_slow_library(case: Path) -> None:
    """Every gas of our cases is pinned, with its dangers and its vapour pressure."""
    assert loaded("check", str(case)) == "0 []"


def test_help_loads_no_slow_library() -> None:
    assert loaded("--help") == "0 []"


def test_the_list_of_what_is_loaded_can_fail() -> None:
    code = _CODE.replace("status = run", "import matplotlib\nstatus = run")
    words = [sys.executable, "-c", code, " ".join(SLOW), "--help"]
    done = subprocess.run(words, capture_output=True, text=True, check=True)
    assert done.stderr.strip() == "0 ['matplotlib']"
