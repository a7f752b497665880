"""Import every module of the installed package, so that each of them is known to load."""

from __future__ import annotations

import importlib
import pkgutil

import meanfree

names = [found.name for found in pkgutil.walk_packages(meanfree.__path__, "meanfree.")]
for name in names:
    importlib.import_module(name)
print(f"{len(names)} modules import, from {meanfree.__path__[0]}")
