"""A thin wrapper of the `chemicals` library: who is in it, and how large molecules are.

The library guesses, loads its tables late and keeps single hits where there are several.
Here every answer is a list or a value with its source, or None; nothing is guessed.
`chemicals` (and with it pandas) is imported only when something is asked.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Final

from scipy import constants as _codata

from meanfree.errors import InputError
from meanfree.gases.formula import Formula, parse_formula
from meanfree.sourced import Sourced

POLING: Final[str] = (
    "Poling, Prausnitz and O'Connell, The Properties of Gases and Liquids, 5th ed. (2001), App. B"
)
TEE: Final[str] = (
    "estimated from the critical temperature and pressure: Tee, Gotoh and Stewart,"
    " Ind. Eng. Chem. Fundam. 5, 356 (1966)"
)
_ISOTOPE = re.compile(r"\[\d+[A-Z]")


@dataclass(frozen=True, slots=True)
class Compound:
    """One entry of the library: CAS number, formula as the library writes it, best name."""

    cas: str
    formula: str
    name: str


def is_cas(text: str) -> bool:
    """Whether ``text`` is written as a CAS number with a right check digit.

    >>> is_cas("7732-18-5"), is_cas("7732-18-4"), is_cas("water")
    (True, False, False)
    """
    if not re.fullmatch(r"[1-9]\d{1,6}-\d\d-\d", text, flags=re.ASCII):
        return False
    *digits, check = (int(c) for c in text if c != "-")
    return sum(n * d for n, d in enumerate(reversed(digits), start=1)) % 10 == check


@lru_cache(maxsize=1)
def _entries() -> dict[str, Any]:
    """Every entry by CAS number; about 1.5 s the first time."""
    from chemicals.identifiers import pubchem_db

    pubchem_db.finish_loading()
    return {str(entry.CASs): entry for entry in pubchem_db}


@lru_cache(maxsize=1)
def _by_formula() -> dict[str, tuple[str, ...]]:
    """CAS numbers by formula. Labelled isotopes and loose mixtures are left out."""
    found = defaultdict(list)
    for cas, entry in _entries().items():
        smiles = str(entry.smiles)
        if "." not in smiles and (not _ISOTOPE.search(smiles) or "D" in entry.formula):
            found[str(entry.formula)].append(cas)
    return {formula: tuple(numbers) for formula, numbers in found.items()}


def _compounds(numbers: Iterable[str]) -> list[Compound]:
    entries = _entries()
    compounds = [Compound(n, str(entries[n].formula), str(entries[n].common_name)) for n in numbers]
    return sorted(compounds, key=lambda c: (int(c.cas.replace("-", "")), c.cas))


def compound(cas: str) -> Compound | None:
    """The entry with this CAS number, or None."""
    return _compounds([cas])[0] if cas in _entries() else None


def compounds_of_formula(hill: str) -> list[Compound]:
    """All compounds with this formula in Hill order (charge included), by CAS number."""
    return _compounds(_by_formula().get(hill, ()))


def compounds_named(name: str) -> list[Compound]:
    """All compounds that have this as a main name, else all that have it as a synonym.

    The comparison ignores case. Formulas and structures are not read as names.
    """
    lower = name.lower()
    main = [cas for cas in _entries() if is_main_name(cas, lower)]
    if main:
        return _compounds(main)
    pair = {lower, name}
    synonyms = (cas for cas, entry in _entries().items() if not pair.isdisjoint(entry.synonyms))
    return _compounds(synonyms)


def is_main_name(cas: str, name: str) -> bool:
    """Whether ``name`` is the common or systematic name of this entry, whatever the case."""
    entry = _entries()[cas]
    return name.lower() in (str(entry.common_name).lower(), str(entry.iupac_name).lower())


def ion_cas(formula: Formula) -> str | None:
    """CAS number of an ion in the table of enthalpies, if exactly one there is this ion."""
    from chemicals import reaction

    found = [
        str(cas)
        for cas, written in reaction.Hfg_ATcT_data["Formula"].items()
        if _ion(str(written)) == formula
    ]
    return found[0] if len(found) == 1 else None


def _ion(written: str) -> Formula | None:
    """The ion that ATcT writes as ``Ar+ (g)``, ``[H3O]+ (g)`` or ``[He]+2 (g)``."""
    match = re.fullmatch(r"\[?([A-Za-z0-9()]+?)\]?([+-])(\d?) \(g\)", written)
    if match is None:
        return None
    body, sign, size = match.groups()
    try:
        return parse_formula(f"{body}^{size or 1}{sign}")
    except InputError:
        return None


def tabulated_diameter(cas: str) -> Sourced | None:
    """Lennard-Jones diameter [m] from the Poling table, or None.

    The library's other table (Magalhaes) is never asked: it gives H2 5.94 angstrom.
    """
    from chemicals import lennard_jones

    value = lennard_jones.molecular_diameter(cas, method=lennard_jones.POLING)
    return None if value is None else Sourced(value * _codata.angstrom, "angstrom", POLING)


def tabulated_well_depth(cas: str) -> Sourced | None:
    """Lennard-Jones well depth epsilon / k_B [K] from the Poling table, or None."""
    from chemicals import lennard_jones

    value = lennard_jones.Stockmayer(cas, method=lennard_jones.POLING)
    return None if value is None else Sourced(float(value), "K", POLING)


def estimated_size(cas: str) -> tuple[Sourced, Sourced] | None:
    """Diameter [m] and well depth [K] from the critical point, or None where none is known.

    sigma = 2.3647 (Tc / Pc)^(1/3) angstrom with Pc in atm, epsilon / k_B = 0.7740 Tc
    (Tee, Gotoh and Stewart 1966).
    """
    from chemicals import critical, lennard_jones

    sources = ("HEOS", "IUPAC", "MATTHEWS", "CRC", "WEBBOOK", "PD", "PSRK", "YAWS")
    for source in sources:
        tc = critical.Tc(cas, method=source) if source in critical.Tc_methods(cas) else None
        pc = critical.Pc(cas, method=source) if source in critical.Pc_methods(cas) else None
        if tc and pc:
            sigma = lennard_jones.sigma_Tee_Gotoh_Steward_1(tc, pc)
            depth = lennard_jones.epsilon_Tee_Gotoh_Steward_1(tc)
            return (
                Sourced(sigma * _codata.angstrom, "angstrom", TEE),
                Sourced(float(depth), "K", TEE),
            )
    return None
