"""Text at an address: a number in the unit and the counting of the file, and the way back."""

from __future__ import annotations

from meanfree import units
from meanfree.errors import InputError
from meanfree.experiment.experiment import Experiment
from meanfree.experiment.inputs import Input, inputs
from meanfree.units import QuantityError
from meanfree.units.gate import quoted


def dimension_at(known: Input) -> str:
    """The dimension of the number at an address, in the words of `meanfree.units`."""
    if known.quantity.dimension:
        return known.quantity.dimension
    return "length" if known.address.endswith(".diameter") else "pure"


def file_unit_span(known: Input) -> float:
    """One unit of the file in SI, offsets left out."""
    dimension = dimension_at(known)
    return units.to_si(1.0, known.unit, dimension) - units.to_si(0.0, known.unit, dimension)


def input_at(experiment: Experiment, address: str, option: str) -> Input:
    """The input at an address. Raises `InputError` at ``option`` where there is none."""
    known = inputs(experiment)
    if address not in known:
        from meanfree.case.meaning.plan import one_of_addresses

        raise InputError.at(option, quoted(address), one_of_addresses(address, known))
    return known[address]


def number_at(known: Input, text: str, option: str) -> float:
    """The number that ``text`` means at an address, in the unit and counting of the file.

    Raises `InputError` at ``option`` where the text is no such quantity.
    """
    dimension = dimension_at(known)
    try:
        if dimension in ("pure", "fraction", "equilibrium constant"):
            kind = "fraction" if dimension == "fraction" else "pure"
            value = units.read_number(text, kind).value
            return units.from_si(value, known.unit, kind) if known.unit else value
        return units.from_si(units.read(text, dimension).value, known.unit, dimension)
    except QuantityError as error:
        raise InputError.at(option, error.found, error.expected) from None


def time_of(text: str, option: str) -> float:
    """A time above 0 [s]. Raises `InputError` at ``option`` where the text is none."""
    try:
        value = units.read(text, "time").value
    except QuantityError as error:
        raise InputError.at(option, error.found, error.expected) from None
    if value <= 0:
        raise InputError.at(option, "a time of 0", "a time above 0 s")
    return value
