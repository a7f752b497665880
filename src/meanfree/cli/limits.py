"""`meanfree limits CASE`: is the model honest here?"""

from __future__ import annotations

from typing import TYPE_CHECKING

from meanfree.cli._common import AsJson, Out, Quiet, Replace, Settings
from meanfree.cli.documents import carry_out
from meanfree.cli.each_case import Cases

if TYPE_CHECKING:
    from meanfree.case import LoadedCase
    from meanfree.progress import Progress
    from meanfree.report.document import Document
    from meanfree.report.record import CaseRecord


def limits(
    cases: Cases,
    settings: Settings = None,
    out: Out = None,
    replace: Replace = False,
    as_json: AsJson = False,
    quiet: Quiet = False,
) -> None:
    """Hold a case against the limits of the model, the vessel and the gases.

    With several cases, --out names the folder that holds a folder for each.
    """
    carry_out(
        "limits",
        cases,
        settings,
        _work,
        out=out,
        replace=replace,
        as_json=as_json,
        quiet=quiet,
    )


def _work(case: LoadedCase, record: CaseRecord, progress: Progress) -> Document:
    from meanfree.integrate.single import integrate
    from meanfree.planning.limits import survey
    from meanfree.report.planning.limits import limits_document

    return limits_document(survey(integrate(case.experiment), case.planning), record)
