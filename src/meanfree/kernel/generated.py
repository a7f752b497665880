"""A program as the source of a module, and the machine code made from it.

The module holds every phase as readable straight-line arithmetic and one function a phase that
numba compiles and keeps on disk.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from meanfree.kernel.cache import Say, module_of, silent
from meanfree.kernel.tape import Op, Phase, Tape

HEAD = '''"""Written by meanfree: the arithmetic of one mechanism. May be deleted at any time."""

from numba import cfunc, types

from meanfree.kernel.generated import compiled_text

LANES = {lanes}
SIGNATURE = types.void(types.int64, types.int64)
'''

BODY = '''

_{name} = compiled_text("{name}", """
{text}
""", LANES)


@cfunc(SIGNATURE, cache=True)
def {name}(base, code):
    _{name}(base)
'''

SIGNS = {Op.MUL: "*", Op.ADD: "+", Op.SUB: "-", Op.DIV: "/"}
NAMES = {Op.CONST: "number", Op.INPUT: "slot", **{op: op.name.lower() for op in Op if op > 1}}
CODES = {name: op for op, name in NAMES.items()}


def text_of(phase: Phase) -> str:
    """A phase as text: one operation a line, then where results go."""
    names: dict[int, int] = {}
    lines, needed = [], phase.needed()
    for position, (op, a, b, c) in enumerate(phase.tape.entries):
        if not needed[position]:
            continue
        names[position] = len(names)
        if op == Op.CONST:
            arguments = [repr(float(phase.tape.constants[a]))]
        elif op == Op.INPUT:
            arguments = [str(a)]
        else:
            arguments = [f"v{names[x]}" for x in (a, b, c) if x >= 0]
        lines.append(f"v{names[position]} = {NAMES[Op(op)]} {' '.join(arguments)}")
    lines += [f"slot {slot} = v{names[value]}" for slot, value in phase.outputs.items()]
    return "\n".join(lines)


def phase_of(name: str, text: str) -> Phase:
    """The phase that a text describes."""
    tape, outputs = Tape(), {}
    for line in text.strip().splitlines():
        left, right = line.split(" = ")
        if left.startswith("slot "):
            outputs[int(left[5:])] = int(right[1:])
            continue
        word, *arguments = right.split(" ")
        op = CODES[word]
        if op == Op.CONST:
            tape.constants.append(float(arguments[0]))
            tape.entries.append((int(op), len(tape.constants) - 1, -1, -1))
        elif op == Op.INPUT:
            tape.entries.append((int(op), int(arguments[0]), -1, -1))
        else:
            a, b, c = (*(int(x[1:]) for x in arguments), -1, -1)[:3]
            tape.entries.append((int(op), a, b, c))
    return Phase(name, tape, outputs)


def compiled_text(name: str, text: str, lanes: int) -> object:
    """What a generated module calls: the numba intrinsic of a phase.

    The text is read only where machine code has to be made.
    """
    from meanfree.kernel.vector import compiled_phase

    return compiled_phase(name, lambda: phase_of(name, text), lanes)


def source_of(phases: Sequence[Phase], lanes: int) -> str:
    """The source of the module."""
    for phase in phases:
        if not re.fullmatch(r"[a-z_0-9]+", phase.name):
            raise ValueError(f"{phase.name!r} is no name for a phase")
    bodies = [BODY.format(name=phase.name, text=text_of(phase)) for phase in phases]
    return HEAD.format(lanes=lanes) + "".join(bodies)


def addresses(phases: Sequence[Phase], lanes: int, say: Say = silent) -> list[int]:
    """Addresses of the machine code of the phases, compiled now unless the cache has it."""
    module = module_of(source_of(phases, lanes), say)
    return [int(getattr(module, phase.name).address) for phase in phases]
