"""Machine code on disk that is used only where it is whole and meant for this function.

numba keeps an index beside the code and trusts both: two processes that compile different
signatures at once can leave an index that leads to the other's code, and a damaged file stops
the program. Here every signature has a file of its own that carries its key and a checksum.
"""

from __future__ import annotations

import hashlib
import os
import pickle
import tempfile
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import Any

from numba.core.caching import FunctionCache
from numba.core.serialize import dumps

HEAD = b"meanfree machine code 1\n"
_DIGEST = hashlib.sha256().digest_size


class KeptCode(FunctionCache):  # type: ignore[misc]
    """What numba asks for code made before, and gives new code to.

    A folder that cannot be read or written costs time and nothing else.
    """

    def __init__(self, py_func: Callable[..., Any]) -> None:
        super().__init__(py_func)
        self._cache_file = CodeFiles(Path(self._cache_path), self._impl.filename_base)

    def load_overload(self, sig: Any, target_context: Any) -> Any:
        """The code for a signature, None where it has to be made."""
        try:
            return super().load_overload(sig, target_context)
        except OSError:
            return None

    def save_overload(self, sig: Any, data: Any) -> None:
        """Keep the code for a signature, where there is room."""
        with suppress(OSError):
            super().save_overload(sig, data)


class CodeFiles:
    """The files of one function, one for each key."""

    def __init__(self, folder: Path, name: str) -> None:
        self.folder, self.name = folder, name

    def path(self, key: object) -> Path:
        """Where the code for a key lies."""
        digest = hashlib.sha256(repr(key).encode()).hexdigest()[:16]
        return self.folder / f"{self.name}.{digest}.code"

    def load(self, key: object) -> Any:
        """What was kept under a key, None where that is missing, damaged or another's."""
        try:
            content = self.path(key).read_bytes()
        except OSError:
            return None
        head, body = content[: len(HEAD) + _DIGEST], content[len(HEAD) + _DIGEST :]
        if head != HEAD + hashlib.sha256(body).digest():
            return None
        try:
            kept_key, data = pickle.loads(body)
        except Exception:  # noqa: BLE001 -- whole, but written by something else
            return None
        return data if kept_key == key else None

    def save(self, key: object, data: object) -> None:
        """Keep data under a key: written aside and renamed, so that no one reads half of it."""
        body = dumps((key, data))
        handle, aside = tempfile.mkstemp(dir=self.folder, prefix=".code-")
        try:
            with os.fdopen(handle, "wb") as file:
                file.write(HEAD + hashlib.sha256(body).digest() + body)
            Path(aside).replace(self.path(key))
        except BaseException:
            Path(aside).unlink(missing_ok=True)
            raise

    def flush(self) -> None:
        """Forget everything; numba's word for it."""
        for path in self.folder.glob(f"{self.name}.*.code"):
            path.unlink(missing_ok=True)
