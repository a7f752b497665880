"""What a report must say about the case it came from, and how to repeat it."""

from __future__ import annotations

import shlex
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from importlib import metadata
from pathlib import Path

LIBRARIES = ("numpy", "scipy", "sympy", "matplotlib", "pint", "pydantic", "chemicals")
"""The libraries that numbers on the page pass through."""


def portable(path: Path) -> str:
    """A file as a report names it: as it was typed, but never by its place on this machine.

    Of an absolute path what lies below the present folder is left, else the bare name.
    """
    if path.is_absolute():
        here = Path.cwd()
        path = path.relative_to(here) if path.is_relative_to(here) else Path(path.name)
    return path.as_posix()


@dataclass(frozen=True)
class CaseRecord:
    """A case as a report names it.

    ``name`` of the file without its ending, ``file`` as `portable` names it, ``text`` as read,
    ``sha256`` of what it says after ``settings`` (address to value, from ``--set``).
    """

    name: str
    file: str
    text: str
    sha256: str
    settings: Mapping[str, str] = field(default_factory=dict)

    def command_line(self, command: str) -> str:
        """The line that repeats a command on this case."""
        words = ["meanfree", command, self.file]
        for address, value in self.settings.items():
            words += ["--set", f"{address}={value}"]
        return shlex.join(words)

    @cached_property
    def version(self) -> str:
        """The version of this program."""
        return metadata.version("meanfree")


def versions() -> dict[str, str]:
    """Versions of Python, of this program and of the libraries it computes with."""
    import platform

    found = {"python": platform.python_version(), "meanfree": metadata.version("meanfree")}
    return found | {name: metadata.version(name) for name in LIBRARIES}
