"""The shape of each rate law by its word. A new law adds one line here."""

from __future__ import annotations

from meanfree.case.laws.arrhenius import ArrheniusStep
from meanfree.case.laws.capture import CaptureStep
from meanfree.case.laws.collision import CollisionStep
from meanfree.case.laws.cross_section import CrossSectionStep
from meanfree.case.laws.falloff import FalloffStep
from meanfree.case.laws.fixed import FixedStep
from meanfree.case.laws.photolysis import PhotolysisStep
from meanfree.case.laws.source import SourceStep
from meanfree.case.laws.table import TableStep
from meanfree.case.laws.termolecular import TermolecularStep
from meanfree.case.laws.wall import WallStep
from meanfree.case.schema.steps import StepTable

LAW_SHAPES: dict[str, type[StepTable]] = {
    "fixed": FixedStep,
    "arrhenius": ArrheniusStep,
    "collision": CollisionStep,
    "cross-section": CrossSectionStep,
    "capture": CaptureStep,
    "table": TableStep,
    "falloff": FalloffStep,
    "termolecular": TermolecularStep,
    "wall": WallStep,
    "photolysis": PhotolysisStep,
    "source": SourceStep,
}
