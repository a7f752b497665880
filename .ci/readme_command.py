"""Print the one command that README.md shows after `<!-- command: NAME -->`, verbatim."""

from __future__ import annotations

import re
import sys
from pathlib import Path


def command(text: str, name: str) -> str:
    """The single line in the fenced block after the mark; SystemExit if it is not that."""
    mark = re.escape(f"<!-- command: {name} -->")
    blocks = re.findall(rf"^{mark}\n+```sh\n(.*?)\n```$", text, flags=re.MULTILINE | re.DOTALL)
    if len(blocks) != 1:
        raise SystemExit(f"README.md: found {len(blocks)} blocks marked {name}; expected one")
    if "\n" in blocks[0]:
        raise SystemExit(f"README.md: the command {name} has several lines; expected one")
    return str(blocks[0])


if __name__ == "__main__":
    print(command(Path(sys.argv[1]).read_text(encoding="utf-8"), sys.argv[2]))
