"""What a formula is made of: its parts, how many, the functions it uses, what it depends on."""

from __future__ import annotations

from collections.abc import Iterator

from meanfree.equations.typeset.tree import Call, Node, Symbol, Words


def parts_of(formula: Node) -> Iterator[Node]:
    """A formula and everything in it."""
    yield formula
    for value in vars(formula).values():
        stack = [value]
        while stack:
            item = stack.pop()
            if isinstance(item, Node):
                yield from parts_of(item)
            elif isinstance(item, tuple):
                stack.extend(item)


def size(formula: Node) -> int:
    """How many parts a formula has."""
    return sum(1 for _ in parts_of(formula))


def calls(formula: Node) -> set[str]:
    """The functions that a formula uses."""
    return {part.name for part in parts_of(formula) if isinstance(part, Call)}


def depends_on_state(formula: Node) -> bool:
    """True where a formula holds the pressure or M, and so changes at one temperature."""
    parts = list(parts_of(formula))
    M = any(isinstance(part, Words) and part.text == "M" for part in parts)
    return M or any(isinstance(part, Symbol) and part.letter in {"p", "[M]"} for part in parts)
