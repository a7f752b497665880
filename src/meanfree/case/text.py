"""A case file from the disk to plain tables: size, encoding and TOML, with every trap named."""

from __future__ import annotations

import re
import tomllib
import unicodedata
from pathlib import Path
from typing import Any

from meanfree.errors import InputError

LARGEST = 1 << 20  # bytes; the largest honest mechanism is far below
DEEPEST = 20  # tables inside tables; no case needs more than six
_TOML = "a case file in TOML 1.0 (texts stand in quotes)"
_DEEP = "tables or lists nested too deeply to read"


def read_text(path: Path) -> str:
    """The text of a case file. Raises `InputError` where it cannot be read as one."""
    _refuse_name(path)
    try:
        if path.is_dir():
            raise _at("a folder", "the name of a case file, such as bulb.toml")
        if not path.exists():
            raise _at("no such file", _existing(path))
        if not path.is_file():
            raise _at("something that is no file", "the name of a case file, such as bulb.toml")
        with path.open("rb") as file:
            content = file.read(LARGEST + 1)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "a name that no file can have"
        raise _at(f"what cannot be read ({reason})", "a case file that can be read") from None
    if len(content) > LARGEST:
        raise _at("a file larger than 1 MiB", "a case file of at most 1 MiB")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        raise _at(f"bytes on line {line} that are not UTF-8", "a text file in UTF-8") from None


def parse(text: str) -> dict[str, Any]:
    """The tables of a case file. Raises `InputError` for anything that is not TOML."""
    try:
        tables = tomllib.loads(text.replace("\r\n", "\n"))
    except tomllib.TOMLDecodeError as error:
        found = f"what is not TOML: {_short(str(error))}{_look_alike(text, str(error))}"
        raise _at(found, _TOML) from None
    except RecursionError:
        raise _at(_DEEP, _TOML) from None
    except ValueError:  # an integer beyond the interpreter's limit of digits
        raise _at("a number with thousands of digits", "numbers that a person could read") from None
    if _is_deep(tables):
        raise _at(_DEEP, _TOML)
    return tables


def _is_deep(tables: dict[str, Any]) -> bool:
    """True where tables lie in tables beyond `DEEPEST`: whoever walks them would not come back."""
    level: list[Any] = [tables]
    for _ in range(DEEPEST):
        level = [
            inner
            for node in level
            for inner in (node.values() if isinstance(node, dict) else node)
            if isinstance(inner, dict | list)
        ]
        if not level:
            return False
    return True


def _refuse_name(path: Path) -> None:
    """Results are kept under the name of the case, which must be one, and be writable as text."""
    stem, text = path.stem, str(path)
    if stem and not stem.strip("."):
        raise _at("a name of dots alone", "a name for the case, such as bulb.toml")
    if not path.name.isprintable() or text != text.encode("utf-8", "replace").decode():
        raise _at("a name that cannot be printed", "a name in plain letters, such as bulb.toml")


def _look_alike(text: str, message: str) -> str:
    """A character of another alphabet in the key of the line that TOML refuses."""
    place = re.search(r"at line ([0-9]+)", message)
    lines = text.splitlines()
    if place is None or not 0 < int(place.group(1)) <= len(lines):
        return ""
    for character in re.sub('"[^"]*"|#.*', "", lines[int(place.group(1)) - 1]):
        if not character.isascii():
            name = unicodedata.name(character, "a control character")
            return f"; in that line a character is U+{ord(character):04X} ({name})"
    return ""


def _short(message: str) -> str:
    return message if len(message) <= 200 else f"{message[:150]} … {message[-45:]}"


def _at(found: str, expected: str) -> InputError:
    return InputError.at("", found, expected)


def _existing(path: Path) -> str:
    from meanfree.case.findings import did_you_mean

    try:
        beside = sorted(p.name for p in path.absolute().parent.glob("*.toml"))[:200]
    except (OSError, ValueError):
        beside = []
    return f"the name of a case file{did_you_mean(path.name, beside)}"
