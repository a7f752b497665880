"""Is the model honest here? Each limit as number, guideline, verdict and source."""

from __future__ import annotations

from meanfree.planning.limits.limit import Fact, Limit, Verdict
from meanfree.planning.limits.survey import Survey, survey

__all__ = ["Fact", "Limit", "Survey", "Verdict", "survey"]
