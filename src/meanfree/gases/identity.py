"""Who a gas is: stated by name, formula or CAS number, never guessed.

A pinned name means its pinned gas. Anything else is asked of the library, and taken only if
one compound answers, its formula is the one meant, and it is neutral unless a charge is
written. Otherwise the error lists the candidates with their CAS numbers.
"""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches

from meanfree.errors import InputError, Problem
from meanfree.gases.formula import Formula, parse_formula, refuse_look_alikes
from meanfree.gases.gas import Gas
from meanfree.gases.pinned import (
    PinnedGas,
    pinned_named,
    pinned_names,
    pinned_of_formula,
    pinned_with_cas,
)

NO_CAS = "none"
"""What a case writes for the CAS number of a species that has none or needs none."""

_LISTED = 12
_LABEL_HINT = 'a bare label is declared with labels = ["..."] at the top of the case'


class UnknownGasError(InputError):
    """No list has a gas of that name; ``near`` holds pinned names that look like it."""

    def __init__(self, problem: Problem, near: tuple[str, ...]) -> None:
        self.near = near
        super().__init__([problem])


class SeveralGasesError(InputError):
    """Several compounds answer to a name; ``candidates`` says which, for whoever asks next."""

    def __init__(self, problem: Problem, candidates: str) -> None:
        self.candidates = candidates
        super().__init__([problem])


def are_same(first: Gas, second: Gas) -> bool:
    """Whether two gases are one: by name, or by CAS number, never by equal masses.

    A species without a CAS number is the same as another only under its own name.

    >>> are_same(find_gas("OH"), find_gas("HO")), are_same(find_gas("N2"), find_gas("CO"))
    (True, False)
    """
    return first.name == second.name or (first.cas is not None and first.cas == second.cas)


def find_gas(name: str, *, formula: str | None = None, cas: str | None = None) -> Gas:
    """The gas that a case means by ``name``.

    ``formula`` and ``cas`` settle what the name leaves open; ``cas = "none"`` takes the
    composition alone, for a species that no list has. The gas keeps the name as written.
    Mass, diameter and well depth carry their sources and are None where unknown. Ions have
    no diameter. Raises `InputError` at ``gases.<name>`` where the identity is not settled
    or the statements contradict each other.

    >>> find_gas("HO").cas, find_gas("HO").formula.hill
    ('3352-57-6', 'HO')
    >>> find_gas("propene").formula == find_gas("cyclopropane").formula
    True
    """
    key = f"gases.{name}" if name.isprintable() else "gases"
    refuse_look_alikes(name, key, "a gas by name or formula")
    if not name or name != name.strip():
        raise InputError.at(key, f'"{name}"', "a name without spaces around it")
    meant = None if formula is None else parse_formula(formula, key=f"{key}.formula")
    if cas == NO_CAS:
        return _composition_only(name, meant, key)
    if cas is not None:
        return _by_cas(name, meant, cas, key)
    pinned = pinned_named(name)
    if pinned is not None:
        if meant is not None and meant != pinned.formula:
            raise _contradiction(key, f"{name} is {pinned.formula} ({pinned.cas})", formula)
        return _from_pinned(name, pinned)
    composition = meant if meant is not None else _formula_or_none(name)
    if meant is None:
        _refuse_confusable(name, key)
    if composition is not None:
        return _by_formula(name, composition, key, stated=meant is not None)
    return _by_word(name, key)


def _formula_or_none(text: str) -> Formula | None:
    try:
        return parse_formula(text)
    except InputError:
        return None


def _skeleton(name: str) -> str:
    """The name with what the eye confuses made equal: case, I and l and 1, O and 0."""
    return name.lower().translate(str.maketrans("i10", "llo"))


def _refuse_confusable(name: str, key: str) -> None:
    """NOCI is a formula (of an iodine compound), but NOCl is what was meant."""
    twins = [n for n in pinned_names() if _skeleton(n) == _skeleton(name)]
    if twins:
        found = f'"{name}", which looks like {twins[0]}'
        raise InputError.at(key, found, f'{twins[0]}, or formula = "{name}" or a CAS number stated')


def _contradiction(key: str, found: str, formula: str | None) -> InputError:
    return InputError.at(key, f"{found}, but formula = {formula!r}", "one and the same gas")


def _from_pinned(name: str, pinned: PinnedGas) -> Gas:
    return Gas(
        name=name,
        formula=pinned.formula,
        cas=pinned.cas,
        molar_mass=pinned.formula.molar_mass,
        diameter=pinned.diameter,
        well_depth=pinned.well_depth,
    )


def _composition_only(name: str, meant: Formula | None, key: str) -> Gas:
    formula = meant or _formula_or_none(name)
    if formula is None:
        expected = 'a formula beside cas = "none", or a name that is a formula'
        raise InputError.at(f"{key}.formula", "none", expected)
    return Gas(name=name, formula=formula, molar_mass=formula.molar_mass)


def _by_cas(name: str, meant: Formula | None, cas: str, key: str) -> Gas:
    from meanfree.gases.library import compound, is_cas

    if not is_cas(cas):
        expected = 'a CAS number with a right check digit, such as "7732-18-5", or "none"'
        raise InputError.at(f"{key}.cas", f'"{cas}"', expected)
    meaning = pinned_named(name)
    if meaning is not None and meaning.cas != cas:
        found = f'{name}, which is {meaning.formula} ({meaning.cas}), but cas = "{cas}"'
        raise InputError.at(key, found, "another name, or its own CAS number")
    pinned = pinned_with_cas(cas)
    formula: Formula | None
    if pinned is not None:
        formula = pinned.formula
    else:
        entry = compound(cas)
        formula = _formula_or_none(entry.formula) if entry else meant or _formula_or_none(name)
    if formula is None:
        raise InputError.at(
            f"{key}.cas",
            f'"{cas}", which the library does not have',
            "a known CAS number, or a formula beside it",
        )
    written = meant or _formula_or_none(name)
    if written is not None and written != formula:
        raise InputError.at(
            key, f"{cas} is {formula}, but {written} is written", "one and the same gas"
        )
    if pinned is not None:
        return _from_pinned(name, pinned)
    return _from_library(name, formula, cas)


def _from_library(name: str, formula: Formula, cas: str) -> Gas:
    """A gas of the library: measured size, else one estimated from its critical point."""
    from meanfree.gases import library

    diameter = well_depth = None
    if not formula.charge:
        diameter = library.tabulated_diameter(cas)
        well_depth = library.tabulated_well_depth(cas)
        estimate = library.estimated_size(cas) if diameter is None else None
        if estimate is not None:
            diameter, well_depth = estimate
    return Gas(
        name=name,
        formula=formula,
        cas=cas,
        molar_mass=formula.molar_mass,
        diameter=diameter,
        well_depth=well_depth,
    )


def _by_formula(name: str, formula: Formula, key: str, *, stated: bool) -> Gas:
    """The one compound of this composition; more than one is an error that lists them."""
    from meanfree.gases import library

    found = {gas.cas: gas.name for gas in pinned_of_formula(formula)}
    for entry in library.compounds_of_formula(formula.hill):
        found.setdefault(entry.cas, entry.name)
    if stated and len(found) > 1:
        # A name that the library knows, beside the formula that it reads back, is settled.
        named = {c.cas for c in library.compounds_named(name)} & set(found)
        found = {cas: found[cas] for cas in named} if len(named) == 1 else found
    if len(found) > 1:
        raise _several(key, f"{name}: {len(found)} compounds are {formula}", found.items())
    if found:
        (cas,) = found
        pinned = pinned_with_cas(cas)
        return _from_pinned(name, pinned) if pinned else _from_library(name, formula, cas)
    if formula.charge or stated:
        cas_of_ion = library.ion_cas(formula) if formula.charge else None
        return Gas(name=name, formula=formula, cas=cas_of_ion, molar_mass=formula.molar_mass)
    raise _unknown(name, key)


def _by_word(name: str, key: str) -> Gas:
    """A name in words. A main name of one neutral compound is taken, a synonym is not."""
    from meanfree.gases import library

    entries = library.compounds_named(name)
    if not entries:
        raise _unknown(name, key)
    formulas = {entry.cas: _formula_or_none(entry.formula) for entry in entries}
    listed = [(entry.cas, f"{entry.name}, {entry.formula}") for entry in entries]
    if len(entries) > 1 or not library.is_main_name(entries[0].cas, name):
        raise _several(key, f"{name}: no compound has this as its only main name", listed)
    formula = formulas[entries[0].cas]
    if formula is None or formula.charge:
        found = f"{name}: {entries[0].formula} ({entries[0].cas}), which is no neutral gas"
        raise InputError.at(key, found, "a neutral gas, or an ion by formula with its charge")
    return _from_library(name, formula, entries[0].cas)


def _several(key: str, found: str, candidates: Iterable[tuple[str, str]]) -> InputError:
    listed = sorted(candidates, key=lambda c: int(c[0].replace("-", "")))
    shown = "; ".join(f"{cas} {name}" for cas, name in listed[:_LISTED])
    if len(listed) > _LISTED:
        shown += f"; and {len(listed) - _LISTED} more"
    problem = Problem(key, found, f'cas = "..." with one of: {shown}; or "none"')
    return SeveralGasesError(problem, shown)


def _unknown(name: str, key: str) -> InputError:
    near = get_close_matches(name, pinned_names(), n=3, cutoff=0.6)
    hint = f" (perhaps {', '.join(near)})" if near else ""
    shown = name if len(name) <= 40 else name[:37] + "..."
    expected = (
        f"a gas that is known{hint}, or one with formula and cas stated under [gases];"
        f" {_LABEL_HINT}"
    )
    return UnknownGasError(Problem(key, f'"{shown}", which no list has', expected), tuple(near))
