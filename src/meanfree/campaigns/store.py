"""The folder in which a sweep grows: finished parts, each whole, and what they belong to.

It lies beside the results and is held under a lock by one process at a time. A part is written
under another name, brought to the disk and renamed, so that whatever ends the process leaves
whole parts and nothing else that counts.
"""

from __future__ import annotations

import errno
import json
import os
import shutil
from collections.abc import Iterator, Mapping
from contextlib import ExitStack, contextmanager, suppress
from dataclasses import dataclass, field
from pathlib import Path

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.part import Part
from meanfree.errors import ComputationError, InputError
from meanfree.files import errors_in_words
from meanfree.locks import working_aside

IDENTITY = "sweep.json"
PARTS_FOLDER = "parts"
PATIENCE_S = 2.0

NAMES = {
    "format": "the format of the parts",
    "experiment": "the case",
    "design": "the conditions",
    "observables": "the observables",
    "part_size": "the size of a part",
    "made_by": "the versions in use",
}
"""What each line of an identity is called."""

ROOM = 1.15
"""Parts are reckoned this much larger than eight bytes a number: headers, words of endings."""

SPARE = 32 * 2**20
"""Bytes that stay free for the page, figures and tables."""

_FULL = frozenset({errno.ENOSPC, errno.EDQUOT, errno.EFBIG})


def growing_folder(target: Path) -> Path:
    """Where the parts of an unfinished sweep lie: beside its results.

    >>> growing_folder(Path("outputs/bulb/sweep")).as_posix()
    'outputs/bulb/sweep.unfinished'
    """
    return target.parent / f"{target.name}.unfinished"


def part_name(number: int) -> str:
    """The file of a part.

    >>> part_name(12)
    'part-000012.parquet'
    """
    return f"part-{number:06d}.parquet"


@dataclass
class Store:
    """The growing folder of one campaign; to be had from `opened`."""

    folder: Path
    campaign: Campaign
    finished: set[int] = field(default_factory=set)

    def path(self, number: int) -> Path:
        """The file of a part."""
        return self.folder / part_name(number)

    @property
    def missing(self) -> list[int]:
        """Parts still to be made, in order."""
        return [n for n in range(self.campaign.parts) if n not in self.finished]

    def kept(self) -> int:
        """Parts that lie in the folder now; an interruption may fall between disk and count."""
        return sum(self.path(number).exists() for number in range(self.campaign.parts))

    def keep(self, part: Part) -> None:
        """Write a part, whole. Raises `ComputationError` for a full disk; the others stay."""
        draft = self.folder / f".{part_name(part.number)}"
        try:
            with draft.open("wb") as file:
                file.write(part.content)
                file.flush()
                os.fsync(file.fileno())
            draft.replace(self.path(part.number))
            _flush(self.folder)
        except OSError as error:
            draft.unlink(missing_ok=True)
            if error.errno in _FULL:
                raise ComputationError(self._no_room(str(error.strerror))) from error
            raise
        self.finished.add(part.number)

    def give_up(self) -> None:
        """Remove the growing folder: what was in it stands in the results."""
        shutil.rmtree(self.folder)

    def refuse_if_no_room(self) -> None:
        """Raise `ComputationError` where the parts to come cannot fit on the disk."""
        conditions = sum(b - a for a, b in map(self.campaign.span, self.missing))
        needed = conditions * bytes_for_one(self.campaign) * ROOM
        free = shutil.disk_usage(self.folder).free
        if needed and needed + SPARE > free:
            raise ComputationError(
                self._no_room(f"{_size(needed + SPARE)} are needed, {_size(free)} are free")
            )

    def _no_room(self, why: str) -> str:
        return (
            f"There is no room left in {self.folder} ({why}). {len(self.finished)} of "
            f"{self.campaign.parts} parts are kept there. Free some space and give the same "
            "command again: it goes on from there."
        )


def bytes_for_one(campaign: Campaign) -> int:
    """Bytes of one condition, not compressed: eight a number, four for how it ended."""
    return 8 * (len(campaign.columns.names) - 1) + 4


def _size(count: float) -> str:
    for unit in ("B", "kB", "MB", "GB"):
        if count < 1000:
            return f"{count:.3g} {unit}"
        count /= 1000
    return f"{count:.3g} TB"


@contextmanager
def opened(target: Path, campaign: Campaign, *, replace: bool) -> Iterator[Store]:
    """The store of a campaign whose results go to ``target``, held alone while the block runs.

    Parts of the same campaign that lie there, or in finished results, count as finished. Raises
    `InputError` where those of another one do, unless ``replace``: then they go;
    `ComputationError` where another process is at work there.
    """
    # Links are followed: the growing folder lies beside the real one, on its disk.
    target = Path(os.path.realpath(target))
    folder = growing_folder(target)
    if not replace:
        refuse_other(target, campaign)
    made = [parent for parent in folder.parents if not parent.exists()]
    try:
        with ExitStack() as held:
            with errors_in_words(folder):
                folder.parent.mkdir(parents=True, exist_ok=True)
                held.enter_context(working_aside(folder, PATIENCE_S))
                if replace:
                    if not _is_ours(folder):
                        raise _not_ours(folder)
                    shutil.rmtree(folder, ignore_errors=True)
                else:
                    refuse_other(target, campaign)
                store = _prepared(folder, target, campaign, replace)
            yield store
    finally:
        for parent in made:
            if parent.is_dir() and not any(parent.iterdir()):
                parent.rmdir()


def _prepared(folder: Path, target: Path, campaign: Campaign, replace: bool) -> Store:
    store = Store(folder, campaign)
    folder.mkdir(exist_ok=True)
    if not (folder / IDENTITY).exists():
        _identify(folder, campaign)
    for draft in folder.glob(".part-*"):
        draft.unlink()
    if not replace:
        _adopt(target / PARTS_FOLDER, store)
    for number in range(campaign.parts):
        if store.path(number).exists():
            if _belongs(store.path(number), campaign, number):
                store.finished.add(number)
            else:
                store.path(number).unlink()
    return store


def _identify(folder: Path, campaign: Campaign) -> None:
    """Say in the folder what it belongs to; where that fails, an empty folder does not stay."""
    draft = folder / f".{IDENTITY}"
    try:
        draft.write_text(json.dumps(dict(campaign.identity), indent=2) + "\n", encoding="utf-8")
        _flush(draft)
        draft.replace(folder / IDENTITY)
        _flush(folder)
    except BaseException:
        with suppress(OSError):
            draft.unlink(missing_ok=True)
            folder.rmdir()
        raise


def _adopt(finished: Path, store: Store) -> None:
    """Parts of finished results of the same campaign need not be made again."""
    for number in range(store.campaign.parts) if finished.is_dir() else ():
        source = finished / part_name(number)
        if source.exists() and not store.path(number).exists():
            linked(source, store.path(number))


def linked(source: Path, place: Path) -> None:
    """The same file in a second place: a link where the disk has such, else a copy."""
    try:
        os.link(source, place)
    except OSError:
        draft = place.with_name(f".{place.name}")
        shutil.copyfile(source, draft)
        _flush(draft)
        draft.replace(place)


def refuse_other(target: Path, campaign: Campaign) -> None:
    """Raise `InputError` where parts of another campaign lie in the way, with what differs."""
    folder = growing_folder(target)
    if not _is_ours(folder):
        raise _not_ours(folder)
    for place, state in ((folder, "an unfinished sweep"), (target, "a sweep")):
        held = identity_in(place)
        if held is None:
            continue
        differs = [
            NAMES[key] for key in campaign.identity if held.get(key) != campaign.identity[key]
        ]
        if differs:
            verb = "differs" if len(differs) == 1 and not differs[0].endswith("s") else "differ"
            raise InputError.at(
                "--out",
                f"{place}, which holds {state} that cannot be taken up: {_listed(differs)} {verb}",
                "the same case, conditions and observables as before, --replace to give those "
                "parts up and start anew, or another folder named with --out",
            )


def _not_ours(folder: Path) -> InputError:
    return InputError.at(
        "--out",
        f"{folder}, which holds something other than an unfinished sweep",
        "that folder moved elsewhere, or another folder named with --out",
    )


def _is_ours(folder: Path) -> bool:
    """True for a free place, an empty folder, or one that holds a sweep."""
    if not folder.exists():
        return True
    if not folder.is_dir():
        return False
    drafts = (f".{IDENTITY}",)
    return identity_in(folder) is not None or all(p.name in drafts for p in folder.iterdir())


def identity_in(folder: Path) -> Mapping[str, str] | None:
    """The identity of the sweep in a folder, None where there is none."""
    try:
        content = json.loads((folder / IDENTITY).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return content if isinstance(content, dict) else None


def _belongs(path: Path, campaign: Campaign, number: int) -> bool:
    """True for a whole part of this campaign."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    start, stop = campaign.span(number)
    try:
        about = pq.read_metadata(path)
    except (OSError, pa.ArrowInvalid):
        return False
    words = about.metadata or {}
    same = words.get(b"campaign") == campaign.hash.encode()
    return same and words.get(b"part") == str(number).encode() and about.num_rows == stop - start


def _listed(words: list[str]) -> str:
    return words[0] if len(words) == 1 else ", ".join(words[:-1]) + " and " + words[-1]


def _flush(path: Path) -> None:
    """Bring a file or a folder to the disk."""
    if os.name == "nt":
        return
    descriptor = os.open(path, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    except OSError as error:
        if error.errno != errno.EINVAL:
            raise
    finally:
        os.close(descriptor)
