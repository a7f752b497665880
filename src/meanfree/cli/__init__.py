"""The commands: arguments in, a call, a printed answer out."""

from __future__ import annotations


def main() -> None:
    """Entry of the console script `meanfree`."""
    import sys

    from meanfree.cli.app import run

    sys.exit(run(sys.argv[1:]))
