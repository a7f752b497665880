"""`python -m meanfree` is the command `meanfree`."""

from __future__ import annotations

from meanfree.cli import main

if __name__ == "__main__":
    main()
