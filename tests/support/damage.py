"""Damaged inputs by the thousand: every shipped case and its readings, spoilt in seeded ways.

A `Damage` is a case file, its files of readings, and words for the command line. What must come of
it stands in `attacked`.
"""

from __future__ import annotations

import random
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from damage_bytes import PATHS, bytes_damaged, readings_damaged
from damage_tables import WAYS, at, exchanged, places, shown, toml_text
from damage_values import HOSTILE_TEXTS, NUMBERS, WRONG_KINDS, quantity

CASES = Path(__file__).parents[2] / "cases"

SWEEP = """
[sweep]
samples = 4
vary = { "temperature.value" = { between = ["560 K", "620 K"] } }
"""
PLAN = """
[plan]
deadline = "8 h"
"""


@dataclass(frozen=True)
class Damage:
    """One damaged input: what was done to which case, and all that lies in its folder."""

    case: str
    kind: str
    detail: str
    content: bytes
    readings: dict[str, bytes] = field(default_factory=dict)
    settings: tuple[str, ...] = ()

    def __str__(self) -> str:
        return f"{self.case}, {self.kind}: {self.detail}"


def shipped() -> dict[str, str]:
    """The text of every shipped case, and of one with a sweep, by name."""
    texts = {path.stem: path.read_text(encoding="utf-8") for path in sorted(CASES.glob("*.toml"))}
    texts["with a sweep"] = texts["dimer-piston"] + SWEEP
    return texts


def readings() -> dict[str, str]:
    """The text of every shipped file of readings, by its name inside the cases' folder."""
    folder = CASES / "readings"
    return {f"readings/{p.name}": p.read_text(encoding="utf-8") for p in sorted(folder.iterdir())}


def damages(seed: int, count: int) -> Iterator[Damage]:
    """That many damaged inputs, the same for the same seed."""
    texts, tables = shipped(), readings()
    names = sorted(texts)
    measured = [name for name in names if "[[data]]" in texts[name]]
    for n in range(count):
        chance = random.Random(f"{seed}/{n}")
        kind = KINDS[n % len(KINDS)]
        name = chance.choice(measured if kind in ("readings", "path") else names)
        yield _damage(kind, name, texts[name], tables, chance)


def _damage(
    kind: str, name: str, text: str, tables: dict[str, str], chance: random.Random
) -> Damage:
    plain = {file: content.encode() for file, content in tables.items()}
    if kind == "bytes":
        detail, content = bytes_damaged(text, chance)
        return Damage(name, kind, detail, content, plain)
    if kind == "readings":
        used = [file for file in plain if file in text]
        file = chance.choice(used)
        detail, content = readings_damaged(tables[file], chance)
        return Damage(name, kind, f"{file}, {detail}", text.encode(), {**plain, file: content})
    parsed = tomllib.loads(text)
    if kind == "path":
        files = [p for p in places(parsed) if p[-1] == "file"]
        place, path = chance.choice(files), chance.choice(PATHS)
        new = exchanged(parsed, place, path)
        return Damage(name, kind, f"{shown(place)} = {path!r:.50}", _encoded(new), plain)
    if kind == "setting":
        setting = _setting(parsed, chance)
        return Damage(name, kind, f"--set {setting!r:.80}", text.encode(), plain, (setting,))
    if kind == "two ways":
        first, once = chance.choice(WAYS)(parsed, chance)
        try:
            second, twice = chance.choice(WAYS)(once, chance)
        except (KeyError, TypeError, IndexError, AttributeError):  # nothing left to spoil
            second, twice = "nothing more", once
        return Damage(name, kind, f"{first}; {second}", _encoded(twice), plain)
    way = next(way for way in WAYS if way.__name__ == kind)
    detail, new = way(parsed, chance)
    return Damage(name, kind.replace("_", " "), detail, _encoded(new), plain)


def _encoded(tables: dict[str, Any]) -> bytes:
    return toml_text(tables).encode("utf-8", "surrogatepass")


def _setting(tables: dict[str, Any], chance: random.Random) -> str:
    """What stands after ``--set``."""
    every = [p for p in places(tables) if not isinstance(at(tables, p), dict | list)]
    place = chance.choice(every)
    address, old = shown(place), at(tables, place)
    way = chance.randrange(4)
    if way == 0:
        return f"{address}={chance.choice(HOSTILE_TEXTS + NUMBERS)}".replace("\0", "")
    if way == 1 and isinstance(old, str):
        return f"{address}={quantity(old, chance)}".replace("\0", "")
    if way == 2:
        return f"{address}={chance.choice(WRONG_KINDS)}"
    odd = [
        "..",
        "",
        "steps",
        "steps.0",
        f"{address}.x",
        "__class__.x",
        "x" * 999,
        "steps.-1.A",
        "=",
    ]
    return f"{chance.choice(odd)}={old}"


KINDS = (
    *(dict.fromkeys(way.__name__ for way in WAYS)),
    "wrong_quantity",
    "bytes",
    "readings",
    "path",
    "setting",
    "two ways",
)
"""Taken in turn."""
