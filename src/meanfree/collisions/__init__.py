"""Kinetic theory of gases as pure functions of numbers and arrays, SI with mol.

Spheres in space: `speeds`, `encounters`, `mixtures`, `walls`. Discs in a plane: `plane`, and
the mixtures of discs. What a threshold does to either: `line_of_centres`. All about one pair:
`collide`.
"""

from __future__ import annotations

from meanfree.collisions import encounters, line_of_centres, mixtures, plane, speeds, walls
from meanfree.collisions.summary import Crowd, PairCollisions, collide

__all__ = [
    "Crowd",
    "PairCollisions",
    "collide",
    "encounters",
    "line_of_centres",
    "mixtures",
    "plane",
    "speeds",
    "walls",
]
