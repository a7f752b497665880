"""A damaged input put through the program as a user would, and what must hold afterwards.

In this process, so that thousands can be tried: an audit hook watches what is opened, written
and started; a folder beside the case's must stay as it is. As a script, it tries a number of them
and says what came of it:  python attacked.py NUMBER [SEED]
"""

from __future__ import annotations

import contextlib
import io
import json
import os
import random
import re
import shutil
import sys
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from damage import Damage, damages
from damage_values import CANARY

from meanfree.cli.app import run as command_line

QUICK_COMMANDS = ("run", "equations", "ceiling", "schedule")
ALL_COMMANDS = (*QUICK_COMMANDS, "run", "limits", "compare", "window", "size")
_STARTS = ("os.system", "os.exec", "os.posix_spawn", "os.fork", "pty.spawn", "subprocess.Popen")
_NET = ("socket.connect", "socket.getaddrinfo", "socket.bind", "urllib.Request")
_CHANGES = ("os.rename", "os.remove", "os.mkdir", "os.rmdir", "os.symlink", "os.link", "os.chmod",
            "os.chown", "os.truncate", "shutil.rmtree", "os.utime")  # fmt: skip
_PYTHON = re.compile(
    r"Traceback|object at 0x|<class|NoneType|pydantic|numpy|\b[A-Z]\w*(?:Error|Exception|Warning)\b"
)
WRITING = os.O_WRONLY | os.O_RDWR | os.O_CREAT | os.O_TRUNC | os.O_APPEND

_seen: list[tuple[str, tuple[Any, ...]]] | None = None
_hooked = False


def _hook(event: str, arguments: tuple[Any, ...]) -> None:
    if _seen is not None and (
        event in ("open", "compile") or event in _STARTS or event in _NET or event in _CHANGES
    ):
        _seen.append((event, arguments))


@contextlib.contextmanager
def watching() -> Iterator[list[tuple[str, tuple[Any, ...]]]]:
    """What happens in the block, as the interpreter's audit events tell it."""
    global _seen, _hooked
    if not _hooked:
        sys.addaudithook(_hook)
        _hooked = True
    _seen = events = []
    try:
        yield events
    finally:
        _seen = None


@dataclass(frozen=True)
class Place:
    """A folder for the case, and beside it what nobody may read or touch."""

    root: Path

    @property
    def lab(self) -> Path:
        """Where the case file lies and the program runs."""
        return self.root / "lab"

    @property
    def sentinel(self) -> Path:
        """What must stay unread and untouched."""
        return self.root / "sentinel"


def prepared(root: Path) -> Place:
    """The place with its traps: links that lead out, a pipe, a device, a socket's name, a lock."""
    place = Place(root)
    place.sentinel.mkdir(parents=True)
    (place.sentinel / "secret.csv").write_text("t/min,p/torr\n0,1\n1,2\n2,4\n")
    place.lab.mkdir()
    (place.lab / "out.csv").symlink_to(place.sentinel / "secret.csv")
    (place.lab / "loop.csv").symlink_to("loop.csv")
    (place.lab / "zero.csv").symlink_to("/dev/zero")
    os.mkfifo(place.lab / "pipe.csv")
    (place.lab / "folder.csv").mkdir()
    (place.lab / "locked.csv").write_text("t/min,p/torr\n0,1\n1,2\n")
    (place.lab / "locked.csv").chmod(0)
    return place


def lay_out(damage: Damage, place: Place) -> None:
    """The damaged files, in the place of those before."""
    (place.lab / "case.toml").write_bytes(damage.content)
    for name, content in damage.readings.items():
        path = place.lab / name
        path.parent.mkdir(exist_ok=True)
        path.write_bytes(content)


@dataclass(frozen=True)
class Said:
    """What a command line printed, and its exit status."""

    status: int
    out: str
    err: str


def said(words: list[str], folder: Path) -> Said:
    """Carry out a command line in a folder."""
    out, err, here = io.StringIO(), io.StringIO(), Path.cwd()
    os.chdir(folder)
    try:
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            status = command_line(words)
    finally:
        os.chdir(here)
    return Said(status, out.getvalue(), err.getvalue())


@dataclass
class Tally:
    """What came of many damaged inputs, and everything that must not have."""

    tried: int = 0
    refused: int = 0
    valid: int = 0
    failed: int = 0
    faults: list[str] = field(default_factory=list)
    code_run: int = 0
    touched: int = 0
    by_kind: Counter[str] = field(default_factory=Counter)

    def __str__(self) -> str:
        return (
            f"{self.tried} damaged inputs: {self.refused} refused with file and key, {self.valid} "
            f"still valid, {self.failed} of those failed to compute with a message; tracebacks "
            f"{len(self.faults)}, code run {self.code_run}, files touched {self.touched}"
        )


def attack(
    damage: Damage, place: Place, tally: Tally, commands: Sequence[str] = ALL_COMMANDS
) -> None:
    """Try one damaged input; what must not be is added to the tally's faults.

    What `check` refuses, another command must refuse as well; what it does not is carried out by
    one of ``commands``, where there are any.
    """
    lay_out(damage, place)
    before = _tree(place)
    settings = [word for text in damage.settings for word in ("--set", text)]
    with watching() as events:
        checked = said(["check", "case.toml", *settings, "--json"], place.lab)
        faults = wrong_words(checked)
        if checked.status == 2:
            faults += wrong_refusal(checked)
            again = said([_reader(damage), "case.toml", *settings], place.lab)
            faults += wrong_words(again, json_wanted=False)
            if again.status != 2:
                faults.append(f"check refuses, {_reader(damage)} gives {again.status}")
        elif checked.status == 1:
            faults.append(f"check gives 1: {checked.err}")
        elif commands:
            command = random.Random(str(damage)).choice(commands)
            command = "fit" if b"[[data" in damage.content else command
            again = said([command, "case.toml", *settings, "--json"], place.lab)
            faults += [f"{command}: {fault}" for fault in wrong_words(again)]
            tally.failed += again.status == 1
    tally.tried += 1
    tally.refused += checked.status == 2
    tally.valid += checked.status == 0
    tally.by_kind[f"{damage.kind} {checked.status}"] += 1
    run, outside = _code_run(events, place), _outside(events, place)
    shutil.rmtree(place.lab / "outputs", ignore_errors=True)
    if _tree(place) != before:
        outside.append("the tree beside the results has changed")
    tally.code_run += bool(run)
    tally.touched += bool(outside)
    found = dict.fromkeys([*faults, *run, *outside])
    tally.faults += [f"{damage}\n    {fault}" for fault in found]


def _reader(damage: Damage) -> str:
    """A command that reads all that `check` reads."""
    if b"sweep" in damage.content:
        return "sweep"
    return "fit" if b"data" in damage.content else "run"


def wrong_refusal(answer: Said) -> list[str]:
    """What is wrong with a refusal in JSON: each problem names file and key, and what was found."""
    try:
        problems = json.loads(answer.out)["errors"]
    except (ValueError, KeyError):
        return [f"no errors in JSON: {answer.out[:300]}{answer.err[:300]}"]
    faults = [] if problems else ["no problems"]
    for one in problems:
        if not one["found"] or not one["expected"]:
            faults.append(f"an empty message: {one}")
        if not (one["file"] or one["key"].startswith("--")):
            faults.append(f"no file: {one}")
        if not one["key"] and "line" not in one["found"] and not one["found"].startswith(WHOLE):
            faults.append(f"neither key nor line: {one}")
        if len(f"{one['key']}{one['found']}") > 2000:
            faults.append(f"endless: {str(one)[:200]}")
    return faults


WHOLE = (
    "a file larger", "a folder", "no such file", "something that is no file", "1 reading",
    "what cannot be read", "what is not TOML", "tables or lists nested", "0 reading",
    "a number with thousands", "more than", "no line that is not blank",
)  # fmt: skip
"""Beginnings of what is said of a file as a whole."""


def wrong_words(answer: Said, *, json_wanted: bool = True) -> list[str]:
    """What must not stand on a screen: Python's own words, and characters that act on it."""
    faults = []
    text = answer.out + answer.err
    if answer.status not in (0, 1, 2):
        faults.append(f"exit status {answer.status}")
    if "unexpectedly" in text or _PYTHON.search(text):
        faults.append(f"Python's words: {text[:600]}")
    acting = {c for c in text if not c.isprintable() and c != "\n"}
    if acting:
        faults.append(f"characters that act on a terminal: {acting}")
    if not text.strip():
        faults.append("no message")
    if json_wanted:
        try:
            json.loads(answer.out, parse_constant=_no_number)
        except ValueError as error:
            faults.append(f"no JSON: {error} {answer.out[:100]}")
    return faults


def _no_number(word: str) -> None:
    raise ValueError(f"{word} in JSON")


def _tree(place: Place) -> dict[str, tuple[int, int, int]]:
    """Every file of the place, results left out, with size and times."""
    found = {}
    for folder, names, files in os.walk(place.root):
        if Path(folder) == place.lab and "outputs" in names:
            names.remove("outputs")
        for name in [*names, *files]:
            status = os.lstat(os.path.join(folder, name))
            changed = 0 if name in names and folder == str(place.root) else status.st_mtime_ns
            found[os.path.join(folder, name)] = (status.st_mode, status.st_size, changed)
    return found


def _code_run(events: list[tuple[str, tuple[Any, ...]]], place: Place) -> list[str]:
    faults = [f"{event} {args!r:.200}" for event, args in events if event in (*_STARTS, *_NET)]
    for event, args in events:
        if event == "compile" and CANARY in str(args[0]):
            faults.append(f"compiled {args[0]!r:.200}")
    if (place.lab / CANARY).exists() or hasattr(sys, CANARY):
        faults.append("the canary sang")
    return faults


def _outside(events: list[tuple[str, tuple[Any, ...]]], place: Place) -> list[str]:
    """Whatever was read in the sentinel's tree, or changed anywhere but where results go."""
    faults = []
    for event, args in events:
        if not args or not isinstance(args[0], str | bytes | os.PathLike):
            continue
        path = os.path.normpath(os.path.join(place.lab, os.fsdecode(args[0])))
        writes = event in _CHANGES or (
            event == "open" and isinstance(args[2], int) and args[2] & WRITING
        )
        strange = writes and not path.startswith((str(place.lab), *_OURS))
        if strange or path.startswith(str(place.sentinel)):
            faults.append(f"{event} {path}")
    return faults


_CACHES = tuple(str(Path.home() / name / "matplotlib") for name in (".config", ".cache"))
_KERNELS = str(Path.home() / ".cache" / "meanfree")
_OURS = ("/dev/null", "/proc/self/", *_CACHES, _KERNELS)


def main(count: int, seed: int) -> int:
    """Try that many, print every fault and the count."""
    import tempfile

    tally = Tally()
    with tempfile.TemporaryDirectory() as folder:
        place = prepared(Path(folder) / "there")
        for n, damage in enumerate(damages(seed, count)):
            known = len(tally.faults)
            attack(damage, place, tally)
            for fault in tally.faults[known:]:
                print(f"{n}: {fault}", flush=True)
    print(tally)
    for kind, number in sorted(tally.by_kind.items()):
        print(f"  {kind}: {number}")
    return 1 if tally.faults else 0


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]), int(sys.argv[2]) if len(sys.argv) > 2 else 1))
