"""`meanfree schema`: the JSON Schema of the case file, so that editors complete and check it."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from meanfree.cli._common import Quiet

Target = Annotated[
    Path | None, typer.Option("--out", metavar="FILE", help="Write it to this file.")
]


def schema(out: Target = None, quiet: Quiet = False) -> None:
    """Print the JSON Schema of the case file.

    A first line "#:schema ./case.schema.json" in a case makes editors use it.
    """
    from meanfree.case.json_schema import schema_text

    text = schema_text()
    if out is None:
        typer.echo(text, nl=False)
        return
    from meanfree.files import write_text_atomically

    write_text_atomically(out, text)
    typer.echo(str(out) if quiet else f"The schema of case files is in {out}.")
