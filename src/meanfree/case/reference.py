"""The reference of the case file as Markdown, from the descriptions in its schema.

``python -m meanfree.case.reference`` prints it; ``cases/README.md`` holds it, and a test keeps
the two the same.
"""

from __future__ import annotations

import re
from typing import Any

from meanfree.case.json_schema import case_schema

OPENING = """\
# The case file, key by key

One experiment in TOML 1.0. Quantities are strings with a unit (`"50 torr"`, `"326 degC"`,
`"1.6e-18 cm^3/s"`); a number without one is refused where there is a dimension. Keys marked * are
required. The file is data: nothing in it is evaluated. `meanfree start NAME` writes a commented
case, `meanfree check CASE` says what was understood, and the line `#:schema ./case.schema.json`
lets an editor complete the keys. Each of the other files here is an example from an invented
laboratory.

At the top of the file, before any table: `title`*, `purpose`, and `labels`, a list of names that
are no real gas.
"""

SHARED = "Keys of every step"

PLACED = ("vessel", "shape", "dead_space", "fill", "run", "solver", "reverse", "uncertainty")
"""Tables whose place on the page is chosen; further ones follow before the laws."""


def reference_markdown() -> str:
    """The whole page."""
    schema = case_schema()
    tables: dict[str, dict[str, Any]] = schema["$defs"]
    steps = [name for name in tables if name.endswith("Step")]
    shared = set.intersection(*(set(tables[name]["properties"]) for name in steps)) - {"law"}
    parts = [OPENING]
    for key in ("vessel", "shape", "dead_space"):
        heading = f"`[{key}]`" if key == "vessel" else f"`{key}` of the vessel"
        parts.append(_section(heading, _named(tables, key)))
    modes = [name for name in tables if "mode" in tables[name].get("properties", {})]
    for name in modes:
        word = tables[name]["properties"]["mode"]["const"]
        parts.append(_section(f'`[temperature]` with `mode = "{word}"`', tables[name], {"mode"}))
    for key in ("fill", "run", "solver"):
        heading = "`solver` of the run" if key == "solver" else f"`[{key}]`"
        parts.append(_section(heading, _named(tables, key)))
    parts.append(_section("`[gases.NAME]`, where a gas is not known", tables["GasTable"]))
    first = tables[steps[0]]
    every = {
        "properties": {k: v for k, v in first["properties"].items() if k in shared},
        "required": [key for key in first["required"] if key in shared],
    }
    parts.append(_section(f"`[[steps]]`: {SHARED.lower()}", every))
    parts += [
        _section(f"`{key}` of a step", _named(tables, key)) for key in ("reverse", "uncertainty")
    ]
    told = {*steps, *modes, "GasTable", *map(_table_name, PLACED)}
    parts += [
        _section(f"`{_key_of(name)}`", table) for name, table in tables.items() if name not in told
    ]
    for name in steps:
        word = tables[name]["properties"]["law"]["const"]
        parts.append(_section(f'`law = "{word}"`', tables[name], shared | {"law"}))
    return "\n".join(parts)


def _named(tables: dict[str, dict[str, Any]], key: str) -> dict[str, Any]:
    """The table of a key: ``dead_space`` is DeadSpaceTable."""
    return tables[_table_name(key)]


def _table_name(key: str) -> str:
    return "".join(word.capitalize() for word in key.split("_")) + "Table"


def _key_of(name: str) -> str:
    """DeadSpaceTable is the table of ``dead_space``."""
    return re.sub(r"(?<=[a-z])(?=[A-Z])", "_", name.removesuffix("Table")).lower()


def _section(heading: str, table: dict[str, Any], without: set[str] | None = None) -> str:
    """One heading with a line for each key."""
    lines = [f"## {heading}", ""]
    if table.get("description"):
        lines += [table["description"], ""]
    required = table.get("required", [])
    for key, entry in table["properties"].items():
        if key in (without or set()):
            continue
        star = "*" if key in required else ""
        text = entry.get("description", "") or ", ".join(map(str, entry.get("enum", [])))
        examples = entry.get("examples") or []
        shown = " (" + ", ".join(f"`{example!s}`" for example in examples) + ")" if examples else ""
        lines.append(f"- `{key}`{star}: {text}{shown}")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    import sys

    sys.stdout.write(reference_markdown())
