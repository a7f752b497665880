"""Enormous inputs in a process of their own, with little memory: refused, and soon.

What is bounded is memory (the address space of the process) and work (its processor time, with
twenty times of what is needed).
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path
from typing import Literal

import pytest
from small_cases import GOOD

resource = pytest.importorskip("resource")

MEMORY = 2 << 30  # bytes of address space, most of it libraries and their threads
SECONDS = 60  # of processor time; each takes about 2 s
DATA = """
[[data]]
file = "run.csv"
time = { column = 1, unit = "s" }
signal = { column = 2, unit = "torr", is = "total pressure" }
"""


def limits() -> None:
    resource.setrlimit(resource.RLIMIT_AS, (MEMORY, MEMORY))
    resource.setrlimit(resource.RLIMIT_CPU, (SECONDS, SECONDS))


def checked(folder: Path, text: str | bytes) -> tuple[int, str]:
    """Exit status and message of `check` on a case."""
    content = text.encode() if isinstance(text, str) else text
    (folder / "case.toml").write_bytes(content)
    done = subprocess.run(
        [sys.executable, "-c", "from meanfree.cli import main; main()", "check", "case.toml"],
        cwd=folder,
        capture_output=True,
        text=True,
        preexec_fn=limits,
        env={
            "OPENBLAS_NUM_THREADS": "1",
            "PATH": "/usr/bin:/bin",
            "PYTHONPATH": ":".join(sys.path),
        },
    )
    assert "Traceback" not in done.stderr
    return done.returncode, done.stderr


def many(pattern: str, count: int) -> str:
    return "".join(pattern.format(i) for i in range(count))


CASES = {
    "nesting": ("a = " + "[" * 10_000 + "]" * 10_000 + "\n" + GOOD, "nested too deeply"),
    "dotted keys": (".".join(["a"] * 10_000) + " = 1\n" + GOOD, "nested too deeply"),
    "50 MB": ('title = "' + "x" * 50_000_000 + '"\n', "a file larger than 1 MiB"),
    "a million keys": (many("k{} = 1\n", 1_000_000), "a file larger than 1 MiB"),
    "as many keys as fit": (many("k{} = 1\n", 90_000) + GOOD, "more than 300 problems"),
    "a million steps": (GOOD + "[[steps]]\n" * 1_000_000, "a file larger than 1 MiB"),
    "as many steps as fit": (GOOD + "[[steps]]\n" * 80_000, "80001 steps"),
    "as many bad steps as are read": (GOOD + "[[steps]]\nq=1\n" * 19_000, "more than 300 problems"),
    "as many labels as fit": (
        "labels = [" + many('"L{}", ', 70_000) + "]\n" + GOOD,
        "more than 300 problems",
    ),
    "as many unknown gases as fit": (
        GOOD.replace("gases = {", "gases = {" + many('G{} = "1 torr", ', 40_000)),
        "40 unknown gases, and more unread",
    ),
    "a number of a million digits": ("a = " + "9" * 1_000_000, "thousands of digits"),
    "times": (
        GOOD.replace("[run]", "[run]\nreport_at = [" + '"1 s", ' * 100_000 + "]"),
        "at most 1000",
    ),
    "points": (
        GOOD.replace(
            'mode = "isothermal"\nvalue = "480 K"',
            'mode = "program"\npoints = [' + many('["{} s", "300 K"], ', 40_000) + "]",
        ),
        "at most 10000",
    ),
}


FEW = ("as many unknown gases as fit", "points", "a million columns", "time that goes back")


@pytest.mark.parametrize("name", ["nesting", "as many keys as fit"])
def test_a_case_that_is_enormous(name: str, tmp_path: Path) -> None:
    text, message = CASES[name]
    status, said = checked(tmp_path, text)
    assert status == 2, said[-2000:]
    assert message in said


@pytest.mark.slow
@pytest.mark.parametrize("name", sorted(CASES))
def test_every_case_that_is_enormous(
    name: str, tmp_path: Path, size: Literal["small", "full"]
) -> None:
    if size == "small" and name not in FEW:
        pytest.skip("in the full size")
    test_a_case_that_is_enormous(name, tmp_path)


READINGS = {
    "a million columns": (b"0," + b"1," * 1_000_000 + b"\n1,2\n", None),
    "columns without end": ((b"1," * 100_000 + b"\n") * 60, "more than 4000000 cells"),
    "lines without end": (b"1\n" * 1_100_000, "1100000 lines; expected".partition(";")[0]),
    "bytes without end": (b"0,1\n" * 5_000_000, "a file larger than 16 MiB"),
    "a number without end": (b"0,1\n1," + b"9" * 1_000_000 + b"\n", "1000000 characters"),
    "nothing but nonsense": (b"x,y\n" * 900_000, "more of that kind"),
    "time that goes back": (b"".join(b"%d,%d\n" % (-n, n) for n in range(500_000)), "more of that"),
}


@pytest.mark.slow
@pytest.mark.parametrize("name", sorted(READINGS))
def test_readings_that_are_enormous(
    name: str, tmp_path: Path, size: Literal["small", "full"]
) -> None:
    if size == "small" and name not in FEW:
        pytest.skip("in the full size")
    content, message = READINGS[name]
    (tmp_path / "run.csv").write_bytes(content)
    status, said = checked(tmp_path, GOOD + DATA)
    if message is None:  # odd, but each line has its two numbers
        assert status == 0, said[-2000:]
        return
    assert status == 2, said[-2000:]
    assert message in said


@pytest.mark.parametrize("name", ["pipe", "zero", "out"])
def test_what_is_no_file_is_not_waited_for(name: str, tmp_path: Path) -> None:
    import os

    folder = tmp_path / "lab"
    folder.mkdir()
    os.mkfifo(folder / "pipe")
    (folder / "zero").symlink_to("/dev/zero")
    (tmp_path / "secret").write_text("0,1\n1,2\n")
    (folder / "out").symlink_to("../secret")
    status, said = checked(folder, GOOD + DATA.replace("run.csv", name))
    assert status == 2
    expected = "something that is no file" if name == "pipe" else "outside the case file's folder"
    assert expected in said
