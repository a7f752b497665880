"""The shape of each rate law by its word. A new law adds one line here."""

from __future__ import annotations

from meanfree.case.laws.arrhenius import ArrheniusStep
from meanfree.case.laws.collision import CollisionStep
from meanfree.case.laws.fixed import FixedStep
from meanfree.case.schema.steps import StepTable

LAW_SHAPES: dict[str, type[StepTable]] = {
    "fixed": FixedStep,
    "arrhenius": ArrheniusStep,
    "collision": CollisionStep,
}
