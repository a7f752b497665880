"""Generated source in a private folder of the user, so that machine code is made once.

The folder is `MEANFREE_CACHE`, else `meanfree/kernels` in the user's cache folder. A file's name
is the hash of its text and of the versions that compile it; what does not match its name is
written anew.
"""

from __future__ import annotations

import atexit
import hashlib
import importlib.util
import os
import shutil
import stat
import sys
import tempfile
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import lru_cache
from importlib.machinery import SourceFileLoader
from pathlib import Path
from types import CodeType, ModuleType
from typing import Any

from meanfree import __file__ as package_file

_ONE_AT_A_TIME = threading.RLock()
"""Numba's settings and the modules belong to the whole process."""

Say = Callable[[str], None]
"""Takes a sentence for the user."""


def silent(sentence: str) -> None:
    """For those who do not want to hear."""


def user_cache() -> Path:
    """Where kernels are kept; the folder need not exist."""
    chosen = os.environ.get("MEANFREE_CACHE")
    if chosen:
        return Path(chosen)
    try:
        return _usual_cache() / "meanfree" / "kernels"
    except RuntimeError:  # an account without a home, as in some containers
        return temporary_cache()


def _usual_cache() -> Path:
    if sys.platform == "win32":
        base = os.environ.get("LOCALAPPDATA")
        return Path(base) if base else Path.home() / "AppData" / "Local"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Caches"
    base = os.environ.get("XDG_CACHE_HOME")
    # The specification of that variable: a relative path is to be ignored.
    return Path(base) if base and Path(base).is_absolute() else Path.home() / ".cache"


@lru_cache(maxsize=1)
def temporary_cache() -> Path:
    """A private folder where the user's cannot be used; it goes when this process ends."""
    folder = Path(tempfile.mkdtemp(prefix="meanfree-kernels-"))
    atexit.register(shutil.rmtree, folder, ignore_errors=True)
    # Processes started from here share it, and leave none of their own behind.
    os.environ["MEANFREE_CACHE"] = str(folder)
    return folder


@lru_cache(maxsize=1)
def versions() -> str:
    """What machine code depends on besides the text it is made from."""
    import llvmlite
    import numba
    import numpy
    from llvmlite import binding

    own = hashlib.sha256()
    for file in sorted((Path(package_file).parent / "kernel").glob("*.py")):
        own.update(file.read_bytes())
    parts = (
        sys.version, numba.__version__, llvmlite.__version__, numpy.__version__,
        binding.get_host_cpu_name(), binding.get_host_cpu_features().flatten(), own.hexdigest(),
    )  # fmt: skip
    return "\n".join(parts)


@contextmanager
def machine_code_in_user_cache() -> Iterator[None]:
    """While this lasts, functions that numba decorates keep their machine code in the user's cache.

    numba itself would keep it beside the source and take no notice when a function that another
    one calls has changed; here the folder's name holds the hash of all of them.
    """
    from numba import config
    from numba.core import ccallback, dispatcher

    from meanfree.kernel.kept_code import KeptCode

    holders: tuple[Any, ...] = (dispatcher, ccallback)
    with _ONE_AT_A_TIME:
        folder_before, caches_before = config.CACHE_DIR, [h.FunctionCache for h in holders]
        config.CACHE_DIR = str(_code_folder())
        for holder in holders:
            holder.FunctionCache = KeptCode
        try:
            yield
        finally:
            config.CACHE_DIR = folder_before
            for holder, cache in zip(holders, caches_before, strict=True):
                holder.FunctionCache = cache


def _code_folder() -> Path:
    """A folder for machine code that can be written: the user's, else a temporary one."""
    digest = hashlib.sha256(versions().encode()).hexdigest()[:16]
    folder = user_cache() / digest
    try:
        folder.mkdir(parents=True, exist_ok=True, mode=0o700)
        _insist_on_private(folder.parent)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except OSError:
        return temporary_cache()


def module_of(source: str, say: Say = silent) -> ModuleType:
    """The module with this source, imported from the cache.

    A cache that cannot be written or is damaged is said and replaced by a temporary folder.
    """
    with _ONE_AT_A_TIME:
        name = file_of(source).stem
        if name in sys.modules:
            return sys.modules[name]
        folder = user_cache()
        try:
            return _imported(_written(folder, name, source), name)
        except (OSError, ImportError, SyntaxError, ValueError, AttributeError) as error:
            say(f"kernels are compiled into a temporary folder: {folder} cannot be used ({error})")
        return _imported(_written(temporary_cache(), name, source), name)


def file_of(source: str) -> Path:
    """Where the module with this source lies, once it has been written."""
    digest = hashlib.sha256(f"{versions()}\n{source}".encode()).hexdigest()[:32]
    return user_cache() / f"meanfree_kernel_{digest}.py"


def _written(folder: Path, name: str, source: str) -> Path:
    """The file with this source; written aside and renamed, so that no one reads half of it."""
    folder.mkdir(parents=True, exist_ok=True, mode=0o700)
    _insist_on_private(folder)
    path = folder / f"{name}.py"
    if path.is_file() and path.read_bytes() == source.encode():
        return path
    handle, aside = tempfile.mkstemp(dir=folder, prefix=f".{name}-")
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(source.encode())
        Path(aside).replace(path)
    except BaseException:
        Path(aside).unlink(missing_ok=True)
        raise
    return path


def _insist_on_private(folder: Path) -> None:
    """What is imported is run: nobody else may write here."""
    if os.name != "posix":
        return
    status = folder.stat()
    if status.st_uid != os.getuid():
        raise PermissionError(f"{folder} belongs to another user")
    if stat.S_IMODE(status.st_mode) != 0o700:
        folder.chmod(0o700)


class _Plainly(SourceFileLoader):
    """Reads the source each time: Python's own compiled copies are trusted unseen."""

    def get_code(self, fullname: str) -> CodeType:
        path = self.get_filename(fullname)
        code: CodeType = self.source_to_code(self.get_data(path), path)
        return code


def _imported(path: Path, name: str) -> ModuleType:
    spec = importlib.util.spec_from_loader(name, _Plainly(name, str(path)))
    if spec is None or spec.loader is None:
        raise ImportError(f"{path} is no module")
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    try:
        with machine_code_in_user_cache():
            spec.loader.exec_module(module)
    except BaseException:
        del sys.modules[name]
        raise
    return module
