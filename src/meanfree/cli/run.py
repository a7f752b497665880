"""`meanfree run CASE`: concentrations against time, the short answer first."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings, record_of
from meanfree.cli.each_case import Cases, for_each_case

if TYPE_CHECKING:
    from meanfree.case import LoadedCase


def run(
    cases: Cases,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
    check_twice: Annotated[
        bool,
        typer.Option(
            "--verify", help="Repeat with a second method at a tenth of the tolerance, and compare."
        ),
    ] = False,
) -> None:
    """Predict concentrations against time; leave figures, tables and a page.

    With several cases, --out names the folder that holds a folder for each.
    """

    def one(case: LoadedCase, folder: Path) -> str:
        return _one(
            case, folder, replace=replace, as_json=as_json, quiet=quiet, check_twice=check_twice
        )

    for_each_case(
        "run", cases, settings, one, out=out, replace=replace, as_json=as_json, quiet=quiet
    )


def _one(
    case: LoadedCase,
    folder: Path,
    *,
    replace: bool,
    as_json: bool,
    quiet: bool,
    check_twice: bool,
) -> str:
    """Run one case, leave its folder, and return what to print."""
    from meanfree.integrate.single import integrate
    from meanfree.integrate.verify import verify
    from meanfree.report.folder import owner_name, write_run
    from meanfree.report.summary import summarise

    record = record_of(case)
    result = integrate(case.experiment)
    summary = summarise(
        result,
        case=record.file,
        case_sha256=record.sha256,
        version=record.version,
        verification=verify(result) if check_twice else None,
    )
    owner = owner_name(case.path, folder)
    paths = write_run(result, summary, record, folder, owner=owner, replace=replace)
    if as_json:
        return summary.to_json().rstrip()
    if quiet:
        return "\n".join(str(path) for path in paths)
    from meanfree.cli.told import told

    return told(result, summary, folder)
