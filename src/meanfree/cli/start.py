"""`meanfree start NAME`: a commented case to edit."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from meanfree.cli._common import Quiet

Name = Annotated[str, typer.Argument(metavar="NAME", help="Name of the case, or of its file.")]


def start(name: Name, quiet: Quiet = False) -> None:
    """Write a commented case to edit: NAME.toml."""
    from meanfree.case.template import template_text
    from meanfree.errors import InputError
    from meanfree.files import write_text_atomically
    from meanfree.units.gate import quoted

    if not name.strip() or not name.isprintable() or name.endswith(("/", "\\")):
        raise InputError.at("NAME", quoted(name), "a name for the case, such as bulb")
    path = Path(name if name.endswith(".toml") else f"{name}.toml")
    if path.exists() or path.is_symlink():
        raise InputError.at("NAME", f"{path}, which exists already", "a name that is still free")
    write_text_atomically(path, template_text(path.stem), key="NAME")
    if quiet:
        typer.echo(str(path))
        return
    typer.echo(f"{path} is a case to edit. What it says now:  meanfree check {path}")
