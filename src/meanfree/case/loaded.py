"""What loading a case file gives: the experiment, and what is needed to name and repeat it."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

from meanfree.experiment.experiment import Experiment
from meanfree.planning.request import PlanRequest


@dataclass(frozen=True)
class LoadedCase:
    """A case file that was understood.

    ``text`` is the file as it was read, ``settings`` the changes asked for with ``--set``,
    ``tables`` the parsed TOML after them. ``planning`` is what ``[plan]`` asks for. ``data``
    holds the ``[[data]]`` tables as they stand; the commands that read measurements interpret
    them.
    """

    path: Path
    text: str
    tables: Mapping[str, Any]
    experiment: Experiment
    settings: Mapping[str, str] = field(default_factory=dict)
    data: tuple[Mapping[str, Any], ...] = ()
    planning: PlanRequest = field(default_factory=PlanRequest)

    @property
    def name(self) -> str:
        """The file's name without its ending; results are kept under it."""
        return self.path.stem

    @cached_property
    def hash(self) -> str:
        """SHA-256 of what the case says after ``--set``; comments and spacing do not count."""
        content = json.dumps(self.tables, ensure_ascii=False, default=str, separators=(",", ":"))
        return hashlib.sha256(content.encode()).hexdigest()
