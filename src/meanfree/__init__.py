"""Concentration against time for gas-phase reactions in a closed batch vessel."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from meanfree.campaigns.reading import read_sweep, read_sweep_parts

__version__ = "0.1.0"
__all__ = ["__version__", "read_sweep", "read_sweep_parts"]


def __getattr__(name: str) -> Any:
    # Fetched when asked for, so that `import meanfree` costs a command nothing.
    if name in ("read_sweep", "read_sweep_parts"):
        from meanfree.campaigns import reading

        return getattr(reading, name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
