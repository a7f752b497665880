"""The commands: arguments in, a call, a printed answer out."""

from __future__ import annotations


def main() -> None:
    """Entry of the console script `meanfree`."""
    import sys

    from meanfree.cli import process

    try:
        process.prepare(as_json="--json" in sys.argv)
        from meanfree.cli.app import run

        status = run(sys.argv[1:])
    except KeyboardInterrupt:  # while all that was still being imported
        process.told("Interrupted.", sys.stderr)
        status = process.interrupted_status()
    process.end()
    sys.exit(status)
