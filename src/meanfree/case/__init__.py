"""The case file: TOML text becomes an Experiment here and nowhere else."""

from __future__ import annotations

from meanfree.case.loaded import LoadedCase
from meanfree.case.loader import load_case

__all__ = ["LoadedCase", "load_case"]
