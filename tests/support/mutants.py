"""Small wrongs that can be done to a module, one at a time: what mutation testing puts in.

Each is a replacement of one node of the syntax tree. Left alone is what no test of physics should
pin down: docstrings, annotations, texts of messages, assertions for the type checker, decorators.
"""

from __future__ import annotations

import ast
from collections import Counter
from collections.abc import Iterator
from copy import deepcopy
from dataclasses import dataclass
from typing import Any

NodePath = tuple[tuple[str, int | None], ...]

ARITHMETIC: dict[type[ast.operator], type[ast.operator]] = {
    ast.Add: ast.Sub,
    ast.Sub: ast.Add,
    ast.Mult: ast.Div,
    ast.Div: ast.Mult,
    ast.Pow: ast.Mult,
    ast.FloorDiv: ast.Mult,
    ast.Mod: ast.FloorDiv,
    ast.BitAnd: ast.BitOr,
    ast.BitOr: ast.BitAnd,
    ast.LShift: ast.RShift,
    ast.RShift: ast.LShift,
}
COMPARED: dict[type[ast.cmpop], tuple[type[ast.cmpop], ...]] = {
    ast.Lt: (ast.LtE, ast.GtE),
    ast.LtE: (ast.Lt, ast.Gt),
    ast.Gt: (ast.GtE, ast.LtE),
    ast.GtE: (ast.Gt, ast.Lt),
    ast.Eq: (ast.NotEq,),
    ast.NotEq: (ast.Eq,),
    ast.Is: (ast.IsNot,),
    ast.IsNot: (ast.Is,),
    ast.In: (ast.NotIn,),
    ast.NotIn: (ast.In,),
}
UNTOUCHED = {
    ast.AnnAssign: ("annotation", "target"),
    ast.arg: ("annotation",),
    ast.FunctionDef: ("returns", "decorator_list", "type_params"),
    ast.ClassDef: ("decorator_list", "bases", "keywords", "type_params"),
}


@dataclass(frozen=True)
class Mutant:
    """One wrong: where it is, what it says, and the node that takes the place of another."""

    key: str
    """``function | before => after | n``: the same while the function stays as it is."""
    line: int
    end_line: int
    """Lines of its statement, first and last."""
    at_import: bool
    """True outside of functions, in defaults too: run when the module is imported."""
    path: NodePath
    replacement: ast.AST


def mutants(source: str) -> list[Mutant]:
    """All wrongs that can be done to a module.

    >>> for one in mutants("def half(x): return x / 2"): print(one.key)
    half | return x / 2 => return None | 0
    half | x / 2 => x * 2 | 0
    half | 2 => 3 | 0
    half | 2 => 4 | 0
    half | 2 => -2 | 0
    """
    found: list[Mutant] = []
    seen: Counter[str] = Counter()
    for node, path, name, inside, lines in _places(ast.parse(source), (), "", False, (1, 1)):
        for new in _wrongs(node):
            key = f"{name or 'module'} | {_text(node)} => {_text(new)}"
            found.append(Mutant(f"{key} | {seen[key]}", *lines, not inside, path, new))
            seen[key] += 1
    return found


def mutated(source: str, mutant: Mutant) -> ast.Module:
    """The module with one wrong in it."""
    tree = ast.parse(source)
    parent: Any = tree
    for field, index in mutant.path[:-1]:
        parent = getattr(parent, field) if index is None else getattr(parent, field)[index]
    field, index = mutant.path[-1]
    old = getattr(parent, field) if index is None else getattr(parent, field)[index]
    new = ast.copy_location(deepcopy(mutant.replacement), old)
    if index is None:
        setattr(parent, field, new)
    else:
        getattr(parent, field)[index] = new
    return ast.fix_missing_locations(tree)


def _text(node: ast.AST) -> str:
    text = ast.unparse(ast.fix_missing_locations(deepcopy(node)))
    return " ".join(text.split())[:160]


def _places(
    node: ast.AST, path: NodePath, name: str, inside: bool, lines: tuple[int, int]
) -> Iterator[tuple[ast.AST, NodePath, str, bool, tuple[int, int]]]:
    """Nodes that may be replaced: path, function, whether in its body, lines of the statement."""
    if _left_alone(node):
        return
    if isinstance(node, ast.stmt):
        lines = node.lineno, node.end_lineno or node.lineno
    yield node, path, name, inside, lines
    if isinstance(node, ast.Raise) or _is_problem(node):
        return  # dropped as a whole or not at all: its words are not physics
    body_inside = inside
    if isinstance(node, ast.FunctionDef | ast.ClassDef):
        name = f"{name}.{node.name}" if name else node.name
        body_inside = inside or isinstance(node, ast.FunctionDef)
    skipped = next((fields for kind, fields in UNTOUCHED.items() if isinstance(node, kind)), ())
    for field, value in ast.iter_fields(node):
        if field in skipped:
            continue
        within = body_inside if field == "body" else inside
        if isinstance(value, ast.AST):
            yield from _places(value, (*path, (field, None)), name, within, lines)
        elif isinstance(value, list):
            for index, item in enumerate(value):
                if isinstance(item, ast.AST):
                    yield from _places(item, (*path, (field, index)), name, within, lines)


def _left_alone(node: ast.AST) -> bool:
    if isinstance(node, ast.Assert | ast.JoinedStr | ast.Import | ast.ImportFrom):
        return True
    if isinstance(node, ast.Expr) and isinstance(node.value, ast.Constant):
        return True  # a docstring, or `...`
    if isinstance(node, ast.AnnAssign) and "TypeAlias" in ast.unparse(node.annotation):
        return True
    if isinstance(node, ast.Assign) and any(
        isinstance(target, ast.Name) and target.id == "__all__" for target in node.targets
    ):
        return True
    if isinstance(node, ast.Assign) and isinstance(node.value, ast.Subscript | ast.BinOp):
        # a name for a type: X = Literal["a"], X = A | B, X = Callable[[float], float]
        words = {n.id for n in ast.walk(node.value) if isinstance(n, ast.Name)}
        return bool(words & {"Literal", "NDArray", "Callable", "tuple"}) or (
            isinstance(node.value, ast.BinOp)
            and isinstance(node.value.op, ast.BitOr)
            and all(word[0].isupper() for word in words)
        )
    return False


def _is_problem(node: ast.AST) -> bool:
    """A call that holds a message for the reader and nothing else."""
    return (
        isinstance(node, ast.Call)
        and isinstance(node.func, ast.Name)
        and node.func.id in ("Problem", "cast")
    )


def _wrongs(node: ast.AST) -> Iterator[ast.AST]:
    """What may stand in the place of a node."""
    match node:
        case ast.BinOp(op=op) if type(op) in ARITHMETIC and not _is_words(node):
            yield ast.BinOp(node.left, ARITHMETIC[type(op)](), node.right)
        case ast.UnaryOp(op=ast.USub() | ast.Not()):
            yield node.operand
        case ast.Compare(ops=[op]):
            for other in COMPARED[type(op)]:
                yield ast.Compare(node.left, [other()], node.comparators)
        case ast.Compare(ops=ops):
            for place, op in enumerate(ops):
                for other in COMPARED[type(op)]:
                    changed = [*ops[:place], other(), *ops[place + 1 :]]
                    yield ast.Compare(node.left, changed, node.comparators)
        case ast.BoolOp(op=op):
            other_op = ast.Or() if isinstance(op, ast.And) else ast.And()
            yield ast.BoolOp(other_op, node.values)
        case ast.Constant(value=bool() as value):
            yield ast.Constant(not value)
        case ast.Constant(value=int() | float() as number):
            if number + 1 != number:
                yield ast.Constant(number + 1)
            if number:
                yield ast.Constant(2 * number)
                yield ast.UnaryOp(ast.USub(), ast.Constant(number))
        case ast.IfExp() if not isinstance(node.test, ast.Compare):
            yield ast.IfExp(_negated(node.test), node.body, node.orelse)
        case ast.comprehension(ifs=[test, *rest]) if not isinstance(test, ast.Compare):
            yield ast.comprehension(node.target, node.iter, [_negated(test), *rest], 0)
        case ast.Call():
            yield from _fewer_arguments(node)
        case _:
            yield from _wrong_statements(node)


def _wrong_statements(node: ast.AST) -> Iterator[ast.AST]:
    match node:
        case ast.If() if not isinstance(node.test, ast.Compare):
            yield ast.If(_negated(node.test), node.body, node.orelse)
        case ast.While() if not isinstance(node.test, ast.Compare | ast.Constant):
            yield ast.While(_negated(node.test), node.body, node.orelse)
        case ast.AugAssign(op=op):
            if type(op) in ARITHMETIC:
                yield ast.AugAssign(node.target, ARITHMETIC[type(op)](), node.value)
            yield ast.Pass()
        case ast.Return(value=ast.expr() as value):
            if not (isinstance(value, ast.Constant) and value.value is None):
                yield ast.Return(ast.Constant(None))
        case ast.Expr(value=ast.Yield() | ast.YieldFrom() as given):
            # the function must stay a generator
            yield ast.If(ast.Constant(False), [ast.Expr(given)], [])
        case ast.Expr() | ast.Raise():
            yield ast.Pass()
        case ast.Continue():
            yield ast.Break()
        case ast.Break():
            yield ast.Continue()


def _fewer_arguments(call: ast.Call) -> Iterator[ast.AST]:
    """The call without each named argument, and without the last of the others."""
    for place in range(len(call.keywords)):
        left = call.keywords[:place] + call.keywords[place + 1 :]
        yield ast.Call(call.func, call.args, left)
    if len(call.args) > 1:
        yield ast.Call(call.func, call.args[:-1], call.keywords)


def _negated(test: ast.expr) -> ast.expr:
    if isinstance(test, ast.UnaryOp) and isinstance(test.op, ast.Not):
        return test.operand
    return ast.UnaryOp(ast.Not(), test)


def _is_words(node: ast.BinOp) -> bool:
    """Text or lists put together: turned round, it fails at once and proves nothing."""
    return any(
        isinstance(n, ast.JoinedStr | ast.List | ast.Tuple)
        or (isinstance(n, ast.Constant) and isinstance(n.value, str))
        for n in (node.left, node.right)
    )
