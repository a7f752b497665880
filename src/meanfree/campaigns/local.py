"""Parts on the cores of this machine: a process for each, started afresh, fed one part at a time.

A worker holds one end of a pipe and ends when the other is gone, however the parent ended; it
writes nothing itself. One that dies costs the part it was at.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from multiprocessing import resource_tracker
from multiprocessing.connection import Connection, wait
from multiprocessing.context import SpawnProcess
from typing import Any

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.part import Part, compute_part
from meanfree.errors import ComputationError

TRIES = 3
"""Times that a part is begun before its worker's death counts as its own fault."""


def cores() -> int:
    """Cores that this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def on_cores(campaign: Campaign, numbers: Sequence[int], workers: int) -> Iterator[Part]:
    """The parts, in the order in which they are done, ``workers`` at a time.

    With one worker, or one part, the work is done in this process. Raises `ComputationError` for
    a part that fails.
    """
    workers = min(workers, len(numbers))
    if workers <= 1:
        for number in numbers:
            yield compute_part(campaign, number)
        return
    pool = [_Worker(campaign) for _ in range(workers)]
    try:
        yield from _shared_out(campaign, list(reversed(numbers)), pool)
    finally:
        for worker in pool:
            worker.end()


def _shared_out(campaign: Campaign, pending: list[int], pool: list[_Worker]) -> Iterator[Part]:
    tries: dict[int, int] = {}
    while True:
        for place, worker in enumerate(pool):
            if worker.at is None and pending:
                if worker.is_lost or not worker.process.is_alive():
                    pool[place] = worker = _again(campaign, worker)
                worker.begin(pending.pop())
        busy = [worker for worker in pool if worker.at is not None]
        if not busy:
            return
        ready = wait([w.pipe for w in busy] + [w.process.sentinel for w in busy])
        for worker in busy:
            if worker.pipe not in ready and worker.process.sentinel not in ready:
                continue
            number = worker.at
            assert number is not None
            worker.at = None
            answer = worker.answer()
            if isinstance(answer, Part):
                yield answer
            elif answer is not None:
                raise ComputationError(f"Part {number} failed: {answer}")
            else:
                # Its pipe may close some time before the process has ended.
                worker.is_lost = True
                tries[number] = tries.get(number, 0) + 1
                if tries[number] >= TRIES:
                    raise ComputationError(
                        f"Workers died {TRIES} times at part {number}. Perhaps there is not "
                        "enough memory: try fewer with --workers."
                    )
                pending.append(number)


def _again(campaign: Campaign, worker: _Worker) -> _Worker:
    worker.end()
    return _Worker(campaign)


class _Worker:
    """One process and this end of its pipe; ``at`` is the part it is at."""

    def __init__(self, campaign: Campaign) -> None:
        context = multiprocessing.get_context("spawn")
        self.pipe, theirs = context.Pipe()
        self.process: SpawnProcess = context.Process(
            target=_work, args=(theirs,), daemon=True, name="meanfree sweep"
        )
        with _ctrl_c_later():
            self.process.start()
        # Closed here, so that this end sees when the worker is gone.
        theirs.close()
        self.at: int | None = None
        self.campaign = campaign
        self.is_lost = False

    def begin(self, number: int) -> None:
        self.at = number
        with suppress(OSError):  # already gone: its sentinel will say so
            self.pipe.send((self.campaign.for_part(number), number))

    def answer(self) -> Any:
        """A part, an error in words, or None where the worker is gone."""
        try:
            return self.pipe.recv() if self.pipe.poll() else None
        except (EOFError, OSError):
            return None

    def end(self) -> None:
        self.pipe.close()
        if self.process.is_alive():
            self.process.terminate()
        self.process.join()
        self.process.close()


@contextmanager
def _ctrl_c_later() -> Iterator[None]:
    """Ctrl-C waits for the end of the block; what is begun there never sees it.

    Else a process that is still importing would answer with a traceback of its own.
    """
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    # It is started with the first worker, and lets Ctrl-C through again when that is done.
    resource_tracker.ensure_running()
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


@dataclass(frozen=True)
class _Failure:
    """An error in words, from another process."""

    text: str

    def __str__(self) -> str:
        return self.text


def _work(pipe: Connection) -> None:
    """What a worker does until the other end of its pipe is gone."""
    # Ctrl-C reaches every process of the terminal; the parent decides.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        while True:
            campaign, number = pipe.recv()
            pipe.send(_tried(campaign, number))
    except (EOFError, OSError):
        return


def _tried(campaign: Campaign, number: int) -> Part | _Failure:
    try:
        return compute_part(campaign, number)
    except MemoryError:
        return _Failure("there is not enough memory; try fewer with --workers")
    except Exception as error:  # noqa: BLE001 -- told in words by the other process
        return _Failure(f"{type(error).__name__}: {error}" if str(error) else type(error).__name__)
