"""What every test may ask for."""

from __future__ import annotations

import os
from typing import Any, Literal

import pytest
import validation
from validation import Checked


@pytest.fixture(scope="session")
def size() -> Literal["small", "full"]:
    """How much a test marked slow shall do: MEANFREE_TEST_SIZE, "full" unless it says "small"."""
    chosen = os.environ.get("MEANFREE_TEST_SIZE", "full")
    if chosen == "small":
        return "small"
    if chosen == "full":
        return "full"
    raise pytest.UsageError(f"MEANFREE_TEST_SIZE is {chosen!r}; expected 'small' or 'full'")


@pytest.fixture
def checked(request: pytest.FixtureRequest) -> Checked:
    """Assert that a value of ours is the one printed, record it, and hold the README to it.

    Without `rel` or `within`, ours must round to what is printed, up to a relative `slack` in the
    inputs.
    """
    module = request.path.relative_to(validation.TESTS).as_posix()
    name = f"{module}: {request.node.originalname}"

    def check(
        quantity: str,
        ours: Any,
        printed: str,
        unit: str,
        source: str,
        *,
        rel: float | None = None,
        within: float | None = None,
        slack: float = 0.0,
    ) -> None:
        value = float(ours)
        if rel is None and within is None:
            within = validation.half_unit(printed) + slack * abs(value)
        expected = pytest.approx(float(printed), rel=rel or 0.0, abs=within or 0.0)
        assert value == expected, quantity
        one = validation.Check(name, quantity, source, printed, value, unit)
        request.node.user_properties.append(("published", vars(one).copy()))
        if os.environ.get("MEANFREE_VALIDATION") != "write":
            wrong = validation.is_current(one)
            assert wrong is None, f"{quantity}: {wrong}: run tests/support/validation_table.py"

    return check
