"""What every test may ask for."""

from __future__ import annotations

import os
from typing import Literal

import pytest


@pytest.fixture(scope="session")
def size() -> Literal["small", "full"]:
    """How much a test marked slow shall do: MEANFREE_TEST_SIZE, "full" unless it says "small"."""
    chosen = os.environ.get("MEANFREE_TEST_SIZE", "full")
    if chosen == "small":
        return "small"
    if chosen == "full":
        return "full"
    raise pytest.UsageError(f"MEANFREE_TEST_SIZE is {chosen!r}; expected 'small' or 'full'")
