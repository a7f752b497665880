"""The rate laws by the word that names them in a case file. A new law adds one line here."""

from __future__ import annotations

from meanfree.rates.arrhenius import Arrhenius
from meanfree.rates.capture import Capture
from meanfree.rates.collision import Collision
from meanfree.rates.cross_section import CrossSection
from meanfree.rates.falloff import Falloff
from meanfree.rates.fixed import Fixed
from meanfree.rates.law import Law
from meanfree.rates.photolysis import Photolysis
from meanfree.rates.source import Source
from meanfree.rates.table import Table
from meanfree.rates.termolecular import Termolecular
from meanfree.rates.wall import Wall

_ALL: tuple[type[Law], ...] = (
    Fixed,
    Arrhenius,
    Collision,
    CrossSection,
    Capture,
    Table,
    Falloff,
    Termolecular,
    Wall,
    Photolysis,
    Source,
)

LAWS: dict[str, type[Law]] = {law.word: law for law in _ALL}
