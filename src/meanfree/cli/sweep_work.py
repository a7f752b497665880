"""What `sweep` is asked, held against a case, carried out, and told."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.digest import digest_of
from meanfree.campaigns.local import cores, on_cores
from meanfree.campaigns.reading import arrow_parts
from meanfree.campaigns.store import Store, opened
from meanfree.campaigns.sweeping import Engine, fill
from meanfree.case.sweeps import campaign_of
from meanfree.cli._common import open_case, record_of, results_folder
from meanfree.cli.documents import told
from meanfree.cli.sweep_progress import bar
from meanfree.errors import InputError, Problem
from meanfree.files import refuse_if_taken
from meanfree.report.folder import owner_name
from meanfree.report.sweep.document import SweepResult, sweep_document, write_sweep

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.report.document import Document

FEW = 8192
"""Conditions below which further processes take longer to start than they save. Measured."""

_RANGE = re.compile(r"\s*([^=]+?)\s*=\s*(.+?)\s*\.\.\s*([^;]+?)\s*(?:;(.*))?")


@dataclass(frozen=True)
class Asked:
    """The options of `sweep` as they were typed."""

    design: str | None
    vary: tuple[str, ...]
    observe: tuple[str, ...]
    samples: int | None
    seed: int | None
    engine: Literal["local", "dask"]
    scheduler: str | None
    workers: int | None

    @property
    def arguments(self) -> list[str]:
        """The options that decide the results, again."""
        words: list[str] = []
        for name, value in (
            ("--design", self.design),
            ("--samples", self.samples),
            ("--seed", self.seed),
        ):
            words += [] if value is None else [name, str(value)]
        for name, values in (("--vary", self.vary), ("--observe", self.observe)):
            for value in values:
                words += [name, value]
        return words

    @property
    def instead(self) -> dict[str, Any]:
        """Keys of ``[sweep]`` in place of those of the case. Raises `InputError`."""
        found: dict[str, Any] = {}
        for name in ("design", "samples", "seed"):
            if getattr(self, name) is not None:
                found[name] = getattr(self, name)
        if self.observe:
            found["observables"] = list(self.observe)
        if self.vary:
            found["vary"] = _varied(self.vary)
            if self.design != "list":
                found["file"] = None
        return found


def _varied(texts: Sequence[str]) -> dict[str, dict[str, Any]]:
    found: dict[str, dict[str, Any]] = {}
    problems = []
    expected = "ADDRESS=LOW..HIGH, such as temperature.value='400 K..600 K', perhaps ';11;log'"
    for text in texts:
        match = _RANGE.fullmatch(text)
        if match is None:
            problems.append(Problem("--vary", f'"{text}"', expected))
            continue
        entry: dict[str, Any] = {"between": [match[2], match[3]]}
        for word in (w.strip() for w in (match[4] or "").split(";")):
            if word.isascii() and word.isdigit():
                entry["points"] = int(word)
            elif word in ("log", "linear"):
                entry["spacing"] = word
            elif word:
                problems.append(Problem("--vary", f'"{word}" in "{text}"', expected))
        if match[1] in found:
            problems.append(Problem("--vary", f"{match[1]} a second time", "each address once"))
        found[match[1]] = entry
    if problems:
        raise InputError(problems)
    return found


def carried_out(
    asked: Asked,
    path: Path,
    settings: list[str] | None,
    *,
    out: Path | None,
    replace: bool,
    as_json: bool,
    quiet: bool,
) -> str:
    """Run the sweep of a case, leave its folder, and return what to print."""
    case = open_case(path, settings)
    campaign = campaign_of(case, {k: v for k, v in asked.instead.items() if v is not None})
    folder = results_folder(case, "sweep", out)
    owner = owner_name(case.path, folder)
    refuse_if_taken(folder, owner=owner, replace=replace)
    with opened(folder, campaign, replace=replace) as store:
        with _told_where_it_stopped(store), bar() as progress:
            fill(store, _engine(asked, store), progress)
        document, paths = _left(
            case, campaign, store, asked.arguments, folder, owner=owner, replace=replace
        )
        store.give_up()
    if as_json:
        return document.summary.rstrip()
    if quiet:
        return "\n".join(str(written) for written in paths)
    return told(document, folder)


def _left(
    case: LoadedCase,
    campaign: Campaign,
    store: Store,
    arguments: list[str],
    folder: Path,
    *,
    owner: str,
    replace: bool,
) -> tuple[Document, list[Path]]:
    """The document of a finished sweep, and what was written."""
    record = record_of(case)
    files = [store.path(number) for number in range(campaign.parts)]
    result = SweepResult(campaign, digest_of(campaign, arrow_parts(files)))
    document = sweep_document(result, record, arguments)
    paths = write_sweep(document, store, record, folder, owner=owner, replace=replace)
    return document, paths


def _engine(asked: Asked, store: Store) -> Engine:
    if asked.engine == "dask":
        from meanfree.campaigns.cluster import on_cluster

        assert asked.scheduler is not None
        return partial(on_cluster, scheduler=asked.scheduler)
    workers = asked.workers
    if workers is None:
        conditions = len(store.missing) * store.campaign.part_size
        workers = 1 if conditions < FEW else cores()
    return partial(on_cores, workers=workers)


@contextmanager
def _told_where_it_stopped(store: Store) -> Iterator[None]:
    """Whoever interrupts a sweep is told what is kept."""
    try:
        yield
    except KeyboardInterrupt:
        print(  # noqa: T201
            f"{store.kept()} of {store.campaign.parts} parts are kept in {store.folder}. "
            "The same command goes on from there.",
            file=sys.stderr,
        )
        raise
