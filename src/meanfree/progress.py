"""How long work reports how far it is: a callback, so that no room needs a screen."""

from __future__ import annotations

from typing import Protocol


class Progress(Protocol):
    """Called now and then with the work done so far and the work in all."""

    def __call__(self, done: float, total: float, note: str = "") -> None:
        """Note that ``done`` of ``total`` is done; ``note`` says what is being done."""
        ...


def silent(done: float, total: float, note: str = "") -> None:
    """The progress report of those who do not want one."""
