"""Every encounter of a mechanism against the most that it could be."""

from __future__ import annotations

from meanfree.planning.ceiling.encounters import Crossing, Curve, Level
from meanfree.planning.ceiling.table import CeilingTable, LeftOut, StepCeiling, ceiling_table

__all__ = ["CeilingTable", "Crossing", "Curve", "LeftOut", "Level", "StepCeiling", "ceiling_table"]
