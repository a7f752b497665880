"""`meanfree check CASE`: what was understood, before anything is computed."""

from __future__ import annotations

import typer

from meanfree.cli._common import AsJson, CasePath, Quiet, Settings, open_case


def check(
    case: CasePath, settings: Settings = None, as_json: AsJson = False, quiet: Quiet = False
) -> None:
    """Read a case, and the files that it names, and say what was understood."""
    loaded = open_case(case, settings, files=True)
    if quiet:
        typer.echo(str(case))
        return
    from meanfree.cli.understood import understood
    from meanfree.cli.understood_text import as_text

    summary = understood(loaded)
    typer.echo(summary.model_dump_json(indent=2, by_alias=True) if as_json else as_text(summary))
