"""The measured runs of a case and what shall be found from them: ``[[data]]`` and ``[fit]``.

Each run is the case with its conditions put in, read like a case of its own, so that everything
that a case may say can differ from run to run.
"""

from __future__ import annotations

from dataclasses import dataclass

from meanfree.case.findings import Findings
from meanfree.case.loaded import LoadedCase
from meanfree.case.meaning.analyses import order_of, wanted_of
from meanfree.case.readings import asked_of
from meanfree.errors import InputError
from meanfree.measured.analyses import Plan
from meanfree.measured.fits import FitRequest
from meanfree.measured.runs import MeasuredRun


@dataclass(frozen=True)
class Measurements:
    """The runs of a case, and what it asks of them."""

    runs: tuple[MeasuredRun, ...]
    plan: Plan

    @property
    def request(self) -> FitRequest:
        """The fit by itself."""
        return self.plan.request


def measurements_of(case: LoadedCase, *, needed: bool = True) -> Measurements:
    """The runs and the fit of a case.

    ``needed``: without any data that is an error.

    Raises
    ------
    InputError
        Anything is wrong with the tables or with the files they name: all problems in one go.
    """
    findings = Findings()
    runs, table, asked = asked_of(case, findings, needed=needed)
    wanted = wanted_of(table, case.experiment, findings)
    order = order_of(table, case.experiment, findings)
    if findings.problems:
        raise InputError(problem.inside(str(case.path)) for problem in findings.problems)
    request = FitRequest(runs, asked, table.loss, int(table.starts.value))
    lines = table.weighting == "integrated-law line"
    return Measurements(runs, Plan(request, lines, order, wanted))
