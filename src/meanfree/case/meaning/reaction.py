"""The text of a reaction: ``2 NOCl -> 2 NO + Cl2``, a bath partner as ``+ M`` on both sides."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from meanfree.case.meaning.names import gas_name_problem
from meanfree.experiment.mechanism import Amounts, net_numbers
from meanfree.gases.formula import Formula
from meanfree.units.gate import quoted

_ARROW = re.compile(r"->|→")
_OTHER_ARROWS = re.compile(r"<-|<=|=>|=|⇌|↔|⇄|←|⟶|⇒|-->")
_TERM = re.compile(r"(?P<number>[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:\s*\*\s*|\s+|(?=[A-Za-z(\[]))")
_EXAMPLE = '"2 NOCl -> 2 NO + Cl2"'
LARGEST = 1000.0
TOLERANCE = 1e-6  # of atoms: fractional yields are written with a few digits


@dataclass(frozen=True)
class Reaction:
    """Reactants and products as written, each gas once; ``bath`` where ``+ M`` stands."""

    reactants: Amounts
    products: Amounts
    bath: bool

    @property
    def gases(self) -> tuple[str, ...]:
        """Every gas of the step in the order written."""
        return tuple(dict.fromkeys(gas for gas, _ in (*self.reactants, *self.products)))

    @property
    def net(self) -> dict[str, float]:
        """Net stoichiometric number of every gas."""
        return net_numbers(self.reactants, self.products)


class ReactionError(ValueError):
    """A text is no reaction; ``problems`` are (found, expected) pairs."""

    def __init__(self, problems: list[tuple[str, str]]) -> None:
        self.problems = problems
        super().__init__("; ".join(found for found, _ in problems))


def parse_reaction(text: str, *, from_nothing: bool = False, to_nothing: bool = False) -> Reaction:
    """Read a reaction. Raises `ReactionError` with everything that is wrong in it.

    ``from_nothing`` and ``to_nothing`` allow an empty side, for what flows in or is lost.
    """
    arrows = _ARROW.findall(text)
    if len(arrows) != 1 or _OTHER_ARROWS.search(_ARROW.sub(" ", text)) or "<->" in text:
        both_ways = bool(_OTHER_ARROWS.search(text)) or "<->" in text
        found = quoted(text) + ("" if arrows or both_ways else " without an arrow")
        if both_ways:
            expected = f"one way with one arrow ->, such as {_EXAMPLE}; reverse adds the other way"
        else:
            expected = f"two sides with one arrow -> between them, such as {_EXAMPLE}"
        raise ReactionError([(found, expected)])
    left, right = _ARROW.split(text)
    problems: list[tuple[str, str]] = []
    reactants, bath_left = _side(left, problems)
    products, bath_right = _side(right, problems)
    if not problems and bath_left != bath_right:
        problems.append(("M on one side only", 'the bath partner "+ M" on both sides'))
    empty_left = not reactants and not (from_nothing and products)
    empty_right = not products and not (to_nothing and reactants)
    if not problems and (empty_left or empty_right):
        side = "left" if empty_left else "right"
        problems.append(
            (f"{quoted(text)}, nothing on the {side}", f"gases on both sides, such as {_EXAMPLE}")
        )
    reaction = Reaction(reactants, products, bath_left > 0)
    if not problems and all(abs(n) < TOLERANCE for n in reaction.net.values()):
        found = f"{quoted(text)}, which changes nothing"
        problems.append((found, "a step that uses up or forms a gas"))
    if problems:
        raise ReactionError(problems)
    return reaction


def _side(text: str, problems: list[tuple[str, str]]) -> tuple[Amounts, int]:
    """Gases and coefficients of one side, and how often M stands there."""
    found: dict[str, float] = {}
    baths = 0
    if not text.strip():
        return (), 0
    for term in re.split(r"(?:^|\s)\+(?=\s|$)", text):
        number, name = _term(term.strip())
        if name == "M":
            baths += 1
            if number != 1 or baths > 1:
                problems.append(("M more than once", "one bath partner M"))
            continue
        wrong = _term_problem(term.strip(), name, number)
        if wrong is not None:
            problems.append(wrong)
        else:
            found[name] = found.get(name, 0.0) + number
    return tuple(found.items()), baths


def _term(term: str) -> tuple[float, str]:
    match = _TERM.match(term)
    if match is None:
        return 1.0, term
    return float(match["number"]), term[match.end() :].strip()


def _term_problem(term: str, name: str, number: float) -> tuple[str, str] | None:
    if not name:
        return quoted(
            term
        ) + " where a gas should stand", f"a gas on each side of every +, as in {_EXAMPLE}"
    if not 0 < number <= LARGEST:
        return quoted(term), f"a coefficient above 0 and at most {LARGEST:g}"
    if "(+" in name:
        return quoted(term), 'the bath partner written " + M"'
    if "+" in name.rstrip("+") or re.search(r"\s", name):
        return quoted(term), f"spaces around each + and single words as names, as in {_EXAMPLE}"
    return gas_name_problem(name)


def imbalance(
    reaction: Reaction, formulas: dict[str, Formula]
) -> Iterator[tuple[str, float, float]]:
    """(element or "charge", left, right) of everything that the step does not conserve."""
    elements = sorted({e for formula in formulas.values() for e, _ in formula.elements})
    for element in elements:
        left, right = (
            sum(n * formulas[gas].count(element) for gas, n in side)
            for side in (reaction.reactants, reaction.products)
        )
        if abs(left - right) > TOLERANCE * max(1.0, left, right):
            yield element, left, right
    left, right = (
        sum(n * formulas[gas].charge for gas, n in side)
        for side in (reaction.reactants, reaction.products)
    )
    if abs(left - right) > TOLERANCE:
        yield "charge", left, right
