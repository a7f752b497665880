"""Generated source in a private folder of the user, so that machine code is made once.

The folder is `MEANFREE_CACHE`, else `meanfree/kernels` in the user's cache folder. A file's name
is the hash of its text and of the versions that compile it; what does not match its name is
written anew.
"""

from __future__ import annotations

import hashlib
import importlib.util
import os
import stat
import sys
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import lru_cache
from pathlib import Path
from types import ModuleType

from meanfree import __file__ as package_file

Say = Callable[[str], None]
"""Takes a sentence for the user."""


def silent(sentence: str) -> None:
    """For those who do not want to hear."""


def user_cache() -> Path:
    """Where kernels are kept; the folder need not exist."""
    chosen = os.environ.get("MEANFREE_CACHE")
    if chosen:
        return Path(chosen)
    if sys.platform == "win32":
        base = os.environ.get("LOCALAPPDATA") or str(Path.home() / "AppData" / "Local")
        return Path(base) / "meanfree" / "kernels"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Caches" / "meanfree" / "kernels"
    return Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache") / "meanfree" / "kernels"


@lru_cache(maxsize=1)
def temporary_cache() -> Path:
    """A private folder for this process, where the user's cannot be used."""
    return Path(tempfile.mkdtemp(prefix="meanfree-kernels-"))


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

    digest = hashlib.sha256(versions().encode()).hexdigest()[:16]
    before, folder = config.CACHE_DIR, user_cache() / digest
    try:
        folder.mkdir(parents=True, exist_ok=True, mode=0o700)
        _insist_on_private(folder.parent)
    except OSError:
        folder = temporary_cache()
    config.CACHE_DIR = str(folder)
    try:
        yield
    finally:
        config.CACHE_DIR = before


def module_of(source: str, say: Say = silent) -> ModuleType:
    """The module with this source, imported from the cache.

    A cache that cannot be written or is damaged is said and replaced by a temporary folder.
    """
    name = file_of(source).stem
    if name in sys.modules:
        return sys.modules[name]
    folder = user_cache()
    try:
        return _imported(_written(folder, name, source), name)
    except (OSError, ImportError, SyntaxError, ValueError, EOFError, AttributeError) as error:
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


def _imported(path: Path, name: str) -> ModuleType:
    spec = importlib.util.spec_from_file_location(name, path)
    if spec is None or spec.loader is None:
        raise ImportError(f"{path} is no module")
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    try:
        spec.loader.exec_module(module)
    except BaseException:
        del sys.modules[name]
        raise
    return module
