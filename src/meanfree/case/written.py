"""A new case with fitted values in place of the old ones, everything else as it stands.

Texts are exchanged in place, so that comments and order stay; then the result is loaded and held
against the fit: what does not come out the same is not written.
"""

from __future__ import annotations

import os
import re
import tempfile
from pathlib import Path

from meanfree.case.loaded import LoadedCase
from meanfree.case.loader import load_case
from meanfree.errors import ComputationError, InputError
from meanfree.experiment.inputs import inputs
from meanfree.files import write_text_atomically
from meanfree.measured.fits import Estimate, Fit

_HEADER = re.compile(r"^\s*\[{1,2}\s*([^\]]+?)\s*\]{1,2}\s*(?:#.*)?$")
_VALUE = r"(\"(?:[^\"\\]|\\.)*\"|'[^']*'|[^\s,}#\]]+)"
CLOSE = 1e-6


def refuse_target(target: Path, case: LoadedCase, *, replace: bool) -> None:
    """Raises InputError where the new case cannot be written there."""
    if target.suffix != ".toml":
        raise InputError.at("--write", f"{target}", "the name of a case file, ending in .toml")
    if os.path.realpath(target) == os.path.realpath(case.path):
        raise InputError.at("--write", f"{target}, the case itself", "another name")
    if target.exists() and not replace:
        raise InputError.at("--write", f"{target}, which is there", "another name, or --replace")


def write_fitted(case: LoadedCase, fit: Fit, target: Path) -> None:
    """Write the case with the fitted values and their source.

    Raises
    ------
    InputError
        A value has no place in the file that could be exchanged (an offset, a condition of a run),
        and nothing else was fitted.
    ComputationError
        The new text does not give the fitted values back.
    """
    written = [one for one in fit.estimates if _belongs(fit, one)]
    if not written:
        raise InputError.at(
            "--write", "a fit of nothing that stands in the case", "a fit of one of its numbers"
        )
    text = _without_data(case.text)
    for one in written:
        text = _exchanged(text, one)
    names = dict.fromkeys(_step(one) for one in written)
    source = f"fitted to {', '.join(dict.fromkeys(r.readings.file for r in fit.request.runs))}"
    for name in names:
        if name:
            text = _with_source(text, name, source)
    _check(text, written)
    write_text_atomically(target, text, key="--write")


def _belongs(fit: Fit, one: Estimate) -> bool:
    """True for numbers of the case itself, not of one run's conditions, nor offsets."""
    parameter = one.parameter
    return not parameter.is_offset and not any(
        parameter.key in fit.request.runs[place].conditions for place in parameter.runs
    )


def _step(one: Estimate) -> str:
    key = one.parameter.key
    return key.removeprefix("steps.").rpartition(".")[0] if key.startswith("steps.") else ""


def _blocks(text: str) -> list[tuple[str, list[str]]]:
    """(table's name, its lines, header included) in the order of the file; "" before the first."""
    blocks: list[tuple[str, list[str]]] = [("", [])]
    for line in text.split("\n"):
        header = _HEADER.match(line)
        if header is not None:
            blocks.append((header.group(1), []))
        blocks[-1][1].append(line)
    return blocks


def _without_data(text: str) -> str:
    """The case without its data and fit: it is to be run, from any folder."""
    kept = []
    for name, lines in _blocks(text.replace("\r\n", "\n")):
        head = name.partition(".")[0].strip("\"' ")
        if head in ("data", "fit"):
            continue
        kept += lines
    return "\n".join(kept).rstrip() + "\n"


def _exchanged(text: str, one: Estimate) -> str:
    """The text with the number at one address exchanged."""
    address, unit = one.parameter.key, one.parameter.unit
    value = f'"{one.value:.10g} {unit}"' if unit else f"{one.value:.10g}"
    parts = address.split(".")
    blocks = _blocks(text)
    for n, (name, lines) in enumerate(blocks):
        inside = _rest(name, lines, parts, address)
        if inside is None:
            continue
        changed = _put(lines, inside, value)
        if changed is not None:
            blocks[n] = (name, changed)
            return "\n".join(line for _, each in blocks for line in each)
    raise ComputationError(
        f"{address} stands in the case in a way that --write cannot exchange; "
        f"use --set {address}='{one.value:.6g} {unit}' with the case as it is."
    )


def _rest(name: str, lines: list[str], parts: list[str], address: str) -> list[str] | None:
    """What is left of an address inside a table; None where the table is another one."""
    if parts[0] == "steps":
        step, _, key = address.removeprefix("steps.").rpartition(".")
        found = re.search(r"^\s*name\s*=\s*(\"([^\"]*)\"|'([^']*)')", "\n".join(lines), re.M)
        own = found is not None and (found.group(2) or found.group(3)) == step
        return [key] if name.strip() == "steps" and own else None
    words = [word.strip("\"' ") for word in name.split(".")] if name else []
    return parts[len(words) :] if words == parts[: len(words)] and words else None


def _put(lines: list[str], inside: list[str], value: str) -> list[str] | None:
    """The lines with the value of the innermost key exchanged; None where it is not there."""
    last = re.escape(inside[-1])
    key = re.compile(rf"((?:^|[{{,])\s*(?:\"{last}\"|{last})\s*=\s*){_VALUE}")
    outer = re.compile(rf"^\s*\"?{re.escape(inside[0])}\"?\s*=")
    within = len(inside) == 1
    for n, line in enumerate(lines):
        if len(inside) > 1 and outer.match(line):
            within = True
        if not within:
            continue
        found = key.search(line)
        if found is not None:
            start, end = found.span(2)
            return [*lines[:n], line[:start] + value + line[end:], *lines[n + 1 :]]
    return None


def _with_source(text: str, step: str, source: str) -> str:
    """The text with the source of a step's numbers named."""
    blocks = _blocks(text)
    for n, (name, lines) in enumerate(blocks):
        if _rest(name, lines, ["steps"], f"steps.{step}.source") is None:
            continue
        escaped = source.replace("\\", "\\\\").replace('"', '\\"')
        changed = _put(lines, ["source"], f'"{escaped}"')
        if changed is None:
            last = max(i for i, line in enumerate(lines) if line.strip()) + 1
            changed = [*lines[:last], f'source = "{escaped}"', *lines[last:]]
        blocks[n] = (name, changed)
        break
    return "\n".join(line for _, each in blocks for line in each)


def _check(text: str, written: list[Estimate]) -> None:
    """The new text, loaded, must give the fitted values back."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "fitted.toml"
        path.write_text(text, encoding="utf-8")
        try:
            known = inputs(load_case(path).experiment)
        except InputError as error:
            raise ComputationError(f"The new case cannot be read back: {error}") from None
    for one in written:
        there = known.get(one.parameter.key)
        if there is None or abs(there.value - one.value) > CLOSE * abs(one.value):
            raise ComputationError(
                f"{one.parameter.key} did not reach the new case as it was fitted."
            )
