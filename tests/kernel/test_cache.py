"""Generated source lies in a private folder, and a folder that cannot be used stops nothing."""

from __future__ import annotations

import os
import stat
import subprocess
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from meanfree.kernel import cache

if TYPE_CHECKING:
    from meanfree.kernel.kept_code import CodeFiles

SOURCE = '"""A module."""\n\nANSWER = 42\n'


@pytest.fixture(autouse=True)
def forget(monkeypatch: pytest.MonkeyPatch) -> None:
    before = set(sys.modules)
    yield
    for name in set(sys.modules) - before:
        if name.startswith("meanfree_kernel_"):
            del sys.modules[name]


def test_a_module_is_written_once_and_is_private(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = tmp_path / "deep" / "kernels"
    monkeypatch.setenv("MEANFREE_CACHE", str(folder))
    module = cache.module_of(SOURCE)
    assert module.ANSWER == 42
    assert stat.S_IMODE(folder.stat().st_mode) == 0o700
    files = list(folder.glob("*.py"))
    assert [file.read_text() for file in files] == [SOURCE]
    assert cache.module_of(SOURCE) is module
    cache.module_of(SOURCE.replace("42", "43"))
    assert len(list(folder.glob("*.py"))) == 2


def test_a_folder_open_to_others_is_closed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("MEANFREE_CACHE", str(tmp_path))
    tmp_path.chmod(0o777)
    cache.module_of(SOURCE)
    assert stat.S_IMODE(tmp_path.stat().st_mode) == 0o700


def test_a_damaged_file_is_written_anew(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("MEANFREE_CACHE", str(tmp_path))
    file = Path(str(cache.module_of(SOURCE).__file__))
    del sys.modules[file.stem]
    file.write_text("ANSWER = ")
    assert cache.module_of(SOURCE).ANSWER == 42
    assert file.read_text() == SOURCE


def test_an_unusable_folder_is_said_and_replaced(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A file where the folder should be: not even root can make that a folder."""
    blocked = tmp_path / "kernels"
    blocked.write_text("not a folder")
    monkeypatch.setenv("MEANFREE_CACHE", str(blocked))
    said: list[str] = []
    module = cache.module_of(SOURCE, said.append)
    assert module.ANSWER == 42
    assert len(said) == 1
    assert said[0].startswith("kernels are compiled into a temporary folder: ")
    assert str(blocked) in said[0]
    assert str(blocked) not in str(module.__file__)


def test_an_account_without_a_home(monkeypatch: pytest.MonkeyPatch) -> None:
    """As in a container with a number for a user: Python then knows no home and raises."""

    def nowhere() -> Path:
        raise RuntimeError("Could not determine home directory.")

    for name in ("MEANFREE_CACHE", "XDG_CACHE_HOME", "LOCALAPPDATA"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setattr(Path, "home", nowhere)
    monkeypatch.setenv("MEANFREE_CACHE", "")
    folder = cache.user_cache()
    assert folder == cache.temporary_cache()
    assert stat.S_IMODE(folder.stat().st_mode) == 0o700


@pytest.mark.skipif(sys.platform in ("win32", "darwin"), reason="that variable means nothing there")
def test_a_relative_cache_is_ignored(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """XDG Base Directory Specification 0.8: "If an implementation encounters a relative path in
    any of these variables it should consider the path invalid and ignore it." """
    monkeypatch.delenv("MEANFREE_CACHE", raising=False)
    monkeypatch.setattr(Path, "home", lambda: tmp_path)
    monkeypatch.setenv("XDG_CACHE_HOME", "cache")
    assert cache.user_cache() == tmp_path / ".cache" / "meanfree" / "kernels"
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "x"))
    assert cache.user_cache() == tmp_path / "x" / "meanfree" / "kernels"


def test_the_temporary_folder_goes_with_the_process(tmp_path: Path) -> None:
    """It is shared with processes started from there, which leave nothing either."""
    blocked = tmp_path / "kernels"
    blocked.write_text("not a folder")
    module = (
        "from meanfree.kernel import cache; import os, subprocess, sys\n"
        "print(cache.module_of('ANSWER = 42').__file__)\n"
        "if len(sys.argv) < 2:\n"
        "    subprocess.run([sys.executable, __file__, 'child'], check=True)\n"
    )
    (tmp_path / "parent.py").write_text(module)
    (tmp_path / "tmp").mkdir()
    printed = subprocess.run(
        [sys.executable, tmp_path / "parent.py"],
        env={**os.environ, "MEANFREE_CACHE": str(blocked), "TMPDIR": str(tmp_path / "tmp")},
        check=True, capture_output=True, text=True,
    ).stdout.split()  # fmt: skip
    assert len(set(printed)) == 1
    assert list((tmp_path / "tmp").iterdir()) == []
    assert blocked.read_text() == "not a folder"


# --- machine code ---------------------------------------------------------------------------


def code_files(folder: Path) -> CodeFiles:
    from meanfree.kernel.kept_code import CodeFiles

    return CodeFiles(folder, "lane.load-26.py311")


def test_code_comes_back_whole_or_not_at_all(tmp_path: Path) -> None:
    """Cut at every length, and changed in every byte: nothing of it is ever used."""
    files, key, data = code_files(tmp_path), ("signature", 3), (b"code", 1.5)
    assert files.load(key) is None
    files.save(key, data)
    assert files.load(key) == data
    (path,) = tmp_path.iterdir()
    whole = path.read_bytes()
    for place in range(len(whole)):
        path.write_bytes(whole[:place])
        assert files.load(key) is None
        path.write_bytes(whole[:place] + bytes([whole[place] ^ 0x10]) + whole[place + 1 :])
        assert files.load(key) is None
    path.write_bytes(b"")
    files.save(key, data)
    assert path.read_bytes() == whole
    files.flush()
    assert list(tmp_path.iterdir()) == []


def test_code_under_another_key_is_not_taken(tmp_path: Path) -> None:
    files = code_files(tmp_path)
    files.save("one", 1)
    files.path("one").rename(files.path("two"))
    assert files.load("two") is None


def test_signatures_do_not_get_in_each_others_way(tmp_path: Path) -> None:
    """Two writers that knew nothing of each other: both are found afterwards."""
    for key in ("first", "second"):
        code_files(tmp_path).save(key, key)
    assert [code_files(tmp_path).load(key) for key in ("first", "second")] == ["first", "second"]


COMPILING = """
import sys
from numba import njit
from meanfree.kernel import kept_code
from meanfree.kernel.cache import machine_code_in_user_cache

def twice(x):
    return x + x

with machine_code_in_user_cache():
    twice = njit(cache=True)(twice)
assert type(twice._cache) is kept_code.KeptCode
assert twice(21) == 42 and twice(1.5) == 3.0 and twice(2j) == 4j
print(sum(twice.stats.cache_hits.values()), sum(twice.stats.cache_misses.values()))
"""


@pytest.mark.slow
def test_many_processes_one_empty_cache(tmp_path: Path, size: str) -> None:
    """All compile the same three signatures at once; then files are damaged; all answers stay."""
    script = tmp_path / "compiling.py"
    script.write_text(COMPILING)
    folder = tmp_path / "cache"
    environment = {**os.environ, "MEANFREE_CACHE": str(folder)}

    def carried_out() -> tuple[int, int]:
        done = subprocess.run(
            [sys.executable, script], env=environment, check=True, capture_output=True, text=True
        )
        hits, misses = map(int, done.stdout.split())
        return hits, misses

    for _ in range(1 if size == "small" else 10):
        processes = [
            subprocess.Popen([sys.executable, script], env=environment, stdout=subprocess.PIPE)
            for _ in range(3 if size == "small" else 6)
        ]
        for process in processes:
            process.communicate()
            assert process.returncode == 0
        kept = list(folder.rglob("*.code"))
        assert len(kept) == 3
        assert carried_out() == (3, 0)
        kept[0].write_bytes(kept[0].read_bytes()[:1000])
        damaged = bytearray(kept[1].read_bytes())
        damaged[len(damaged) // 2] ^= 1
        kept[1].write_bytes(damaged)
        assert carried_out() == (1, 2)
        assert carried_out() == (3, 0)
        for path in kept:
            path.unlink()
