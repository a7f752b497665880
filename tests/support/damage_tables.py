"""Tables of a case damaged key by key, and written as TOML again."""

from __future__ import annotations

import copy
import math
import random
import re
from collections.abc import Iterator
from typing import Any

from damage_values import GAS_NAMES, HOSTILE_TEXTS, WRONG_KINDS, quantity

Place = tuple[str | int, ...]

CONTRADICTIONS: tuple[tuple[str, Any], ...] = (
    ("threshold", "100 kJ/mol"), ("Ea", "100 kJ/mol"), ("steric", 0.1), ("A_over_Z", 0.1),
    ("k", "1 L/mol/s"), ("A", "1 L/mol/s"), ("n", 2), ("T_ref", "300 K"), ("heat", "10 kJ/mol"),
    ("photon", "300 nm"), ("orders", {"Ar": 1}), ("partners", {"Ar": 2}), ("uptake", 0.5),
    ("k_counts", "loss of Ar"), ("reverse", {"Kp": "1 bar", "Kc": "1 mol/L", "at": "300 K"}),
    ("reverse", "thermochemistry"), ("valid", ["500 K", "400 K"]), ("diameter", "0 m"),
    ("uncertainty", {"factor": 0.5}), ("total", "1 atm"), ("pressure", "3 bar"),
    ("volume", "1 L"), ("points", [["0 s", "300 K"], ["0 s", "400 K"]]),
    ("surroundings", "300 K"), ("until", "0 s"), ("conductance", "0 W/K"), ("fraction", 1),
    ("watch", "Kr"), ("report_at", ["-1 s"]), ("solver", {"method": "Euler", "rtol": 0}),
    ("dead_space", {"volume": "9 m^3", "temperature": "9 K"}),
    ("shape", {"form": "sphere", "surface": "1 m^2"}), ("formula", "Xe"), ("cas", "50-00-0"),
    ("cas", "50-00-1"), ("labels", ["NOCl", "Ar"]), ("sd", "-1 torr"), ("decimal", ","),
    ("skip", 10**6), ("heading", -1), ("delimiter", "tab"),
    ("conditions", {"temperature.value": "9 K"}), ("name", "x"),
    ("conditions", {"vessel.volume": "-1 L", "x.y": "z"}), ("law", "wall"), ("kind", "leak-up"),
    ("mode", "adiabatic"), ("mode", "program"), ("holds", "pressure"), ("form", "cylinder"),
)  # fmt: skip
"""Keys that, put into a table, say the same thing twice, or something that cannot be beside it."""

_BARE = re.compile(r"[A-Za-z0-9_-]+")


def toml_text(tables: dict[str, Any]) -> str:
    """Tables as TOML 1.0: the top's values, then each table, arrays of tables one by one."""
    lines = [f"{_key(key)} = {_value(v)}" for key, v in tables.items() if not _is_block(v)]
    for key, block in tables.items():
        if not _is_block(block):
            continue
        many = isinstance(block, list)
        for table in block if many else [block]:
            lines.append(f"\n[[{_key(key)}]]" if many else f"\n[{_key(key)}]")
            lines += [f"{_key(name)} = {_value(value)}" for name, value in table.items()]
    return "\n".join(lines) + "\n"


def _is_block(value: Any) -> bool:
    if isinstance(value, list):
        return bool(value) and all(isinstance(one, dict) for one in value)
    return isinstance(value, dict)


def _key(key: str) -> str:
    return key if _BARE.fullmatch(key) else _text(key)


def _text(text: str) -> str:
    """A basic string; what TOML forbids raw is escaped."""
    out = []
    for character in text:
        code = ord(character)
        if character in '"\\':
            out.append("\\" + character)
        elif code < 32 or code == 127:
            out.append(f"\\u{code:04x}")
        else:
            out.append(character)
    return '"' + "".join(out) + '"'


def _value(value: Any) -> str:
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, float):
        if math.isfinite(value):
            return repr(value)
        return "nan" if value != value else "inf" if value > 0 else "-inf"
    if isinstance(value, list):
        return "[" + ", ".join(_value(one) for one in value) + "]"
    if isinstance(value, dict):
        return "{" + ", ".join(f"{_key(k)} = {_value(v)}" for k, v in value.items()) + "}"
    return repr(value)


def places(node: Any, above: Place = ()) -> Iterator[Place]:
    """Every place in the tables, from the top down."""
    pairs: list[tuple[str | int, Any]] = []
    if isinstance(node, dict):
        pairs = list(node.items())
    elif isinstance(node, list):
        pairs = list(enumerate(node))
    for key, value in pairs:
        yield (*above, key)
        yield from places(value, (*above, key))


def at(tables: Any, place: Place) -> Any:
    """What stands at a place."""
    for key in place:
        tables = tables[key]
    return tables


def exchanged(tables: dict[str, Any], place: Place, value: Any) -> dict[str, Any]:
    """A copy with another value at a place."""
    new = copy.deepcopy(tables)
    at(new, place[:-1])[place[-1]] = value
    return new


def shown(place: Place) -> str:
    """A place as an address."""
    return ".".join(map(str, place))


def wrong_kind(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """Somewhere a value of another kind."""
    place, value = chance.choice(list(places(tables))), chance.choice(WRONG_KINDS)
    return f"{shown(place)} = {value!r:.40}", exchanged(tables, place, copy.deepcopy(value))


def wrong_text(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """A hostile text where a text stands."""
    texts = [p for p in places(tables) if isinstance(at(tables, p), str)]
    place, value = chance.choice(texts), chance.choice(HOSTILE_TEXTS)
    if chance.random() < 0.3:
        value = at(tables, place) + value
    return f"{shown(place)} = {value!r:.60}", exchanged(tables, place, value)


def wrong_quantity(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """A number with its unit, spoilt; or a plain number out of all bounds."""
    found = [
        p
        for p in places(tables)
        if isinstance(at(tables, p), int | float) or re.match(r"[+-]?[0-9]", str(at(tables, p)))
    ]
    place = chance.choice(found)
    old = at(tables, place)
    value: Any = quantity(old, chance) if isinstance(old, str) else _number(old, chance)
    return f"{shown(place)} = {value!r:.60}", exchanged(tables, place, value)


def _number(old: float, chance: random.Random) -> Any:
    return chance.choice(
        [-old, 0, old * 1e12, old * 1e-12, 1e300, -1e300, float("nan"), float("inf"), str(old)]
    )


def key_lost(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """A key deleted, misspelt, moved to another table, or its table emptied."""
    new = copy.deepcopy(tables)
    place = chance.choice([p for p in places(tables) if isinstance(p[-1], str)])
    owner, key = at(new, place[:-1]), place[-1]
    value = owner.pop(key)
    way = chance.randrange(4)
    if way == 0:
        return f"no {shown(place)}", new
    if way == 1:
        other = _misspelt(str(key), chance)
        owner[other] = value
        return f"{shown(place)} written {other!r:.40}", new
    if way == 2:
        others = [p for p in places(new) if isinstance(at(new, p), dict)]
        to = chance.choice(others) if others else ()
        at(new, to)[key] = value
        return f"{shown(place)} moved to {shown(to) or 'the top'}", new
    owner[key] = {} if isinstance(value, dict) else [] if isinstance(value, list) else value
    extra = chance.choice(["x", "__class__", "", "constructor", "é", "a.b", "=1+1"])
    owner[extra] = chance.choice(WRONG_KINDS)
    return f"{shown(place)} emptied, and a key {extra!r}", new


def _misspelt(word: str, chance: random.Random) -> str:
    place = chance.randrange(len(word) or 1)
    return chance.choice(
        [
            word[:place] + word[place + 1 :] or "q",
            word[:place] + word[place:][::-1],
            word.upper(),
            word + "s",
            word.replace("a", "\u0430").replace("e", "\u0435"),
            word + "\u200b",
            f" {word}",
        ]
    )


def contradiction(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """A key beside those that say the same, or the contrary."""
    owners = [(), *(p for p in places(tables) if isinstance(at(tables, p), dict))]
    place = chance.choice(owners)
    key, value = chance.choice(CONTRADICTIONS)
    new = copy.deepcopy(tables)
    at(new, place)[key] = copy.deepcopy(value)
    return f"{shown(place)} with {key} = {value!r:.40}", new


def renamed(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """A gas under another name, throughout or in one place only."""
    gases = [g for g in tables["fill"]["gases"] if isinstance(g, str)]
    old, name = chance.choice(gases), chance.choice(GAS_NAMES)
    new = copy.deepcopy(tables)
    word = re.compile(rf"(?<![A-Za-z0-9]){re.escape(old)}(?![A-Za-z0-9+-])")
    if chance.random() < 0.5:
        return f"{old} named {name!r:.40} throughout", _renamed(new, word, name)
    where = chance.choice(["fill", "steps", "gases", "run"])
    if where in new:
        new[where] = _renamed(new[where], word, name)
    return f"{old} named {name!r:.40} in {where}", new


def _renamed(node: Any, word: re.Pattern[str], name: str) -> Any:
    if isinstance(node, dict):
        return {word.sub(lambda _: name, k): _renamed(v, word, name) for k, v in node.items()}
    if isinstance(node, list):
        return [_renamed(one, word, name) for one in node]
    return word.sub(lambda _: name, node) if isinstance(node, str) else node


def doubled(tables: dict[str, Any], chance: random.Random) -> tuple[str, dict[str, Any]]:
    """A step, a set of readings or a label a second time; a step that undoes itself."""
    new = copy.deepcopy(tables)
    many = [key for key, value in tables.items() if isinstance(value, list) and value]
    key = chance.choice(many)
    new[key] = [*new[key], copy.deepcopy(chance.choice(new[key]))]
    if key == "steps" and chance.random() < 0.5:
        left = str(new[key][-1].get("reaction", "")).partition("->")[0].strip()
        new[key][-1] |= {"name": "again", "reaction": f"{left} -> {left}"}
    return f"{key} doubled", new


WAYS = (
    wrong_kind,
    wrong_text,
    wrong_quantity,
    wrong_quantity,
    key_lost,
    contradiction,
    renamed,
    doubled,
)
