"""A place beside a target where one process at a time may work.

The lock is the kernel's, not a file's presence: it ends with the process that
held it, however that ended, so nothing is ever stale.
"""

from __future__ import annotations

import errno
import os
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from meanfree.errors import ComputationError

# What a waiting process sleeps between two tries; short beside the writing of a folder.
_PAUSE_S = 0.02

if sys.platform == "win32":
    import msvcrt

    def _try_lock(descriptor: int) -> bool:
        try:
            msvcrt.locking(descriptor, msvcrt.LK_NBLCK, 1)
        except OSError:
            return False
        return True

else:
    import fcntl

    def _try_lock(descriptor: int) -> bool:
        try:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError as error:
            if error.errno in (errno.EWOULDBLOCK, errno.EACCES):
                return False
            if error.errno not in (errno.ENOLCK, errno.ENOTSUP, errno.EINVAL, errno.ENOSYS):
                raise
            return _try_record_lock(descriptor)
        return True

    def _try_record_lock(descriptor: int) -> bool:
        # Some network file systems know record locks only.
        try:
            fcntl.lockf(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError as error:
            if error.errno in (errno.EWOULDBLOCK, errno.EACCES):
                return False
            raise
        return True


def aside_of(target: Path) -> Path:
    """The hidden folder beside ``target`` in which its next contents are prepared.

    >>> aside_of(Path("outputs/nocl-bulb/run")).as_posix()
    'outputs/nocl-bulb/.run.meanfree'
    """
    return target.parent / f".{target.name}.meanfree"


@contextmanager
def working_aside(target: Path, patience_s: float) -> Iterator[Path]:
    """Hold the folder beside ``target`` alone; it goes when the block ends, if empty by then.

    Waits up to ``patience_s`` [s] for another process that holds it, then raises
    `ComputationError`. Operating-system errors pass through as they are.
    """
    aside = aside_of(target)
    descriptor = _acquire(aside, target, patience_s)
    try:
        yield aside
    finally:
        # Unlinked while held: whoever waits on this inode sees that it is no longer the lock.
        with suppress(OSError):
            (aside / "lock").unlink()
        with suppress(OSError):
            aside.rmdir()
        os.close(descriptor)


def _acquire(aside: Path, target: Path, patience_s: float) -> int:
    deadline = time.monotonic() + patience_s
    while True:
        descriptor = _open_lock(aside)
        if descriptor is not None:
            try:
                held = _try_lock(descriptor) and _is_still(descriptor, aside / "lock")
            except BaseException:
                os.close(descriptor)
                raise
            if held:
                return descriptor
            os.close(descriptor)
        if time.monotonic() > deadline:
            raise ComputationError(
                f"Another process has been writing {target} for {patience_s:g} s. "
                "Wait until it is done, or name another folder with --out."
            )
        time.sleep(_PAUSE_S)


def _open_lock(aside: Path) -> int | None:
    try:
        aside.mkdir(exist_ok=True)
    except FileExistsError:
        # A folder that its holder removed just then, unless something else stands there.
        if os.path.lexists(aside) and not aside.is_dir():
            raise
        return None
    try:
        return os.open(aside / "lock", os.O_RDWR | os.O_CREAT, 0o666)
    except FileNotFoundError:
        # The holder before us removed the folder between the two lines above.
        return None


def _is_still(descriptor: int, path: Path) -> bool:
    try:
        return os.path.samestat(os.fstat(descriptor), path.stat())
    except FileNotFoundError:
        return False
