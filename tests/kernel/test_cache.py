"""Generated source lies in a private folder, and a folder that cannot be used stops nothing."""

from __future__ import annotations

import stat
import sys
from pathlib import Path

import pytest

from meanfree.kernel import cache

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
