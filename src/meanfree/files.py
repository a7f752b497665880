"""Results that appear whole or not at all.

A folder is written aside, under a lock, on the same file system, and renamed into
place; what stood there before is kept until the new one stands. A crash at any
moment leaves the old results or the new ones, and the next writer tidies up.
"""

from __future__ import annotations

import errno
import json
import os
import shutil
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from meanfree.errors import ComputationError, InputError
from meanfree.locks import aside_of, working_aside

MANIFEST = "manifest.json"
OWNER_KEY = "case_file"
FILES_KEY = "files"

# Written by file browsers, not by people: no reason to hold results back.
_LITTER = frozenset({".DS_Store", "Thumbs.db", "desktop.ini"})
_FULL = frozenset({errno.ENOSPC, errno.EDQUOT, errno.EFBIG})
_BAD_PLACE = {
    errno.EACCES: "a place that this account may not write to",
    errno.EPERM: "a place that this account may not write to",
    errno.EROFS: "a file system that is read-only",
    errno.ENOTDIR: "a file where a folder should be",
    errno.EEXIST: "a file where a folder should be",
    errno.ENAMETOOLONG: "a name that is too long for the file system",
    errno.ELOOP: "links that lead in a circle",
    errno.EBUSY: "a folder that the system holds in place (a mount point)",
    errno.EXDEV: "a folder that lies on another file system than its parent",
}


def owner_of(folder: Path) -> str | None:
    """Whose results ``folder`` holds, as its manifest says; None where it holds none of ours."""
    manifest = _manifest(folder)
    owner = manifest.get(OWNER_KEY) if manifest is not None else None
    return owner if isinstance(owner, str) else None


def refuse_if_taken(target: Path, *, owner: str, replace: bool) -> None:
    """Raise `InputError` if ``target`` cannot become the results of ``owner``.

    To be asked before a long computation; `fresh_folder` asks again before it writes.
    Writes nothing itself. A folder without our manifest is never given up, ``replace``
    or not; an empty one is free.
    """
    target = _real(target)
    with errors_in_words(target):
        here = Path.cwd()
        if target == here or target in here.parents:
            raise InputError.at(
                "--out",
                f"{target}, which holds the folder the command runs in",
                "a folder inside it, or beside it",
            )
        if not target.exists():
            _refuse_unwritable(target)
        elif not target.is_dir():
            raise InputError.at(
                "--out", f"the file {target}", "a folder, or a name that is still free"
            )
        else:
            if not _is_empty(target):
                _refuse_foreign(target, owner, replace)
            _refuse_unwritable(target)


@contextmanager
def fresh_folder(
    target: Path, *, owner: str, replace: bool = False, patience_s: float = 60.0
) -> Iterator[Path]:
    """A new, empty folder to write to, which becomes ``target`` when the block ends well.

    The block must leave a `MANIFEST` whose `OWNER_KEY` is ``owner``; the list of the
    files written is added to it under `FILES_KEY`. If the block raises, ``target``
    stays as it was and nothing is left. Results of the same owner are replaced;
    those of another, or files that we did not write, need ``replace``.

    Raises `InputError` for a place that cannot be used, `ComputationError` for a full disk
    or when another process is still writing there after ``patience_s`` [s].
    """
    target = _real(target)
    with errors_in_words(target):
        _refuse_before_anything_is_made(target, owner, replace)
        with _parents_of(target), working_aside(target, patience_s) as aside:
            _recover(target, aside)
            refuse_if_taken(target, owner=owner, replace=replace)
            new = aside / "new"
            new.mkdir()
            try:
                yield new
                _seal(new, owner)
                # Writing took its time: somebody may have put something of his own there.
                refuse_if_taken(target, owner=owner, replace=replace)
                _swap(target, aside)
            finally:
                _recover(target, aside)


def _refuse_before_anything_is_made(target: Path, owner: str, replace: bool) -> None:
    """As `refuse_if_taken`, without the lock: who is caught between two renames looks again.

    Where a writer is at work, or died, the lock comes first.
    """
    for pause in (0.01, 0.05, 0.0):
        if aside_of(target).exists():
            return
        try:
            refuse_if_taken(target, owner=owner, replace=replace)
        except (InputError, OSError):
            if not pause:
                raise
            time.sleep(pause)
        else:
            return


def write_text_atomically(
    path: Path, text: str, *, patience_s: float = 60.0, key: str = "--out"
) -> None:
    """Write ``text`` (UTF-8, line feeds as given) so that ``path`` is never half-written.

    Makes missing parent folders. Raises as `fresh_folder` does, naming ``key`` as where the
    path was given.
    """
    path = _real(path)
    with errors_in_words(path, key):
        if path.is_dir():
            raise InputError.at(key, f"the folder {path}", "the name of a file")
        with _parents_of(path), working_aside(path, patience_s) as aside:
            new = aside / "new"
            try:
                new.write_text(text, encoding="utf-8", newline="")
                _flush(new)
                new.replace(path)
            finally:
                new.unlink(missing_ok=True)
            _flush(path.parent)


def _real(path: Path) -> Path:
    # Links are followed, so that a rename replaces the folder and not the link to it.
    return Path(os.path.realpath(path))


def _manifest(folder: Path) -> dict[str, object] | None:
    try:
        content = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return None
    return content if isinstance(content, dict) else None


def _is_empty(folder: Path) -> bool:
    with os.scandir(folder) as entries:
        return not any(entry.name not in _LITTER for entry in entries)


def _refuse_unwritable(target: Path) -> None:
    nearest = next(parent for parent in target.parents if parent.exists())
    if not nearest.is_dir():
        raise InputError.at("--out", f"the file {nearest}", "a folder to put the results in")
    if not os.access(nearest, os.W_OK | os.X_OK):
        kind = errno.EROFS if _is_read_only(nearest) else errno.EACCES
        raise InputError.at(
            "--out", f"{nearest}, {_BAD_PLACE[kind]}", "a folder that can be written"
        )


def _is_read_only(folder: Path) -> bool:
    return hasattr(os, "statvfs") and bool(os.statvfs(folder).f_flag & os.ST_RDONLY)


def _refuse_foreign(target: Path, owner: str, replace: bool) -> None:
    held_by = owner_of(target)
    if held_by is None:
        raise InputError.at(
            "--out",
            f"{target}, a folder that holds something other than our results",
            f"an empty folder, one that holds results (its {MANIFEST} says so), or a free name",
        )
    if replace:
        return
    if held_by != owner:
        raise InputError.at(
            "--out",
            f"{target}, which holds the results of {held_by}, not of {owner}",
            "--replace to give those up, or another folder named with --out",
        )
    strangers = _strangers(target)
    if strangers:
        shown = ", ".join(strangers[:5]) + (", …" if len(strangers) > 5 else "")
        raise InputError.at(
            "--out",
            f"{target}, which also holds what meanfree did not write: {shown}",
            "those files moved elsewhere, --replace to give them up, or another --out",
        )


def _files_in(folder: Path) -> list[str]:
    return sorted(
        path.relative_to(folder).as_posix() for path in folder.rglob("*") if not path.is_dir()
    )


def _strangers(folder: Path) -> list[str]:
    listed = (_manifest(folder) or {}).get(FILES_KEY)
    if not isinstance(listed, list):
        return []
    known = {name for name in listed if isinstance(name, str)}
    return [
        name for name in _files_in(folder) if name not in known and Path(name).name not in _LITTER
    ]


def _seal(new: Path, owner: str) -> None:
    """List the files in the manifest and bring everything to the disk; then it is whole."""
    if owner_of(new) != owner:
        raise RuntimeError(f"the results need a {MANIFEST} whose {OWNER_KEY} is {owner!r}")
    manifest = dict(_manifest(new) or {})
    manifest[FILES_KEY] = _files_in(new)
    draft = new / f".{MANIFEST}"
    draft.write_text(
        json.dumps(manifest, indent=2, ensure_ascii=False) + "\n", encoding="utf-8", newline=""
    )
    for folder, _, names in os.walk(new):
        for name in names:
            _flush(Path(folder, name))
        _flush(Path(folder))
    # The list comes last: where it stands, all that it names is on the disk.
    draft.replace(new / MANIFEST)
    _flush(new)


def _is_sealed(folder: Path) -> bool:
    return FILES_KEY in (_manifest(folder) or {})


def _swap(target: Path, aside: Path) -> None:
    if target.exists():
        target.rename(aside / "old")
    (aside / "new").rename(target)
    _flush(target.parent)


def _recover(target: Path, aside: Path) -> None:
    """Finish or undo what an earlier writer, or this one, left in the middle of `_swap`."""
    new, old = aside / "new", aside / "old"
    if old.exists():
        if target.is_dir() and _is_empty(target):
            shutil.rmtree(target)
        if not target.exists():
            (new if _is_sealed(new) else old).rename(target)
        elif owner_of(target) is None:
            # Something of another's was put in the gap: `old` may be the only copy of ours.
            _discard(new)
            return
    # Renamed before it is emptied, so that what is called `old` is always whole.
    trash = aside / "trash"
    for leftover in (new, old):
        _discard(trash)
        if leftover.exists():
            leftover.rename(trash)
    _discard(trash)


def _discard(folder: Path) -> None:
    if folder.exists():
        shutil.rmtree(folder)


def _flush(path: Path) -> None:
    """Bring a file or a folder to the disk, so that a rename never outruns its contents."""
    if os.name == "nt":  # folders cannot be opened there, and files only for writing
        return
    descriptor = os.open(path, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    except OSError as error:
        if error.errno != errno.EINVAL:  # a file system that has no such call for folders
            raise
    finally:
        os.close(descriptor)


@contextmanager
def _parents_of(target: Path) -> Iterator[None]:
    """The parent folders of ``target`` exist in the block; those made here go if it fails."""
    made = [parent for parent in target.parents if not parent.exists()]
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        yield
    except BaseException:
        for parent in made:  # innermost first; stops by itself where something else lies
            with suppress(OSError):
                parent.rmdir()
        raise


@contextmanager
def errors_in_words(target: Path, key: str = "--out") -> Iterator[None]:
    """Turn what the operating system says about ``target`` into what the user can do.

    ``key`` is where the user named it. Raises `InputError` for a place that cannot be used and
    `ComputationError` for a full disk in place of the `OSError`; others pass through.
    """
    try:
        yield
    except OSError as error:
        if error.errno in _FULL:
            raise ComputationError(
                f"There is no room left for {target} ({error.strerror}). Nothing was left there "
                "and earlier results are untouched. Free some space, or name a place on "
                f"another disk with {key}."
            ) from error
        if error.errno in _BAD_PLACE and _concerns(error, target):
            found = f"{target}: {_BAD_PLACE[error.errno]}"
            expected = f"a place that can be written and replaced; name one with {key}"
            raise InputError.at(key, found, expected) from error
        raise


def _concerns(error: OSError, target: Path) -> bool:
    if not isinstance(error.filename, str | os.PathLike):
        return False
    place, aside = Path(error.filename), aside_of(target)
    return place in (target, aside, *target.parents) or aside in place.parents
