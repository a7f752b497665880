"""The progress of a sweep: how far, how fast, how long still; only on a terminal."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager

from meanfree.progress import Progress, silent


@contextmanager
def bar() -> Iterator[Progress]:
    """A line on standard error that says how far a sweep is; nothing where that is no terminal."""
    if not sys.stderr.isatty():
        yield silent
        return
    from rich.console import Console
    from rich.progress import (
        BarColumn,
        ProgressColumn,
        Task,
        TaskProgressColumn,
        TextColumn,
        TimeRemainingColumn,
    )
    from rich.progress import (
        Progress as Bar,
    )
    from rich.text import Text

    class Rate(ProgressColumn):
        """Conditions a second, as measured of late."""

        def render(self, task: Task) -> Text:
            speed = task.finished_speed or task.speed
            return Text("" if speed is None else f"{speed:,.0f}/s")

    columns = (
        TextColumn("{task.completed:,.0f} of {task.total:,.0f} {task.description}"),
        BarColumn(),
        TaskProgressColumn(),
        Rate(),
        TimeRemainingColumn(),
        TextColumn("left"),
    )
    with Bar(*columns, console=Console(stderr=True), transient=True) as shown:
        task = None

        def progress(done: float, total: float, note: str = "") -> None:
            nonlocal task
            if task is None:
                # What was finished before says nothing of the speed now.
                task = shown.add_task(note, total=total, completed=int(done))
            shown.update(task, completed=done)

        yield progress
