"""``--set ADDRESS=VALUE``: changes to the parsed case before anything is checked.

The addresses are those of the numbers (``steps.decomposition.Ea``), so that what is wrong is
said in the same words as if the file had been edited.
"""

from __future__ import annotations

import copy
import tomllib
from collections.abc import Mapping
from typing import Any

from meanfree.case.findings import Findings, did_you_mean
from meanfree.units.gate import quoted


def split_settings(texts: list[str]) -> tuple[dict[str, str], Findings]:
    """``ADDRESS=VALUE`` texts as a mapping, and what is wrong with them."""
    settings: dict[str, str] = {}
    findings = Findings()
    for text in texts:
        address, equals, value = (part.strip() for part in text.partition("="))
        if not equals or not address or not value:
            findings.wrong("--set", quoted(text), "ADDRESS=VALUE, such as temperature.value=500 K")
        elif address in settings:
            findings.wrong("--set", f"{address} set twice", "each address once")
        else:
            settings[address] = value
    return settings, findings


def apply(
    tables: dict[str, Any], settings: Mapping[str, str], findings: Findings
) -> dict[str, Any]:
    """The tables with the settings put in; ``tables`` itself stays as it is."""
    changed = copy.deepcopy(tables)
    for address, text in settings.items():
        _apply_one(changed, address, text, findings)
    return changed


def _apply_one(tables: dict[str, Any], address: str, text: str, findings: Findings) -> None:
    node: Any = tables
    keys = address.split(".")
    if not all(keys):
        findings.wrong("--set", quoted(address), "an address such as temperature.value")
        return
    for depth, key in enumerate(keys[:-1]):
        node = _below(node, key, ".".join(keys[: depth + 1]), address, findings)
        if node is None:
            return
    last = keys[-1]
    if isinstance(node, list):
        place = _place(node, last)
        if place is None:
            _no_such(node, ".".join(keys[:-1]), last, findings)
        else:
            node[place] = _value(text, node[place])
    elif isinstance(node, dict):
        node[last] = _value(text, node.get(last))
    else:
        findings.wrong("--set", quoted(address), f"{'.'.join(keys[:-1])} itself, which is a value")


def _below(node: Any, key: str, so_far: str, address: str, findings: Findings) -> Any:
    """The table or list one level down, made where a table lacks it; None if there is none."""
    if isinstance(node, list):
        place = _place(node, key)
        if place is None:
            _no_such(node, so_far.rpartition(".")[0], key, findings)
            return None
        return node[place]
    if isinstance(node, dict):
        if key == "steps" and key not in node:
            findings.wrong("--set", quoted(address), "an address in a case that has steps")
            return None
        return node.setdefault(key, {})
    findings.wrong(
        "--set", quoted(address), f"{so_far.rpartition('.')[0]} itself, which is a value"
    )
    return None


def _place(node: list[Any], key: str) -> int | None:
    """Place in a list: of the entry with that name, or counted from 0."""
    for place, entry in enumerate(node):
        if isinstance(entry, dict) and entry.get("name") == key:
            return place
    if key.isascii() and key.isdigit() and len(key) < 7 and int(key) < len(node):
        return int(key)
    return None


def _no_such(node: list[Any], where: str, key: str, findings: Findings) -> None:
    names = [entry["name"] for entry in node if isinstance(entry, dict) and "name" in entry]
    names = [name for name in names if isinstance(name, str)]
    known = "one of " + ", ".join(names) if names else f"a place from 0 to {len(node) - 1}"
    findings.wrong(
        "--set", f"{where}.{key}, which is not in the case", known + did_you_mean(key, names)
    )


def _value(text: str, before: Any) -> Any:
    """The value that a setting means: text stays text where the file has text."""
    if isinstance(before, str) and not text.startswith(('"', "'", "{", "[")):
        return text
    try:
        parsed = tomllib.loads(f"value = {text}")
    except (ValueError, RecursionError):
        return text
    return parsed["value"] if len(parsed) == 1 else text
