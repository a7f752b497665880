"""Writes results that can be checked for wholeness; as a script, over and over until killed.

python results_writer.py TARGET OWNER FIRST_NUMBER TIMES
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

from meanfree.files import fresh_folder

PARTS = 5


def write(target: Path, owner: str, number: int, *, replace: bool = False) -> None:
    """Leave results whose every part holds ``number``."""
    with fresh_folder(target, owner=owner, replace=replace) as folder:
        for part in range(PARTS):
            (folder / f"part-{part}.csv").write_text(f"{number}\n" * 200)
        (folder / "manifest.json").write_text(json.dumps({"case_file": owner, "n": number}))


def number_in(folder: Path) -> int:
    """The number that all parts agree on; AssertionError where the folder is not whole."""
    number = int(json.loads((folder / "manifest.json").read_text())["n"])
    found = {path.name for path in folder.iterdir()}
    assert found == {"manifest.json", *(f"part-{part}.csv" for part in range(PARTS))}
    for part in range(PARTS):
        assert (folder / f"part-{part}.csv").read_text() == f"{number}\n" * 200
    return number


if __name__ == "__main__":
    first = int(sys.argv[3])
    for turn in range(int(sys.argv[4])):
        write(Path(sys.argv[1]), sys.argv[2], first + turn)
        print(first + turn, flush=True)
