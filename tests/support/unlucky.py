"""The real command in processes of its own, and ways for it to be stopped."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from collections.abc import Mapping, Sequence
from pathlib import Path

from sweeps import contents

COMMAND = (sys.executable, "-m", "meanfree")
WAIT_S = 300.0
STOPPED = {signal.SIGKILL: -9, signal.SIGTERM: 143, signal.SIGHUP: 129, signal.SIGINT: 130}
"""The exit status after each signal; a process that SIGKILL ends has none of its own."""


def environment(changes: Mapping[str, str | None]) -> dict[str, str]:
    """That of the tests, with variables set, or taken away where the value is None."""
    whole = {**os.environ, **{name: value for name, value in changes.items() if value is not None}}
    return {name: value for name, value in whole.items() if changes.get(name, value) is not None}


def begun(
    folder: Path, arguments: Sequence[str], *, before: object = None, **changes: str | None
) -> subprocess.Popen[bytes]:
    """The command begun in ``folder``, with signals as a terminal would have them."""

    def prepare() -> None:
        # tests themselves may have been started with these ignored, which is inherited
        for number in (signal.SIGINT, signal.SIGHUP, signal.SIGTERM):
            signal.signal(number, signal.SIG_DFL)
        if callable(before):
            before()

    return subprocess.Popen(
        [*COMMAND, *arguments],
        cwd=folder,
        env=environment(changes),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        start_new_session=True,
        preexec_fn=prepare,
    )


def ended(process: subprocess.Popen[bytes]) -> tuple[int, str, str]:
    """Its exit status, what it printed, and what it complained of."""
    printed, complaint = process.communicate(timeout=WAIT_S)
    return process.returncode, printed.decode(), complaint.decode()


def carried_out(
    folder: Path, arguments: Sequence[str], *, before: object = None, **changes: str | None
) -> tuple[int, str, str]:
    """The command begun and left alone."""
    return ended(begun(folder, arguments, before=before, **changes))


def killed(
    folder: Path,
    arguments: Sequence[str],
    number: signal.Signals,
    chance: random.Random,
    *,
    longest: float,
) -> tuple[int, str, str]:
    """The command stopped by a signal: after a random time, or while it writes its results.

    Half of the time the moment is random in ``longest`` [s]; else what is hidden in the folders
    below ``outputs`` is waited for, which is there only while something is being written.
    """
    process = begun(folder, arguments)
    start = time.monotonic()
    moment = chance.uniform(0.0, longest)
    while_writing = chance.random() < 0.5
    while process.poll() is None and time.monotonic() - start < WAIT_S:
        if while_writing and hidden(folder / "outputs"):
            time.sleep(chance.uniform(0.0, 0.05))
            break
        if not while_writing and time.monotonic() - start > moment:
            break
        time.sleep(0.001)
    # as Ctrl-C or a closing terminal does: all processes of the session at once
    if process.poll() is None:
        os.killpg(process.pid, number)
    return ended(process)


def hidden(folder: Path) -> list[Path]:
    """What is being prepared below a folder, or was left there."""
    return [path for path in folder.glob("*/.*") if path.name.endswith(".meanfree")]


def whole_results(folder: Path, known: Sequence[Mapping[str, str]]) -> bool:
    """True where a folder holds exactly one of the results known, each file byte for byte."""
    return contents(folder) in known
