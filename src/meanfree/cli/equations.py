"""`meanfree equations CASE`: the balances, rates and constants of a case, written out."""

from __future__ import annotations

import typer

from meanfree.cli._common import (
    AsJson,
    CasePath,
    Out,
    Quiet,
    Replace,
    Settings,
    open_case,
    record_of,
    results_folder,
)


def equations(
    case: CasePath,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Write out the equations of a case; leave them as LaTeX and as a page."""
    loaded = open_case(case, settings)
    from meanfree.equations.typeset import equation_sheet
    from meanfree.report.equation_files import write_equations
    from meanfree.report.folder import owner_name

    folder = results_folder(loaded, "equations", out)
    record = record_of(loaded)
    sheet = equation_sheet(loaded.experiment)
    full = equation_sheet(loaded.experiment, most=None) if sheet.as_text_only else sheet
    owner = owner_name(loaded.path, folder)
    summary, paths = write_equations(sheet, full, record, folder, owner=owner, replace=replace)
    if as_json:
        typer.echo(summary)
    elif quiet:
        typer.echo("\n".join(map(str, paths)))
    else:
        typer.echo(f"{sheet.title}\n\n{sheet.text}\nWritten: {paths[0]}")
