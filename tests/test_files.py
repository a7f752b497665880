"""Results appear whole or not at all, whatever happens in between."""

from __future__ import annotations

import json
import os
import random
import resource
import shutil
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
import results_writer
from results_writer import number_in, write

from meanfree import files, locks
from meanfree.errors import ComputationError, InputError
from meanfree.files import fresh_folder, owner_of, refuse_if_taken, write_text_atomically
from meanfree.locks import aside_of, working_aside


def child(target: Path, owner: str, first: int, times: int) -> subprocess.Popen[str]:
    """Another process that writes results to ``target``, one number after another."""
    return subprocess.Popen(
        [sys.executable, results_writer.__file__, str(target), owner, str(first), str(times)],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def names(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.iterdir())


# --- the good way ---------------------------------------------------------------------------


def test_parents_are_made_and_nothing_else_is_left(tmp_path: Path) -> None:
    target = tmp_path / "outputs" / "nocl bulb, Übung № 3" / "run"
    write(target, "a.toml", 7)
    assert number_in(target) == 7
    assert owner_of(target) == "a.toml"
    assert names(target.parent) == ["run"]


def test_the_manifest_lists_the_files(tmp_path: Path) -> None:
    with fresh_folder(tmp_path / "run", owner="a") as folder:
        (folder / "parts").mkdir()
        (folder / "parts" / "0.csv").write_text("x")
        (folder / "manifest.json").write_text('{"case_file": "a", "versions": {"numpy": "2"}}')
    manifest = json.loads((tmp_path / "run" / "manifest.json").read_text())
    assert manifest == {
        "case_file": "a",
        "versions": {"numpy": "2"},
        "files": ["manifest.json", "parts/0.csv"],
    }


def test_nothing_shows_before_the_end(tmp_path: Path) -> None:
    with fresh_folder(tmp_path / "run", owner="a") as folder:
        (folder / "manifest.json").write_text('{"case_file": "a"}')
        assert not (tmp_path / "run").exists()
        assert folder.stat().st_dev == tmp_path.stat().st_dev
    assert (tmp_path / "run").is_dir()


def test_the_same_case_replaces_its_own(tmp_path: Path) -> None:
    write(tmp_path / "run", "a", 1)
    write(tmp_path / "run", "a", 2)
    assert number_in(tmp_path / "run") == 2
    assert names(tmp_path) == ["run"]


def test_an_empty_folder_is_free(tmp_path: Path) -> None:
    (tmp_path / "run").mkdir()
    (tmp_path / "run" / ".DS_Store").touch()
    write(tmp_path / "run", "a", 1)
    assert number_in(tmp_path / "run") == 1


def test_a_link_to_a_folder_stays_a_link(tmp_path: Path) -> None:
    (tmp_path / "disk").mkdir()
    (tmp_path / "run").symlink_to(tmp_path / "disk")
    write(tmp_path / "run", "a", 1)
    assert (tmp_path / "run").is_symlink()
    assert number_in(tmp_path / "disk") == 1


# --- what is refused ------------------------------------------------------------------------


def refused(target: Path, owner: str = "a", *, replace: bool = False) -> str:
    """The whole message with which ``target`` is refused, the same before and while writing."""
    with pytest.raises(InputError) as before:
        refuse_if_taken(target, owner=owner, replace=replace)
    with pytest.raises(InputError) as writing:
        write(target, owner, 0, replace=replace)
    assert str(before.value) == str(writing.value)
    assert before.value.exit_status == 2
    return str(before.value)


def test_another_case_needs_replace(tmp_path: Path) -> None:
    target = tmp_path / "run"
    write(target, "a.toml", 1)
    assert refused(target, "b.toml") == (
        f"--out: found {target}, which holds the results of a.toml, not of b.toml; "
        "expected --replace to give those up, or another folder named with --out"
    )
    assert number_in(target) == 1
    write(target, "b.toml", 2, replace=True)
    assert number_in(target) == 2
    assert owner_of(target) == "b.toml"


def test_files_of_the_user_need_replace(tmp_path: Path) -> None:
    target = tmp_path / "run"
    write(target, "a", 1)
    (target / "notes.txt").write_text("mine")
    assert refused(target) == (
        f"--out: found {target}, which also holds what meanfree did not write: notes.txt; "
        "expected those files moved elsewhere, --replace to give them up, or another --out"
    )
    assert (target / "notes.txt").read_text() == "mine"
    write(target, "a", 2, replace=True)
    assert number_in(target) == 2


@pytest.mark.parametrize("replace", [False, True])
@pytest.mark.parametrize("manifest", [None, "not json", "[1]", '{"case_file": 3}', "[" * 100_000])
def test_what_is_not_ours_is_never_touched(
    tmp_path: Path, replace: bool, manifest: str | None
) -> None:
    target = tmp_path / "run"
    target.mkdir()
    (target / "thesis.tex").write_text("years of work")
    if manifest is not None:
        (target / "manifest.json").write_text(manifest)
    before = names(target)
    assert refused(target, replace=replace) == (
        f"--out: found {target}, a folder that holds something other than our results; expected "
        "an empty folder, one that holds results (its manifest.json says so), or a free name"
    )
    assert names(target) == before
    assert names(tmp_path) == ["run"]


@pytest.mark.parametrize("replace", [False, True])
def test_a_file_in_the_place_of_the_folder(tmp_path: Path, replace: bool) -> None:
    (tmp_path / "run").write_text("mine")
    assert refused(tmp_path / "run", replace=replace) == (
        f"--out: found the file {tmp_path / 'run'}; expected a folder, or a name that is still free"
    )
    assert (tmp_path / "run").read_text() == "mine"


def test_a_file_in_the_place_of_a_parent(tmp_path: Path) -> None:
    (tmp_path / "outputs").write_text("mine")
    message = refused(tmp_path / "outputs" / "case" / "run")
    assert message == (
        f"--out: found the file {tmp_path / 'outputs'}; expected a folder to put the results in"
    )


def test_the_folder_one_stands_in(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    for target in (Path(), tmp_path):
        assert refused(target) == (
            f"--out: found {target.resolve()}, which holds the folder the command runs in; "
            "expected a folder inside it, or beside it"
        )


def test_a_name_too_long(tmp_path: Path) -> None:
    target = tmp_path / ("x" * 250)  # fits by itself, but not with what the hidden name adds
    with pytest.raises(InputError, match=r"a name that is too long for the file system"):
        write(target, "a", 1)
    assert names(tmp_path) == []


@pytest.mark.skipif(not Path("/sys/kernel").is_dir(), reason="needs the kernel's own tree")
def test_a_place_the_system_does_not_let_us_write() -> None:
    # That tree refuses new folders even to root: not permitted, or read-only in a container.
    with pytest.raises(InputError) as caught:
        write(Path("/sys/results/run"), "a", 1)
    message = str(caught.value)
    assert message.startswith("--out: found /sys")
    assert "may not write to; expected" in message or "is read-only; expected" in message


# --- failures while writing -----------------------------------------------------------------


def test_an_error_in_the_block_leaves_everything_as_it_was(tmp_path: Path) -> None:
    target = tmp_path / "deep" / "run"
    with (
        pytest.raises(ZeroDivisionError),
        fresh_folder(target, owner="a") as folder,
    ):
        (folder / "half.csv").write_text("half")
        raise ZeroDivisionError
    assert names(tmp_path) == []
    write(target, "a", 1)
    with pytest.raises(KeyboardInterrupt), fresh_folder(target, owner="a"):
        raise KeyboardInterrupt
    assert number_in(target) == 1
    assert names(target.parent) == ["run"]


@pytest.mark.parametrize("kind", ["file", "folder"])
@pytest.mark.parametrize("replace", [False, True])
def test_what_is_put_there_meanwhile_is_left_alone(
    tmp_path: Path, kind: str, replace: bool
) -> None:
    """Checked before the writing, which takes a while, and once more after it."""
    target = tmp_path / "run"
    write(target, "a", 1)
    with (
        pytest.raises(InputError, match=r"^--out: found "),
        fresh_folder(target, owner="a", replace=replace) as folder,
    ):
        (folder / "manifest.json").write_text('{"case_file": "a"}')
        shutil.rmtree(target)
        if kind == "file":
            target.write_text("mine")
        else:
            target.mkdir()
            (target / "notes.txt").write_text("mine")
    mine = target if kind == "file" else target / "notes.txt"
    assert mine.read_text() == "mine"
    assert names(tmp_path) == ["run"]


def test_other_errors_of_the_system_pass_through(tmp_path: Path) -> None:
    with pytest.raises(FileNotFoundError), fresh_folder(tmp_path / "run", owner="a"):
        (tmp_path / "data.csv").read_text()
    assert names(tmp_path) == []


def test_a_caller_that_forgets_the_manifest_is_told(tmp_path: Path) -> None:
    with (
        pytest.raises(RuntimeError, match=r"^the results need a manifest.json whose case_file"),
        fresh_folder(tmp_path / "run", owner="a") as folder,
    ):
        (folder / "x.csv").write_text("x")
    assert names(tmp_path) == []


@pytest.fixture
def small_files_only() -> Iterator[None]:
    """No file may grow beyond 4 kB: to a program, the same as a disk that is full."""
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (4096, hard))
    yield
    resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))


@pytest.mark.usefixtures("small_files_only")
def test_a_full_disk_while_a_folder_is_written(tmp_path: Path) -> None:
    target = tmp_path / "run"
    write(target, "a", 1)
    with (
        pytest.raises(ComputationError) as caught,
        fresh_folder(target, owner="a") as folder,
    ):
        (folder / "profiles.csv").write_text("0" * 10_000)
    assert caught.value.exit_status == 1
    assert str(caught.value) == (
        f"There is no room left for {target} (File too large). Nothing was left there and "
        "earlier results are untouched. Free some space, or name a place on another disk "
        "with --out."
    )
    assert number_in(target) == 1
    assert names(tmp_path) == ["run"]


@pytest.mark.usefixtures("small_files_only")
def test_a_full_disk_while_a_file_is_written(tmp_path: Path) -> None:
    path = tmp_path / "new" / "schema.json"
    with pytest.raises(ComputationError, match="There is no room left for"):
        write_text_atomically(path, "0" * 10_000)
    assert names(tmp_path) == []


# --- crashes in the middle of the swap ------------------------------------------------------


class PowerCutError(BaseException):
    """Stands for the moment a process stops: nothing after it may run."""


def crash_at(step: int, monkeypatch: pytest.MonkeyPatch, target: Path) -> bool:
    """Run a second write that dies at its ``step``-th rename; False if it has fewer."""
    count = 0
    rename: Callable[[Path, Path], Path] = Path.rename

    def counted(self: Path, to: Path) -> Path:
        nonlocal count
        count += 1
        if count == step:
            # A dead process does not tidy up: what follows is taken away, too.
            monkeypatch.setattr(files, "_recover", lambda *_: None)
            raise PowerCutError
        return rename(self, to)

    with monkeypatch.context() as patched:
        patched.setattr(Path, "rename", counted)
        try:
            write(target, "a", 2)
        except PowerCutError:
            return True
    return False


@pytest.mark.parametrize("step", [1, 2, 3])
def test_a_crash_at_each_rename_loses_nothing(tmp_path: Path, step: int) -> None:
    target = tmp_path / "run"
    write(target, "a", 1)
    with pytest.MonkeyPatch.context() as monkeypatch:
        assert crash_at(step, monkeypatch, target)
    # The next writer is another case: it meets whole results of the first and is refused.
    with pytest.raises(InputError, match="which holds the results of a, not of b"):
        write(target, "b", 3)
    assert number_in(target) == {1: 1, 2: 2, 3: 2}[step]
    assert names(tmp_path) == ["run"]


def test_old_results_are_kept_where_something_else_came_in_between(tmp_path: Path) -> None:
    target = tmp_path / "run"
    write(target, "a", 1)
    with pytest.MonkeyPatch.context() as monkeypatch:
        assert crash_at(2, monkeypatch, target)
    target.mkdir()
    (target / "notes.txt").write_text("mine")
    with pytest.raises(InputError, match="something other than our results"):
        write(target, "a", 3)
    (target / "notes.txt").unlink()
    with pytest.raises(InputError, match="which holds the results of a, not of b"):
        write(target, "b", 4)
    assert number_in(target) == 1
    assert names(tmp_path) == ["run"]


def test_kill_9_at_random_moments(tmp_path: Path) -> None:
    target, random_times = tmp_path / "run", random.Random(20260101)
    write(target, "a", 0)
    last = 0
    for turn in range(1, 7):
        process = child(target, "a", 1000 * turn, 1000)
        assert process.stdout is not None
        assert int(process.stdout.readline()) == 1000 * turn  # it is up and writing
        time.sleep(random_times.uniform(0.0, 0.03))
        process.kill()
        printed, _ = process.communicate()
        reported = int(printed.split()[-1]) if printed else 1000 * turn
        # Another case is refused, and that alone must bring whole results back into place.
        with pytest.raises(InputError, match="which holds the results of a, not of b"):
            write(target, "b", -1)
        last = number_in(target)
        # What was reported as done is there; at most the one in work is further.
        assert last in (reported, reported + 1)
        assert names(tmp_path) == ["run"]
    write(target, "a", last + 1)
    assert number_in(target) == last + 1


# --- several at once ------------------------------------------------------------------------


def test_two_processes_of_one_case_take_turns(tmp_path: Path) -> None:
    target = tmp_path / "run"
    processes = [child(target, "a", first, 15) for first in (100, 200)]
    whole = 0
    while any(process.poll() is None for process in processes):
        # A reader holds what it opened; between two renames the name is briefly free.
        try:
            descriptor = os.open(target, os.O_RDONLY)
        except FileNotFoundError:
            continue
        os.close(descriptor)
        whole += 1
        time.sleep(0.002)
    for process in processes:
        _, complaint = process.communicate()
        assert (process.returncode, complaint) == (0, "")
    assert whole > 0
    assert number_in(target) in (114, 214)
    assert names(tmp_path) == ["run"]


def test_two_cases_at_once_one_is_refused(tmp_path: Path) -> None:
    target = tmp_path / "run"
    processes = [child(target, owner, 1, 3) for owner in ("a", "b")]
    complaints = [process.communicate()[1] for process in processes]
    assert sorted(process.returncode for process in processes) == [0, 1]
    loser = next(index for index, process in enumerate(processes) if process.returncode)
    assert "InputError: --out: found" in complaints[loser]
    assert owner_of(target) == "ab"[1 - loser]
    assert number_in(target) == 3


def test_a_lock_that_its_holder_took_away_is_no_lock(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    tries = 0

    def removed_meanwhile(descriptor: int) -> bool:
        nonlocal tries
        tries += 1
        if tries == 1:  # the holder before us lets go, and its file goes with it
            (aside_of(tmp_path / "run") / "lock").unlink()
        return True

    monkeypatch.setattr(locks, "_try_lock", removed_meanwhile)
    with working_aside(tmp_path / "run", 1.0) as aside:
        assert (aside / "lock").exists()
    assert tries == 2


def test_a_writer_that_takes_too_long_is_not_waited_for(tmp_path: Path) -> None:
    target = tmp_path / "run"
    with working_aside(target, 0.0):
        with (
            pytest.raises(ComputationError) as caught,
            fresh_folder(target, owner="a", patience_s=0.1),
        ):
            pass
        assert str(caught.value) == (
            f"Another process has been writing {target} for 0.1 s. "
            "Wait until it is done, or name another folder with --out."
        )
    assert names(tmp_path) == []


# --- single files ---------------------------------------------------------------------------


def test_a_file_is_replaced_whole(tmp_path: Path) -> None:
    path = tmp_path / "sub" / "schema.json"
    write_text_atomically(path, "α\r\nβ\n")
    assert path.read_bytes() == "α\r\nβ\n".encode()
    aside_of(path).mkdir()
    (aside_of(path) / "new").write_text("left by a process that was killed, and longer")
    write_text_atomically(path, "γ")
    assert path.read_text(encoding="utf-8") == "γ"
    assert names(path.parent) == ["schema.json"]


def test_a_file_is_not_written_over_a_folder(tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        write_text_atomically(tmp_path, "x")
    assert str(caught.value) == f"--out: found the folder {tmp_path}; expected the name of a file"
