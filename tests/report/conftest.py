"""Two runs that the tests of the report share."""

from __future__ import annotations

import pytest
from small_runs import dimerisation, nitrosyl_chloride

from meanfree.integrate.run import Run
from meanfree.integrate.single import integrate


@pytest.fixture(scope="session")
def nocl_run() -> Run:
    """Nitrosyl chloride in a rigid bulb, reversible."""
    return integrate(nitrosyl_chloride())


@pytest.fixture(scope="session")
def dimer_run() -> Run:
    """The dimerisation in a piston."""
    return integrate(dimerisation())
