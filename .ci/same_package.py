"""Compare what is committed, what the wheel holds and what two environments have installed.

    python same_package.py CHECKOUT WHEEL SITE_PACKAGES ...

The tests ran on an installed package; this shows that it was the built wheel, whole.
"""

from __future__ import annotations

import subprocess
import sys
import zipfile
from pathlib import Path

PACKAGE = "meanfree/"


def committed(checkout: Path) -> dict[str, bytes]:
    """Name in the package to contents, of every file that git knows under src/meanfree."""
    listed = subprocess.run(
        ["git", "-C", str(checkout), "ls-files", "-z", f"src/{PACKAGE}"],
        check=True,
        capture_output=True,
    ).stdout.decode()
    return {
        name.removeprefix("src/"): (checkout / name).read_bytes()
        for name in listed.split("\0")
        if name
    }


def in_wheel(wheel: Path) -> dict[str, bytes]:
    """The same for a wheel."""
    with zipfile.ZipFile(wheel) as archive:
        return {name: archive.read(name) for name in archive.namelist() if name.startswith(PACKAGE)}


def installed(site_packages: Path) -> dict[str, bytes]:
    """The same for a site-packages folder."""
    return {
        path.relative_to(site_packages).as_posix(): path.read_bytes()
        for path in (site_packages / PACKAGE).rglob("*")
        if path.is_file() and "__pycache__" not in path.parts
    }


def main(checkout: str, wheel: str, *environments: str) -> None:
    """Exit with the differences, if there are any."""
    reference = committed(Path(checkout))
    others = {wheel: in_wheel(Path(wheel))}
    others.update({place: installed(Path(place)) for place in environments})
    complaints = [
        f"{place}: {name} is {'missing' if name not in files else 'not what is committed'}"
        for place, files in others.items()
        for name in sorted(reference.keys() | files.keys())
        if files.get(name) != reference.get(name)
    ]
    if complaints:
        raise SystemExit("\n".join(complaints))
    print(f"{len(reference)} files, the same in git, in the wheel and as installed")


if __name__ == "__main__":
    main(*sys.argv[1:])
