"""The equations of an experiment written out: MathML, LaTeX and text, from one tree."""

from __future__ import annotations

from meanfree.equations.typeset.sheet import Entry, EquationSheet, Group, equation_sheet

__all__ = ["Entry", "EquationSheet", "Group", "equation_sheet"]
